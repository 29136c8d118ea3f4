"""Roots beside the two poles and the zero as marks to draw: one for the poles, one for the zeros of each resonance."""

from __future__ import annotations

from dataclasses import dataclass

from fitamp.fitting import LoopFit, Root
from fitamp.plots.roots import Mark
from fitamp.units import si

__all__ = ["FURTHER_ALPHA", "FURTHER_ROW", "Further", "further_marks"]

# Drawn smaller and paler than what the sweep is about.
FURTHER_ALPHA = 0.6
FURTHER_ROW = "resonance"


@dataclass(frozen=True, slots=True, kw_only=True)
class Further:
    """A resonance: its poles and its zeros (each the upper one of a pair), and both in words."""

    poles: Mark
    zeros: Mark

    @property
    def words(self) -> str:
        """Place and quality: "30.0 MHz, Q 20"."""
        return self.poles.words

    @property
    def marks(self) -> tuple[Mark, Mark]:
        """Poles, then zeros."""
        return self.poles, self.zeros


def further_marks(fit: LoopFit) -> tuple[Further, ...]:
    """The resonances of a fit, the lowest first; empty where none was needed."""
    poles, zeros = (
        [root for root in roots if root.value_hz.imag > 0] for roots in (fit.resonant_poles, fit.resonant_zeros)
    )
    found = [Further(poles=_poles(pole), zeros=_zeros(zero)) for pole, zero in zip(poles, zeros, strict=True)]
    return tuple(sorted(found, key=lambda one: abs(one.poles.value_hz or 0.0)))


def _poles(root: Root) -> Mark:
    distance_hz = abs(root.value_hz)
    words = f"{si(distance_hz, 'Hz', digits=3)}, Q {distance_hz / abs(2 * root.value_hz.real):.2g}"
    return Mark(name="poles", is_zero=False, value_hz=root.value_hz, covariance=root.covariance, words=words)


def _zeros(root: Root) -> Mark:
    return Mark(name="zeros", is_zero=True, value_hz=root.value_hz, covariance=root.covariance)
