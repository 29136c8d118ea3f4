"""Resonances beside the two poles and the zero: a pole pair with a zero pair close by, as a package or supply has.

A resonance is local: away from it the loop gain is as without. So two poles and a zero keep their meaning, and their
likelihood, with a resonance among the fitted roots; a broad pair, which could stand for a delay or a further pole, is
not taken for one.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray

__all__ = ["PARAMETERS", "Resonance", "guesses_at", "peak_of"]

# Each has a1, a2 of its zero pair and of its pole pair in 1 + a1 x + a2 x², x = s/ω0.
PARAMETERS = 4
# Lower quality is too broad to be told from the amplifier's own roots.
LEAST_QUALITY = 1.5
# A pole pair and a zero pair farther apart than this factor are no resonance but separate roots.
WIDEST_RATIO = 1.6


@dataclass(frozen=True, slots=True, kw_only=True)
class Resonance:
    """A pole pair and a zero pair around `omega` (rad/s), by which s is scaled."""

    omega: float

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivatives of its logarithm by the 4 values, shape (n, 4)."""
        x = s / self.omega
        above = 1 + values[0] * x + values[1] * x**2
        below = 1 + values[2] * x + values[3] * x**2
        slopes = np.stack([x / above, x**2 / above, -x / below, -(x**2) / below], axis=1)
        return above / below, slopes

    def roots_hz(self, values: FloatArray) -> tuple[tuple[complex, ...], tuple[complex, ...]]:
        """Poles and zeros as s-plane roots over 2π."""
        scale = self.omega / (2 * np.pi)
        zeros, poles = (np.roots([second, first, 1.0]) * scale for first, second in values.reshape(2, 2))
        return tuple(complex(root) for root in poles), tuple(complex(root) for root in zeros)

    def is_local(self, values: FloatArray) -> bool:
        """Whether both pairs are complex, stable where they are poles, sharp, and close together."""
        poles, zeros = self.roots_hz(values)
        sharp = all(root.imag and abs(root) > 2 * LEAST_QUALITY * abs(root.real) for root in (*poles, *zeros))
        stable = all(pole.real < 0 for pole in poles)
        ratio = abs(poles[0]) / abs(zeros[0]) if zeros and zeros[0] else np.inf
        return bool(sharp and stable and 1 / WIDEST_RATIO < ratio < WIDEST_RATIO)

    def is_between(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether poles and zeros lie inside a band, by their distance; at its ends half a resonance is any bend."""
        return all(low_hz < abs(root) < high_hz for roots in self.roots_hz(values) for root in roots)


def peak_of(residuals: ComplexArray, freq_hz: FloatArray) -> float:
    """Frequency around which the residuals are largest over a few neighbours, in hertz."""
    energy = np.convolve(np.abs(residuals) ** 2, np.full(5, 0.2), mode="same")
    return float(freq_hz[int(np.argmax(energy))])


def guesses_at(freq_hz: float) -> Iterator[tuple[Resonance, FloatArray]]:
    """Starts for a resonance near a frequency: a few qualities, the zeros just above or just below the poles."""
    resonance = Resonance(omega=2 * np.pi * freq_hz)
    for quality in (5.0, 25.0):
        for shift in (0.02, -0.02):
            yield resonance, np.array([1 / quality, 1 - shift, 1 / quality, 1 + shift])
