"""Roots beside the two poles and the zero as marks to draw: resonances, and doublets of a real pole and a real zero."""

from __future__ import annotations

from dataclasses import dataclass

from fitamp.fitting import LoopFit, Root
from fitamp.plots.roots import Mark
from fitamp.units import si

__all__ = ["FURTHER_ALPHA", "Further", "further_marks", "row_name"]

# Drawn smaller and paler than what the sweep is about.
FURTHER_ALPHA = 0.6


@dataclass(frozen=True, slots=True, kw_only=True)
class Further:
    """A resonance, whose marks are the upper ones of a pole pair and a zero pair, or a doublet.

    kind : "resonance" or "doublet"
    words : place and quality, "30.0 MHz, Q 20", or both places, "2.40 MHz, zero 2.00 MHz"
    """

    kind: str
    poles: Mark
    zeros: Mark
    words: str

    @property
    def marks(self) -> tuple[Mark, Mark]:
        """Poles, then zeros."""
        return self.poles, self.zeros


def row_name(further: tuple[Further, ...]) -> str:
    """What a row of these is called; they are at least one."""
    kinds = {one.kind for one in further}
    return kinds.pop() if len(kinds) == 1 else "further"


def further_marks(fit: LoopFit) -> tuple[Further, ...]:
    """The resonances and doublets of a fit, the lowest first; empty where none was needed."""
    found = []
    upper = ([root for root in roots if root.value_hz.imag > 0] for roots in (fit.resonant_poles, fit.resonant_zeros))
    for pole, zero in zip(*upper, strict=True):
        distance_hz = abs(pole.value_hz)
        words = f"{_place(pole)}, Q {distance_hz / abs(2 * pole.value_hz.real):.2g}"
        found.append(_further("resonance", pole, zero, words))
    for pole, zero in zip(fit.doublet_poles, fit.doublet_zeros, strict=True):
        side = "" if zero.value_hz.real < 0 else " (right)"
        found.append(_further("doublet", pole, zero, f"pole {_place(pole)}, zero {_place(zero)}{side}"))
    return tuple(sorted(found, key=lambda one: abs(one.poles.value_hz or 0.0)))


def _further(kind: str, pole: Root, zero: Root, words: str) -> Further:
    poles, zeros = (
        Mark(name=f"{kind} {name}", is_zero=is_zero, value_hz=root.value_hz, covariance=root.covariance)
        for name, is_zero, root in (("poles", False, pole), ("zeros", True, zero))
    )
    return Further(kind=kind, poles=poles, zeros=zeros, words=words)


def _place(root: Root) -> str:
    return si(abs(root.value_hz), "Hz", digits=3)
