"""Scatter of a record along the band, without a model of it, and what two records' noise does to their loop gain.

e = 1/(1 + T) is what the error receiver reads for a drive of 1. ln e is nearly a straight line in ln f wherever the
loop gain is, so that its third differences are noise.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels

__all__ = ["MIN_POINTS", "combined_levels", "relative_scatter", "running_mean"]

MIN_POINTS = 8
# Second difference of steps, a third one of the values: unit variance for white noise.
_CONTRAST = np.array([1.0, -2.0, 1.0]) / np.sqrt(20.0)
_WINDOW = 21


def relative_scatter(gain: ComplexArray) -> FloatArray:
    """Complex standard deviation of e = 1/(1 + T) relative to e, point by point, shape (n,).

    From third differences of ln e, as a running root mean square. Points about evenly spaced in ln f are taken for
    granted; where the record bends sharply the scatter comes out too large.

    Parameters
    ----------
    gain : shape (n,)
        At least `MIN_POINTS`.
    """
    # Quotients of neighbours stay on one branch of the logarithm, as ln e itself would not.
    steps = np.log((1 + gain[:-1]) / (1 + gain[1:]))
    differences = np.convolve(steps, _CONTRAST, mode="valid")
    squares = np.abs(differences) ** 2
    position = np.clip(np.arange(len(gain)) - 1, 0, len(squares) - 1)
    return np.asarray(np.sqrt(running_mean(squares, _WINDOW)[position]), dtype=float)


def running_mean(values: FloatArray | ComplexArray, width: int) -> ComplexArray | FloatArray:
    """Mean over `width` neighbours, fewer at the ends, shape (n,)."""
    width = min(width, len(values))
    ones = np.ones(width)
    sums = np.convolve(values, ones, mode="full")
    counts = np.convolve(np.ones(len(values)), ones, mode="full")
    start = (width - 1) // 2
    return np.asarray((sums / counts)[start : start + len(values)])


def combined_levels(
    voltage: ComplexArray, current: ComplexArray, levels: tuple[NoiseLevels, NoiseLevels]
) -> NoiseLevels:
    """Noise of the double-injection loop gain, from that of both records.

    With e = 1/(1 + T) the errors of both records add, e = e_v + e_i, and each errs by
    e_x·n_r, (1 − e_x)·n_e, e_x(1 − e_x)·rel and e_x²·ratio. The same four terms with e itself, none below 0, are fitted
    to the sum of the variances along the band, each point relative to its own.

    Parameters
    ----------
    voltage, current : shape (n,)
        Loop gain as each injection reads it.
    levels
        Their noise, in the same order.
    """
    from scipy.optimize import nnls

    parts = [1 / (1 + gain) for gain in (voltage, current)]
    variance = sum(_terms(e) @ _squares(level) for e, level in zip(parts, levels, strict=True))
    terms = _terms(parts[0] + parts[1])
    weighted = terms / np.asarray(variance)[:, np.newaxis]
    scale = weighted.max(axis=0)
    found = nnls(weighted / scale, np.ones(len(voltage)))[0] / scale
    returned, error, relative, ratio = np.sqrt(found).tolist()
    return NoiseLevels(
        error_channel=error,
        return_channel=returned,
        relative=relative,
        ratio=ratio,
        source=f"both injections: {levels[0].source}",
    )


def _terms(e: ComplexArray) -> FloatArray:
    """What each level's variance counts in that of e, shape (n, 4)."""
    sizes = np.stack([e, 1 - e, e * (1 - e), e**2], axis=1)
    return np.asarray(np.abs(sizes) ** 2, dtype=float)


def _squares(levels: NoiseLevels) -> FloatArray:
    values = [levels.return_channel, levels.error_channel, levels.relative, levels.ratio]
    return np.asarray(np.square(values), dtype=float)
