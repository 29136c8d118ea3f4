"""The path between two receivers as gain and delay, fitted in the complex plane by its own local scatter."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.noise import CONTRAST, GLITCH
from fitamp.sweep import Sweep

__all__ = ["NOISE_WINDOW", "PathFit", "fitted_path"]

# Second differences around a point from which its noise is taken.
NOISE_WINDOW = 51
# The phase is followed upwards by this step in frequency, or by a point: the delay known so far predicts it.
FOLLOWED = 1.3
ROUNDS = 30
# Steps below this share of a standard error are none.
SETTLED = 1e-3
# Scatter below this is arithmetic: a computed through sweep.
ROUNDING = 1e-12
MEDIAN_OF_EXPONENTIAL = np.log(2)


@dataclass(frozen=True, slots=True, kw_only=True)
class PathFit:
    """A e^(−jωτ) fitted, A real; residuals H/(A e^(−jωτ)) − 1 and their local scatter (complex sd), of shape (n,).

    ln_gain_stderr, delay_stderr_s : standard errors of ln |A| and τ where the scatter is all that there is
    """

    freq_hz: FloatArray
    gain: float
    delay_s: float
    ln_gain_stderr: float
    delay_stderr_s: float
    residuals: ComplexArray
    scatter: FloatArray

    @property
    def rows(self) -> tuple[FloatArray, FloatArray]:
        """Residuals of ln magnitude and of phase in standard deviations, each of shape (n,)."""
        scaled = self.residuals / self.scatter * np.sqrt(2)
        return np.asarray(scaled.real), np.asarray(scaled.imag)


def fitted_path(sweep: Sweep) -> PathFit:
    """Fit A e^(−jωτ), A real, to a sweep of 12 points or more, weighted by the scatter around each point.

    At DC a path has no phase but 0° or 180°. A free one would be no gain: what bends the phase at the low end, the
    coupling of a receiver say, would move it, and with it the delay.
    """
    omega = 2 * np.pi * sweep.freq_hz
    delay_s = _start(omega, sweep.gain)
    centre = complex(np.mean(sweep.gain * np.exp(1j * omega * delay_s)))
    gain = abs(centre) if centre.real > 0 else -abs(centre)
    for _ in range(ROUNDS):
        residuals = np.asarray(sweep.gain * np.exp(1j * omega * delay_s) / gain - 1)
        scatter = _local_scatter(residuals)
        # Each component has half the complex variance.
        weights = 2 / scatter**2
        growth = float((weights * residuals.real).sum() / weights.sum())
        information = float((weights * omega**2).sum())
        lag_s = float((weights * omega * residuals.imag).sum() / information)
        errors = weights.sum() ** -0.5, information**-0.5
        if abs(growth) < SETTLED * errors[0] and abs(lag_s) < SETTLED * errors[1]:
            break
        gain *= 1 + growth
        delay_s -= lag_s
    return PathFit(
        freq_hz=sweep.freq_hz,
        gain=gain,
        delay_s=delay_s,
        ln_gain_stderr=float(errors[0]),
        delay_stderr_s=float(errors[1]),
        residuals=residuals,
        scatter=scatter,
    )


def _start(omega: FloatArray, gain: ComplexArray) -> float:
    """A delay near the best, followed from the low end or, where that drowns in noise, from farther up."""
    direction = gain / np.maximum(np.abs(gain), np.finfo(float).tiny)
    first = [0, len(omega) // 4, len(omega) // 2]
    delays_s = [_followed(omega[index:], direction[index:]) for index in first]
    return max(delays_s, key=lambda delay_s: float(abs(np.mean(direction * np.exp(1j * omega * delay_s)))))


def _followed(omega: FloatArray, direction: ComplexArray) -> float:
    """The phase followed upwards: the delay as known so far tells how often it has turned."""
    count, delay_s = 3, 0.0
    while True:
        turned = direction[:count] * np.exp(1j * omega[:count] * delay_s)
        phases = np.angle(turned / (turned.mean() or 1.0))
        from_middle = omega[:count] - omega[:count].mean()
        delay_s -= float(from_middle @ phases / (from_middle @ from_middle))
        if count == len(omega):
            return delay_s
        count = max(count + 1, int(np.searchsorted(omega, FOLLOWED * omega[count - 1])))


def _local_scatter(residuals: ComplexArray) -> FloatArray:
    """Complex standard deviation at each point, from the squared second differences around it, glitches left aside."""
    squares = np.abs(np.convolve(residuals, CONTRAST, mode="valid")) ** 2
    width = min(NOISE_WINDOW, len(squares) - 1 + len(squares) % 2)
    padded = np.pad(squares, width // 2 + 1, mode="reflect")
    around = sliding_window_view(padded, width)[: len(residuals)]
    usual = around <= GLITCH * np.median(around, axis=1, keepdims=True) / MEDIAN_OF_EXPONENTIAL
    mean = np.sum(around, axis=1, where=usual) / np.sum(usual, axis=1)
    return np.asarray(np.sqrt(mean + ROUNDING**2))
