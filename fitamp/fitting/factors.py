"""Factors of the loop gain beside the two poles and the zero, where a sweep shows that there are more.

A resonance (package, supply) is a pole pair with a zero pair close by, a doublet (current mirror, feedforward) a real
pole with a real zero, a range step a receiver's change of range. Each is local, or nearly so: elsewhere the loop gain
is as without. So two poles and a zero keep their meaning, and their likelihood, with such factors among them.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import ClassVar, Protocol

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray

__all__ = ["Doublet", "Factor", "FurtherPole", "RangeStep", "Resonance", "doublets_at", "peak_of", "resonances_at"]

# Lower quality is too broad to be told from the amplifier's own roots.
LEAST_QUALITY = 1.5
# A pole pair and a zero pair farther apart than this factor are no resonance but separate roots.
WIDEST_RESONANCE = 1.6
# A mirror's pole and zero are a factor of 2 apart; beyond this the two are separate roots.
WIDEST_DOUBLET = 8.0

Roots = tuple[complex, ...]


class Factor(Protocol):
    """What the model needs of a factor; `values` are its part of the parameter vector, of order 1."""

    parts: ClassVar[tuple[str, ...]]

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivatives of its logarithm by the p values, shape (n, p)."""
        ...

    def roots_hz(self, values: FloatArray) -> tuple[Roots, Roots]:
        """Poles and zeros as s-plane roots over 2π; none where the factor is the bench's."""
        ...

    def is_likely(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether these values are what the factor stands for, within a band."""
        ...


@dataclass(frozen=True, slots=True, kw_only=True)
class Resonance:
    """A pole pair and a zero pair around `omega` (rad/s), by which s is scaled.

    Values: a1, a2 of the zero pair, then of the pole pair, in 1 + a1 x + a2 x², x = s/omega.
    """

    omega: float
    parts: ClassVar[tuple[str, ...]] = ("n1", "n2", "d1", "d2")

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivatives of its logarithm, shape (n, 4)."""
        x = s / self.omega
        above = 1 + values[0] * x + values[1] * x**2
        below = 1 + values[2] * x + values[3] * x**2
        slopes = np.stack([x / above, x**2 / above, -x / below, -(x**2) / below], axis=1)
        return above / below, slopes

    def roots_hz(self, values: FloatArray) -> tuple[Roots, Roots]:
        """Poles and zeros as s-plane roots over 2π."""
        scale = self.omega / (2 * np.pi)
        zeros, poles = (np.roots([second, first, 1.0]) * scale for first, second in values.reshape(2, 2))
        return tuple(complex(root) for root in poles), tuple(complex(root) for root in zeros)

    def is_local(self, values: FloatArray) -> bool:
        """Whether both pairs are complex, sharp, and close together; either half plane will do."""
        poles, zeros = self.roots_hz(values)
        sharp = all(root.imag and abs(root) > 2 * LEAST_QUALITY * abs(root.real) for root in (*poles, *zeros))
        ratio = abs(poles[0]) / abs(zeros[0]) if poles and zeros and zeros[0] else np.inf
        return bool(sharp and 1 / WIDEST_RESONANCE < ratio < WIDEST_RESONANCE)

    def is_likely(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether it is local and inside the band; at a band's ends half a resonance is any bend."""
        return self.is_local(values) and _are_between(self.roots_hz(values), low_hz, high_hz)


@dataclass(frozen=True, slots=True, kw_only=True)
class Doublet:
    """A real pole and a real zero; values: zero time and pole time, both over `time_s`."""

    time_s: float
    parts: ClassVar[tuple[str, ...]] = ("zero", "pole")

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivatives of its logarithm, shape (n, 2)."""
        x = s * self.time_s
        above, below = 1 + values[0] * x, 1 + values[1] * x
        return above / below, np.stack([x / above, -x / below], axis=1)

    def roots_hz(self, values: FloatArray) -> tuple[Roots, Roots]:
        """Pole and zero as s-plane roots over 2π."""
        zero, pole = ((complex(-1 / (2 * np.pi * value * self.time_s)),) if value else () for value in values.tolist())
        return pole, zero

    def is_likely(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether pole and zero lie inside the band, in one half plane, and not too far apart.

        In opposite half planes they would be an all-pass, which stands for a delay.
        """
        zero, pole = values.tolist()
        near = zero * pole > 0 and 1 / WIDEST_DOUBLET < zero / pole < WIDEST_DOUBLET
        return bool(near and _are_between(self.roots_hz(values), low_hz, high_hz))


@dataclass(frozen=True, slots=True, kw_only=True)
class FurtherPole:
    """A real pole beside those of the model; value: its time over `time_s`."""

    time_s: float
    parts: ClassVar[tuple[str, ...]] = ("pole",)

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivative of its logarithm, shape (n, 1)."""
        x = s * self.time_s
        below = 1 + values[0] * x
        return 1 / below, np.asarray((-x / below)[:, np.newaxis])

    def roots_hz(self, values: FloatArray) -> tuple[Roots, Roots]:
        """The pole as s-plane root over 2π."""
        value = float(values[0])
        return ((complex(-1 / (2 * np.pi * value * self.time_s)),) if value else ()), ()

    def is_likely(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether the pole is stable and inside the band; above it, it is a lag as any other."""
        poles, _ = self.roots_hz(values)
        return all(pole.real < 0 and low_hz < abs(pole) < high_hz for pole in poles) and bool(poles)


@dataclass(frozen=True, slots=True, kw_only=True)
class RangeStep:
    """A constant complex factor above a frequency, of a receiver that changed its range; values: its logarithm."""

    f_hz: float
    parts: ClassVar[tuple[str, ...]] = ("ln_size", "turn")

    def factor_and_derivatives(self, values: FloatArray, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
        """Factor of the loop gain, shape (n,), and the derivatives of its logarithm, shape (n, 2)."""
        above = (s.imag > 2 * np.pi * self.f_hz).astype(float)
        slopes = np.stack([above, 1j * above], axis=1)
        return np.asarray(np.exp(complex(values[0], values[1]) * above)), np.asarray(slopes)

    def roots_hz(self, values: FloatArray) -> tuple[Roots, Roots]:  # noqa: ARG002 - as every factor's
        """None: it is the bench's."""
        return (), ()

    def is_likely(self, values: FloatArray, low_hz: float, high_hz: float) -> bool:
        """Whether it lies inside the band and is no larger than a receiver's ranges differ: 6 dB, half a radian."""
        return bool(low_hz < self.f_hz < high_hz and abs(values[0]) < np.log(2) and abs(values[1]) < 0.5)


def _are_between(roots: tuple[Roots, Roots], low_hz: float, high_hz: float) -> bool:
    return all(kind for kind in roots) and all(low_hz < abs(root) < high_hz for kind in roots for root in kind)


def peak_of(residuals: ComplexArray, freq_hz: FloatArray) -> float:
    """Frequency around which the residuals are largest over a few neighbours, in hertz."""
    energy = np.convolve(np.abs(residuals) ** 2, np.full(5, 0.2), mode="same")
    return float(freq_hz[int(np.argmax(energy))])


def resonances_at(freq_hz: float) -> Iterator[tuple[Resonance, FloatArray]]:
    """Starts for a resonance near a frequency: a few qualities, the zeros just above or just below the poles."""
    resonance = Resonance(omega=2 * np.pi * freq_hz)
    for quality in (5.0, 25.0):
        for shift in (0.02, -0.02):
            yield resonance, np.array([1 / quality, 1 - shift, 1 / quality, 1 + shift])


def doublets_at(freq_hz: float) -> Iterator[tuple[Doublet, FloatArray]]:
    """Starts for a doublet around a frequency: the zero above the pole, and below."""
    doublet = Doublet(time_s=1 / (2 * np.pi * freq_hz))
    for ratio in (1.4, 1 / 1.4):
        yield doublet, np.array([1 / np.sqrt(ratio), np.sqrt(ratio)])
