"""Whether noise as repeats show it is all that their mean scatters by along frequency.

What all repeats have alike, interference at a fixed frequency or the rounding of a file, no difference between them
shows. It stands out against the smooth loop gain: in contrasts of neighbouring points that no smooth curve enters.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from fitamp.arrays import ComplexArray, FloatArray

__all__ = ["Contradiction", "mean_without_glitches", "scatter_of_mean"]

# False alarms in a set of clean repeats.
CHANCE_SCATTER = 0.01
# Weights of a contrast of seven points that no polynomial of degree five enters: beside a pole, at this many points a
# decade, what is left of a loop gain is below 1e-5 of it.
CONTRAST_POINTS = 7
LEAST_PER_DECADE = 15.0
# Where ln T scatters by less it has the noise of 1/(1 + T), scaled, and it bends less at crossover.
CLEAR_LN = 0.1
# A squared contrast so many times its mean is a bad point, which a fit leaves out by itself.
GLITCH = 12.0
LEAST_USUAL = 0.7


@dataclass(frozen=True, slots=True, kw_only=True)
class Contradiction:
    """Noise from repeats against the mean's own scatter along frequency; `too_small` says which way."""

    too_small: bool
    choice: str
    reason: str


def mean_without_glitches(squares: FloatArray) -> float:
    """Mean of squares whose mean should be near 1, without those of bad points where these are few."""
    usual = squares < GLITCH
    return float(squares[usual].mean() if usual.mean() > LEAST_USUAL else squares.mean())


def scatter_of_mean(freq_hz: FloatArray, mean: ComplexArray, variance: FloatArray, count: int) -> Contradiction | None:
    """Hold the mean's scatter along frequency against the variance of the mean that the repeats give.

    Parameters
    ----------
    freq_hz, mean : shape (n,)
        The mean is of 1/(1 + T).
    variance : shape (n,)
        Of the mean, from the differences between repeats.
    count
        Number of repeats.

    Returns
    -------
    Contradiction or None
        None where the two agree, or where the sweep has too few points a decade to tell scatter from shape.
    """
    from scipy.special import fdtr, fdtrc

    if len(freq_hz) < CONTRAST_POINTS:
        return None
    contrasts, degrees = _contrasts(freq_hz, mean, variance)
    if not len(contrasts):
        return None
    squares = np.abs(contrasts) ** 2
    ratio = mean_without_glitches(squares)
    of_repeats = 2 * len(freq_hz) * (count - 1)
    times = f"{np.sqrt(ratio):.2g} times"
    if fdtrc(2 * degrees, of_repeats, ratio) < CHANCE_SCATTER / 2:
        return Contradiction(
            too_small=True,
            choice="not used",
            reason=f"the average scatters from point to point {times} as much as the repeats differ: something is in "
            "all of them alike (interference, rounding in the files), or narrower than the points are apart; its noise "
            "is therefore estimated from the scatter",
        )
    if fdtr(2 * degrees, of_repeats, ratio) < CHANCE_SCATTER / 2:
        return Contradiction(
            too_small=False,
            choice="from repeats that differ as a whole",
            reason=f"the average scatters from point to point only {times} as much as the repeats differ: something "
            "changed between them",
        )
    return None


def _contrasts(freq_hz: FloatArray, mean: ComplexArray, variance: FloatArray) -> tuple[ComplexArray, float]:
    """Contrasts of seven neighbours each, of unit variance under noise alone, and how many independent ones these are.

    Of ln T where that is known well enough, of 1/(1 + T) elsewhere.
    """
    x = sliding_window_view(np.log(freq_hz), CONTRAST_POINTS)
    x_range = x[:, -1] - x[:, 0]
    weights = _divided_difference(x / x_range[:, np.newaxis])
    e, var_e = sliding_window_view(mean, CONTRAST_POINTS), sliding_window_view(variance, CONTRAST_POINTS)
    # At T = 0 there is no logarithm, and e is taken.
    with np.errstate(divide="ignore", invalid="ignore"):
        var_ln = var_e / np.abs(e * (1 - e)) ** 2
        clear = (var_ln.max(axis=1) < CLEAR_LN**2)[:, np.newaxis]
        gain = 1 / e - 1
        values = np.where(clear, np.log(gain / gain[:, CONTRAST_POINTS // 2, np.newaxis]), e)
    variances = np.where(clear, var_ln, var_e)
    norms = np.sqrt((weights**2 * variances).sum(axis=1))
    dense = x_range <= (CONTRAST_POINTS - 1) * np.log(10) / LEAST_PER_DECADE
    contrasts = np.asarray((weights * values).sum(axis=1) / norms)
    loads = weights * np.sqrt(variances) / norms[:, np.newaxis]
    total = float(len(contrasts))
    for lag in range(1, CONTRAST_POINTS):
        overlap = (loads[:-lag, lag:] * loads[lag:, :-lag]).sum(axis=1)
        total += 2 * float((overlap**2).sum())
    return contrasts[dense], float(dense.sum()) * len(contrasts) / total


def _divided_difference(x: FloatArray) -> FloatArray:
    """Weights of the divided difference over each row of `x`, shape (m, p): no polynomial of degree p − 2 is left."""
    apart = x[:, :, np.newaxis] - x[:, np.newaxis, :] + np.eye(x.shape[1])
    return np.asarray(1 / np.prod(apart, axis=2))
