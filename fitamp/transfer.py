"""Transfer functions as gain, poles, zeros and delay; the way to and from polynomials.

Roots are kept in hertz (s-plane roots over 2π) and signed: a stable pole has a negative real part, the
right-half-plane Miller zero a positive one. Margins and closed loop: `fitamp.margins`. From circuit elements:
`fitamp.amplifier`.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.roots import in_order, polynomial_roots
from fitamp.units import si, to_db

__all__ = ["TWO_PI", "Transfer"]

TWO_PI = 2 * math.pi
# Two roots given as a conjugate pair may differ by rounding, relative to their distance from the origin.
CONJUGATE_RTOL = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class Transfer:
    """T(f) = T0 ∏(1 − jf/z) / ∏(1 − jf/p) · exp(−j2πf·delay).

    Parameters
    ----------
    dc_gain
        T0 in V/V, signed: positive for negative feedback when T is a loop gain.
    poles_hz, zeros_hz : iterables of complex
        s-plane roots over 2π, signed, none at the origin; complex ones together with their conjugates. They
        are kept nearest the origin first, so that ``poles_hz[0]`` is the dominant pole.
    delay_s
        Pure delay, 0 or more.

    Raises
    ------
    ValueError
        When a number is not finite, the gain or a root is 0, the delay negative, or a conjugate missing.
    """

    dc_gain: float
    poles_hz: tuple[complex, ...]
    zeros_hz: tuple[complex, ...] = ()
    delay_s: float = 0.0

    def __post_init__(self) -> None:
        if not math.isfinite(self.dc_gain) or self.dc_gain == 0:
            raise ValueError(f"DC gain must be finite and not 0, but is {self.dc_gain!r}")
        if not math.isfinite(self.delay_s) or self.delay_s < 0:
            raise ValueError(f"delay must be 0 s or more, but is {self.delay_s!r}")
        object.__setattr__(self, "dc_gain", float(self.dc_gain))
        object.__setattr__(self, "delay_s", float(self.delay_s))
        object.__setattr__(self, "poles_hz", _checked_roots("pole", self.poles_hz))
        object.__setattr__(self, "zeros_hz", _checked_roots("zero", self.zeros_hz))

    @classmethod
    def from_polynomials(cls, numerator: ArrayLike, denominator: ArrayLike, *, delay_s: float = 0.0) -> Transfer:
        """Build from polynomials in s.

        Parameters
        ----------
        numerator, denominator : array_like, shapes (m,) and (n,)
            Real coefficients in ascending powers of s (rad/s). The first of each must not be 0; zeros at the
            end are left off.
        delay_s
            Pure delay.

        Raises
        ------
        ValueError
            When a polynomial is empty, not finite or starts with 0.
        """
        tops = _coefficients("numerator", numerator)
        bottoms = _coefficients("denominator", denominator)
        return cls(
            dc_gain=tops[0] / bottoms[0],
            poles_hz=tuple(root / TWO_PI for root in polynomial_roots(bottoms)),
            zeros_hz=tuple(root / TWO_PI for root in polynomial_roots(tops)),
            delay_s=delay_s,
        )

    def polynomials(self) -> tuple[FloatArray, FloatArray]:
        """Return numerator (m,) and denominator (n,) in ascending powers of s (rad/s), without the delay.

        They are normalised: ``denominator[0]`` is 1 and ``numerator[0]`` the DC gain.
        """
        return self.dc_gain * _expand(self.zeros_hz), _expand(self.poles_hz)

    def evaluate(self, freq_hz: ArrayLike) -> ComplexArray:
        """Return T at real frequencies, in the shape of `freq_hz`.

        Multiplying the factors one by one keeps full precision however far apart the roots are, where a
        polynomial in s would not.
        """
        jf = 1j * np.asarray(freq_hz, dtype=float)
        gain = np.full(jf.shape, self.dc_gain, dtype=np.complex128)
        for zero in self.zeros_hz:
            gain = gain * (1 - jf / zero)
        for pole in self.poles_hz:
            gain = gain / (1 - jf / pole)
        if self.delay_s:
            gain = gain * np.exp(-TWO_PI * self.delay_s * jf)
        return np.asarray(gain, dtype=np.complex128)

    @property
    def zero_time_s(self) -> float:
        """Coefficient of s in the normalised numerator: the zero time of one zero, the sum over several.

        Above 0: left half plane; below 0: right half plane; 0: no zero (a zero at infinity).
        """
        return -sum((1 / zero).real for zero in self.zeros_hz) / TWO_PI

    @property
    def gain_bandwidth_hz(self) -> float:
        """|T0| times the dominant pole: the extrapolated unity-gain frequency (infinite without a pole)."""
        return abs(self.dc_gain) * abs(self.poles_hz[0]) if self.poles_hz else math.inf

    def cascade(self, other: Transfer) -> Transfer:
        """Return the product of both."""
        return Transfer(
            dc_gain=self.dc_gain * other.dc_gain,
            poles_hz=self.poles_hz + other.poles_hz,
            zeros_hz=self.zeros_hz + other.zeros_hz,
            delay_s=self.delay_s + other.delay_s,
        )

    def __str__(self) -> str:
        parts = [f"{to_db(abs(self.dc_gain)):.1f} dB{', inverting' if self.dc_gain < 0 else ''}"]
        for name, roots in (("pole", self.poles_hz), ("zero", self.zeros_hz)):
            parts += [f"{name} {_describe(root)}" for root in roots if root.imag >= 0]
        if self.delay_s:
            parts.append(f"delay {si(self.delay_s, 's')}")
        return "; ".join(parts)


def _checked_roots(name: str, roots: Iterable[complex]) -> tuple[complex, ...]:
    values = [complex(root) for root in roots]
    for value in values:
        if not cmath.isfinite(value) or value == 0:
            raise ValueError(f"{name} must be finite and not at the origin, but is {value!r} Hz")
    upper = [value for value in values if value.imag > 0]
    lower = [value for value in values if value.imag < 0]
    kept = [complex(value.real) for value in values if value.imag == 0]
    for value in upper:
        partner = min(lower, key=lambda other: abs(other - value.conjugate()), default=None)
        if partner is None or abs(partner - value.conjugate()) > CONJUGATE_RTOL * abs(value):
            raise ValueError(f"{name} {value!r} Hz lacks its conjugate")
        lower.remove(partner)
        kept += [value, value.conjugate()]
    if lower:
        raise ValueError(f"{name} {lower[0]!r} Hz lacks its conjugate")
    return in_order(kept)


def _coefficients(name: str, values: ArrayLike) -> list[float]:
    array = np.asarray(values, dtype=float)
    row = array.tolist() if array.ndim == 1 else []
    if not row or not all(map(math.isfinite, row)) or row[0] == 0:
        raise ValueError(f"{name} must be a row of finite coefficients, the first not 0, but is {values!r}")
    return row


def _expand(roots_hz: tuple[complex, ...]) -> FloatArray:
    """∏(1 − s/(2πr)) in ascending powers of s, with pairs multiplied as real quadratics."""
    product = np.ones(1)
    for root in roots_hz:
        inverse = 1 / (TWO_PI * root)
        if root.imag == 0:
            product = np.convolve(product, [1.0, -inverse.real])
        elif root.imag > 0:
            product = np.convolve(product, [1.0, -2 * inverse.real, abs(inverse) ** 2])
    return np.asarray(product, dtype=float)


def _describe(root: complex) -> str:
    side = "" if root.real < 0 else " (right half plane)" if root.real > 0 else " (imaginary axis)"
    if root.imag == 0:
        return f"{si(abs(root), 'Hz')}{side}"
    quality = f", Q {abs(root) / (2 * abs(root.real)):.3g}" if root.real else ""
    return f"pair {si(abs(root), 'Hz')}{quality}{side}"
