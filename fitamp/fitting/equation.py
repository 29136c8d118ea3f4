"""The loop-equation residual of a model about one sweep, fast enough to be evaluated some hundred times.

With drive 1 the receivers see error = 1/(1+T) and return = T/(1+T), each with its own floor, so the loop equation's
(T_meas − M)/(1 + T_meas) has the variance n_r² + |M|² n_e² + rel² |T/(1+T)|², and ratio²/|1+T|² where the loop gain has
a floor of its own. M stays in that variance and is differentiated with it; weights frozen at the data bias the low end
(errors in variables: R. Pintelon and J. Schoukens, System Identification: A Frequency Domain Approach).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = ["Grid", "LoopEquation"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Grid:
    """Powers of s = j2πf (rad/s) over a sweep, and the loop gain's known factor there (1 without); shapes (n,)."""

    s: ComplexArray
    s2: ComplexArray
    s3: ComplexArray
    known: ComplexArray | None

    @classmethod
    def over(cls, freq_hz: FloatArray, known: Transfer | None) -> Grid:
        """The grid of these frequencies."""
        s = np.asarray(2j * np.pi * freq_hz, dtype=np.complex128)
        return cls(s=s, s2=s * s, s3=s * s * s, known=None if known is None else known.evaluate(freq_hz))


class Model(Protocol):
    """What the equation asks of a model of the loop gain."""

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the p parameters."""
        ...

    @property
    def known(self) -> Transfer | None:
        """A factor of the loop gain known beforehand."""
        ...

    def gain_and_log_slopes(self, values: FloatArray, grid: Grid) -> tuple[ComplexArray, ComplexArray]:
        """Loop gain, shape (n,), and derivatives of its logarithm by the p parameters, shape (p, n)."""
        ...

    def prior_rows(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Residuals of the priors, shape (r,), linear in the parameters, and their derivatives, shape (r, p)."""
        ...


class LoopEquation:
    """Residuals in standard deviations: 2n rows re, im in turn, then the r rows of the model's priors.

    The last point is kept: whoever asks for the slopes has mostly just asked for the residuals.
    """

    def __init__(self, model: Model, sweep: Sweep, noise: NoiseLevels) -> None:
        self._model, self._points = model, len(sweep)
        self._measured = sweep.gain
        self._grid = Grid.over(sweep.freq_hz, model.known)
        through = 1 + sweep.gain
        self._floor = noise.return_channel**2 + (
            noise.relative**2 * np.abs(sweep.gain / through) ** 2 + noise.ratio**2 / np.abs(through) ** 2
        )
        self._error_channel = noise.error_channel**2
        # By 1 + T with its phase: where the error channel drowns, that phase is noise, and would leave a pattern.
        self._per_sd = np.sqrt(2) / through
        self._priors, self._prior_rows = model.prior_rows(np.zeros(len(model.names)))
        self._last: tuple[bytes, FloatArray, FloatArray] = (b"", np.zeros(0), np.zeros((0, 0)))

    def residuals(self, values: FloatArray) -> FloatArray:
        """Residuals of shape (2n + r,)."""
        return self._at(values)[0].copy()  # MINPACK takes an array that it is given for its own

    def slopes(self, values: FloatArray) -> FloatArray:
        """Their derivatives by the p parameters, shape (2n + r, p)."""
        return self._at(values)[1].T

    def _at(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        key = values.tobytes()
        if key != self._last[0]:
            self._last = (key, *self._evaluated(values))
        return self._last[1:]

    def _evaluated(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        gain, log_slopes = self._model.gain_and_log_slopes(values, self._grid)
        loud = self._error_channel * (gain.real**2 + gain.imag**2)
        variance = self._floor + loud
        weight = self._per_sd / np.sqrt(variance)
        ends = 2 * self._points
        residuals = np.empty(ends + len(self._priors))
        slopes = np.empty((len(values), len(residuals)))
        if len(self._priors):
            residuals[ends:] = self._priors + self._prior_rows @ values
            slopes[:, ends:] = self._prior_rows.T
        residual, slope = residuals[:ends].view(np.complex128), slopes[:, :ends].view(np.complex128)
        np.multiply(self._measured - gain, weight, out=residual)
        np.multiply(log_slopes, -gain * weight, out=slope)
        if self._error_channel:
            slope -= log_slopes.real * (residual * (loud / variance))
        return residuals, slopes
