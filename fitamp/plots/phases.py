"""Phase counted from DC, without counting turns along a grid: each root's own angle never leaves one turn.

Unwrapping sampled angles fails where a delay turns more than half a turn from one sample to the next. Here the angle of
every pole and zero is taken by itself, the delay's exactly, and a measured angle is set beside the curve it belongs to.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import FloatArray
from fitamp.fitting import LoopFit
from fitamp.transfer import Transfer

__all__ = ["continuous_deg", "extra_delay_s", "fitted_deg", "measured_deg"]

# Nearer than this to the fitted phase, no measured one can belong to another turn.
CLEAR_DEG = 120.0
# Search for a delay that the fit does not have: step in turns at the top of the band, and farthest in the same unit.
STEP_TURNS, FARTHEST_TURNS = 0.05, 16.0
SEARCH_POINTS = 400


def continuous_deg(transfer: Transfer, freq_hz: ArrayLike) -> FloatArray:
    """Phase in degrees, shape (n,), continuous from 0 at DC; a negative gain is not counted."""
    freq = np.asarray(freq_hz, dtype=float)
    phase = -360.0 * freq * transfer.delay_s
    for sign, roots in ((1, transfer.zeros_hz), (-1, transfer.poles_hz)):
        for root in roots:
            # 1 − jf/r turns as jf − r does, and on the side where that keeps clear of the cut of the angle.
            side = 1 if root.real > 0 else -1
            phase = phase + sign * np.degrees(np.angle(side * (root - 1j * freq)) - np.angle(side * root))
    return np.asarray(phase, dtype=float)


def fitted_deg(fit: LoopFit, freq_hz: ArrayLike) -> FloatArray:
    """Phase of the fitted curve (known factor and delay included) in degrees, shape (n,), counted from DC."""
    freq = np.asarray(freq_hz, dtype=float)
    model = fit.solution.model
    rough = continuous_deg(fit.response, freq) - 360.0 * freq * model.physical(fit.solution.values)[5]
    if model.known is not None:
        rough = rough + continuous_deg(model.known, freq)
    return _beside(np.degrees(np.angle(fit.evaluate(freq))), rough)


def measured_deg(fit: LoopFit, freq_hz: ArrayLike, gain: ArrayLike, delay_s: float = 0.0) -> FloatArray:
    """Phase of measured points in degrees, on the turn of the fitted curve with `delay_s` more delay."""
    freq = np.asarray(freq_hz, dtype=float)
    return _beside(np.degrees(np.angle(np.asarray(gain))), fitted_deg(fit, freq) - 360.0 * freq * delay_s)


def extra_delay_s(fit: LoopFit) -> float:
    """Delay in s that the sweep has and the fit has not: 0 unless the two part by more than a third of a turn.

    It is where Σ f·(T/|T|)·(M*/|M|)·exp(j2πf·delay) is largest, M the fit: high frequencies tell a delay, noise at low
    ones does not.
    """
    every = -(-len(fit.sweep) // SEARCH_POINTS)
    freq, gain = fit.sweep.freq_hz[::every], fit.sweep.gain[::every]
    off = np.angle(gain) - np.angle(fit.evaluate(freq))
    turned = np.exp(1j * off)
    if np.abs(np.degrees(np.angle(turned))).max() < CLEAR_DEG:
        return 0.0
    top_hz = freq[-1]
    # Beyond half a turn between neighbours a delay passes for another one.
    farthest = min(FARTHEST_TURNS, 0.5 * top_hz / float(np.diff(freq).max()))
    turns = np.arange(-round(farthest / STEP_TURNS), round(farthest / STEP_TURNS) + 1) * STEP_TURNS
    seen = np.abs(np.exp(2j * np.pi * np.outer(turns, freq / top_hz)) @ (freq * turned))
    # Of equals the nearest to none.
    return float(turns[np.argmax(seen - 1e-6 * seen.max() * np.abs(turns))] / top_hz)


def _beside(angle_deg: FloatArray, curve_deg: FloatArray) -> FloatArray:
    """Angles moved by whole turns to within half a turn of the curve."""
    return np.asarray(angle_deg - 360 * np.round((angle_deg - curve_deg) / 360), dtype=float)
