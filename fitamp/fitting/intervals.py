"""Intervals: from the curvature where the likelihood is near-quadratic, profiled where it is not.

Curvature: derived quantities get their standard error from the covariance by differences (the law of propagation of
uncertainty, JCGM 100:2008, sec. 5.2). Profile: the quantity is held and all else refitted until chi-square has risen by
3.84, the 95 % point of chi-square with one degree of freedom.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting.leastsq import MAX_STEPS
from fitamp.fitting.two_pole import Solution, solve
from fitamp.sweep import Sweep

__all__ = [
    "RISE_95",
    "Profile",
    "estimate_by_curvature",
    "estimate_by_profile",
    "estimates_by_curvature",
    "gradient",
    "hull",
    "is_excluded",
    "profile",
]

Quantity = Callable[[FloatArray], float | None]
Quantities = Callable[[FloatArray], Sequence[float | None]]

RISE_95 = 3.841
# Parameters are logarithms or scaled to order 1, so one step serves all.
DIFFERENCE_STEP = 1e-5
# How far a profile is followed: a factor exp(14), more than a million, or as many scaled units.
REACH = 14.0
# Where a refit on a profile may stop: chi-square of some hundred is then right to the fourth decimal. One starts from
# its neighbour and takes long only where it slides down a valley that leads nowhere.
REFIT_TOLERANCE = 1e-7
REFIT_STEPS = 200
# First step of a profile, in logarithms or scaled units, at the least.
LEAST_STEP = 1e-12


def gradient(quantities: Quantities, values: FloatArray) -> FloatArray:
    """Central differences of k quantities by the parameters, shape (k, p); NaN where one does not exist nearby."""
    columns = []
    for index in range(len(values)):
        shift = np.zeros(len(values))
        shift[index] = DIFFERENCE_STEP * max(1.0, abs(values[index]))
        above, below = _as_floats(quantities(values + shift)), _as_floats(quantities(values - shift))
        columns.append((above - below) / (2 * shift[index]))
    return np.stack(columns, axis=1)


def estimates_by_curvature(
    quantities: Quantities, values: FloatArray, covariance: FloatArray, *, quantile: float, positive: Sequence[bool]
) -> tuple[Estimate, ...]:
    """Value, standard error and interval of k derived quantities; `positive` ones get an interval in the logarithm."""
    found = quantities(values)
    slopes = gradient(quantities, values)
    stderrs = np.sqrt(np.maximum(np.einsum("ki,ij,kj->k", slopes, covariance, slopes), 0.0))
    return tuple(
        _estimate(value, float(stderr), quantile, keeps_sign)
        for value, stderr, keeps_sign in zip(found, stderrs, positive, strict=True)
    )


def estimate_by_curvature(
    quantity: Callable[[FloatArray], float | None],
    values: FloatArray,
    covariance: FloatArray,
    *,
    quantile: float,
    positive: bool,
) -> Estimate:
    """`estimates_by_curvature` for one quantity."""
    (estimate,) = estimates_by_curvature(
        lambda vector: (quantity(vector),), values, covariance, quantile=quantile, positive=(positive,)
    )
    return estimate


def _as_floats(values: Sequence[float | None]) -> FloatArray:
    return np.array([np.nan if value is None else value for value in values], dtype=float)


def _estimate(value: float | None, stderr: float, quantile: float, positive: bool) -> Estimate:
    if value is None or not np.isfinite(stderr) or (positive and stderr > value):
        return NOT_KNOWN
    if positive:
        return Estimate.lognormal(value, stderr / value, quantile=quantile)
    return Estimate.gaussian(value, stderr, quantile=quantile)


@dataclass(frozen=True, slots=True, kw_only=True)
class Profile:
    """Parameter vectors where a held parameter's chi-square has risen by 3.84; None on an open side."""

    below: FloatArray | None
    above: FloatArray | None


def profile(solution: Solution, sweep: Sweep, index: int, *, inflation: float = 1.0) -> Profile:
    """Follow the likelihood of parameter `index` to both sides, refitting the others."""
    return Profile(
        below=_edge(solution, sweep, index, -1, RISE_95 * inflation),
        above=_edge(solution, sweep, index, +1, RISE_95 * inflation),
    )


def estimate_by_profile(quantity: Quantity, solution: Solution, edges: Profile, *, rising: bool) -> Estimate:
    """Turn a profile into an estimate of a quantity that rises (or falls) with the held parameter.

    With both sides closed the value stands with the standard error that the interval implies; with one side open it
    is a bound, with both open undetermined.
    """
    ends = [None if edge is None else quantity(edge) for edge in (edges.below, edges.above)]
    low, high = ends if rising else reversed(ends)
    if low is None and high is None:
        return NOT_KNOWN
    if low is None or high is None:
        known = Known.LOWER_BOUND if high is None else Known.UPPER_BOUND
        return Estimate(value=None, stderr=None, ci95=(low, high), known=known)
    value = quantity(solution.values)
    # Where a quantity does not quite rise with the held parameter, its interval still holds its value.
    everything = [low, high] if value is None else [low, high, value]
    low, high = min(everything), max(everything)
    stderr = (high - low) / (2 * np.sqrt(RISE_95))
    if value is None or (low > 0 and stderr > abs(value)):
        return Estimate(value=None, stderr=None, ci95=(low, high), known=Known.UNDETERMINED)
    return Estimate(value=value, stderr=float(stderr), ci95=(low, high))


def hull(one: Estimate, other: Estimate) -> Estimate:
    """`one` with an interval that holds both, its error widened as the interval is."""
    (low, high), (other_low, other_high) = one.ci95, other.ci95
    low = None if low is None or other_low is None else min(low, other_low)
    high = None if high is None or other_high is None else max(high, other_high)
    stderr = one.stderr
    if low is not None and high is not None and stderr is not None:
        stderr = max(stderr, (high - low) / (2 * np.sqrt(RISE_95)))
    return Estimate(value=one.value, stderr=stderr, ci95=(low, high), known=one.known)


def is_excluded(solution: Solution, sweep: Sweep, index: int, value: float) -> bool:
    """Whether the 95 % interval of a parameter ends before `value`, all others being refitted."""
    return _refit(solution, sweep, (index, value), solution.values, RISE_95)[0]


def _refit(
    solution: Solution, sweep: Sweep, hold: tuple[int, float], start: FloatArray, rise: float
) -> tuple[bool, FloatArray]:
    """Whether the held value is excluded, and the rest fitted to it; what will not converge excludes nothing."""
    enough = solution.optimum.chi_square + rise
    values = start
    for steps in (REFIT_STEPS, MAX_STEPS):
        held = solve(
            solution.model,
            sweep,
            solution.noise,
            values,
            hold=hold,
            tolerance=REFIT_TOLERANCE,
            max_steps=steps,
            enough=enough,
        )
        values = held.values
        if held.optimum.chi_square < enough:
            return False, values
        if held.optimum.converged:
            return True, values
    return False, values


def _edge(solution: Solution, sweep: Sweep, index: int, side: int, rise: float) -> FloatArray | None:
    centre = float(solution.values[index])
    stderr = float(np.sqrt(solution.covariance[index, index]))
    start = solution.values

    def refit(offset: float) -> tuple[bool, FloatArray]:
        return _refit(solution, sweep, (index, centre + side * offset), start, rise)

    inner, step = 0.0, min(max(1.5 * stderr, LEAST_STEP), 1.0)
    outer = step
    while True:
        excluded, values = refit(outer)
        if excluded:
            break
        if outer > REACH:
            return None
        inner, start, step = outer, values, 2 * step
        outer += step
    # Bisection to 2 % of the offset: an interval's end needs no more.
    while outer - inner > 0.02 * outer:
        middle = 0.5 * (inner + outer)
        excluded, middle_values = refit(middle)
        if excluded:
            outer, values = middle, middle_values
        else:
            inner, start = middle, middle_values
    return values
