"""Derivatives of the fitted poles, the zero and what follows from them by the parameter vector.

A pole is where D(s) = q + s + b s² + b τ3 s³ is 0, so that dp = −∂D/∂θ / ∂D/∂s (implicit function theorem). At a double
pole there is no derivative: it comes out infinite or not a number.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.two_pole import TwoPole

__all__ = ["pole_slopes", "quantity_slopes", "zero_slopes"]

LN_G, LN_Q, LN_B, ZERO, FAR_POLE = range(5)


def pole_slopes(model: TwoPole, values: FloatArray, poles_hz: Sequence[complex]) -> ComplexArray:
    """Slopes of k poles (Hz) of the model's response by its p parameters, shape (k, p)."""
    _, q, b, _, far_pole_s, _ = model.physical(values)
    # A far pole enters the response where its time is positive.
    far_pole_s = max(far_pole_s, 0.0)
    s = 2 * math.pi * np.array(poles_hz, dtype=np.complex128)
    slopes = np.zeros((len(s), len(values)), dtype=np.complex128)
    slopes[:, LN_Q] = q
    slopes[:, LN_B] = b * s**2 * (1 + far_pole_s * s)
    if model.far_pole.sd_s and far_pole_s:
        slopes[:, FAR_POLE] = b * s**3 * model.time_s
    with np.errstate(all="ignore"):
        return np.asarray(-slopes / (2 * math.pi * (1 + 2 * b * s + 3 * b * far_pole_s * s**2))[:, np.newaxis])


def zero_slopes(model: TwoPole, values: FloatArray, zeros_hz: Sequence[complex]) -> ComplexArray:
    """Slopes of the response's zero −1/(2π τz) (Hz), shape (1, p); (0, p) where there is none."""
    slopes = np.zeros((len(zeros_hz), len(values)), dtype=np.complex128)
    slopes[:, ZERO] = 2 * math.pi * model.time_s * np.array(zeros_hz, dtype=np.complex128) ** 2
    return slopes


def quantity_slopes(model: TwoPole, values: FloatArray, *, dc_gain: float, poles_hz: Sequence[complex]) -> FloatArray:
    """Slopes of T(0), gain-bandwidth, distance of the first two poles (Hz), τz and τz − a2/a1 (s), shape (6, p)."""
    slopes = np.full((6, len(values)), np.nan)
    slopes[0] = 0.0
    slopes[0, [LN_G, LN_Q]] = dc_gain, -dc_gain
    for row, (pole, by) in enumerate(zip(poles_hz[:2], pole_slopes(model, values, poles_hz[:2]), strict=True), start=2):
        slopes[row] = pole.real / abs(pole) * by.real + pole.imag / abs(pole) * by.imag
    if len(poles_hz):
        slopes[1] = slopes[0] * abs(poles_hz[0]) + dc_gain * slopes[2]
    slopes[4] = slopes[5] = 0.0
    slopes[4, ZERO] = slopes[5, ZERO] = model.time_s
    slopes[5, LN_B] = -model.physical(values)[2]
    return slopes
