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
from fitamp.fitting.equation import LoopEquation
from fitamp.fitting.leastsq import MAX_STEPS
from fitamp.fitting.two_pole import Solution, solve
from fitamp.sweep import Sweep
from fitamp.tall import sum_of_squares

__all__ = [
    "RISE_95",
    "Profile",
    "estimate_by_curvature",
    "estimate_by_profile",
    "estimates_by_curvature",
    "estimates_by_slopes",
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
# First step of a profile, in logarithms or scaled units, at the least and at the most.
LEAST_STEP, FIRST_STEP = 1e-12, 1.0
# Factor from one step of a profile to the next while chi-square has not risen enough, and where it ends.
LEAST_GROWTH, LARGEST_GROWTH, FARTHEST = 1.5, 3.0, 1.5 * REACH
# An interval's end need not be known better than this, relatively.
CLOSE = 2e-3
# A rise up to here times the root of what is asked for is still that of the same parabola.
ALIKE = 3.0
# Below this share of the rise asked for, a refit has nothing to find out any more.
WELL_INSIDE = 0.9
MOST_REFITS = 60


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
    return estimates_by_slopes(
        quantities(values), gradient(quantities, values), covariance, quantile=quantile, positive=positive
    )


def estimates_by_slopes(
    found: Sequence[float | None],
    slopes: FloatArray,
    covariance: FloatArray,
    *,
    quantile: float,
    positive: Sequence[bool],
) -> tuple[Estimate, ...]:
    """`estimates_by_curvature` of k values with known derivatives by the parameters, shape (k, p)."""
    with np.errstate(all="ignore"):  # a slope may be infinite or no number: then the error is not known
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
    held = _refit(solution, sweep, (index, value), solution.values, enough=RISE_95)
    return held.optimum.converged and held.optimum.chi_square >= solution.optimum.chi_square + RISE_95


def _refit(solution: Solution, sweep: Sweep, hold: tuple[int, float], start: FloatArray, *, enough: float) -> Solution:
    """One parameter held, the rest fitted until chi-square has converged, or is less than `enough` above the best."""
    held, values = solution, start
    for steps in (REFIT_STEPS, MAX_STEPS):
        held = solve(
            solution.model,
            sweep,
            solution.noise,
            values,
            hold=hold,
            tolerance=REFIT_TOLERANCE,
            max_steps=steps,
            enough=solution.optimum.chi_square + enough,
        )
        values = held.values
        if held.optimum.converged or held.optimum.chi_square < solution.optimum.chi_square + enough:
            break
    return held


@dataclass(frozen=True, slots=True, kw_only=True)
class _Held:
    """A refit with the parameter so far from its best value.

    excess : root of the rise of chi-square less that of the rise asked for, which for a parabola grows in proportion
        to `offset`; not a number where the refit did not converge, and so excludes nothing
    """

    offset: float
    values: FloatArray
    excess: float


def _edge(solution: Solution, sweep: Sweep, index: int, side: int, rise: float) -> FloatArray | None:
    """Parameters where chi-square has risen by `rise`, by the rule of false position; None on an open side."""
    asked = np.sqrt(rise)
    inner, outer = _Held(offset=0.0, values=solution.values, excess=-asked), None
    offset = float(np.clip(asked * np.sqrt(solution.covariance[index, index]), LEAST_STEP, FIRST_STEP))
    for count in range(MOST_REFITS):
        hold = (index, float(solution.values[index]) + side * offset)
        far = None if outer is None or outer.excess > ALIKE * asked else outer
        start = _predicted(solution, sweep, hold, inner, far)
        # Well inside, nobody needs to know how far.
        end = _refit(solution, sweep, hold, start, enough=WELL_INSIDE * rise)
        risen = max(end.optimum.chi_square - solution.optimum.chi_square, 0.0)
        known = end.optimum.converged or risen < WELL_INSIDE * rise
        held = _Held(offset=offset, values=end.values, excess=float(np.sqrt(risen) - asked) if known else np.nan)
        if abs(held.excess) <= CLOSE * asked:
            return held.values
        if held.excess > 0:
            outer = held
        else:
            inner = held
        if outer is None:
            if offset > REACH:
                return None
            growth = 1.05 * asked / max(held.excess + asked, 0.1 * asked) if known else LARGEST_GROWTH
            offset = min(offset * float(np.clip(growth, LEAST_GROWTH, LARGEST_GROWTH)), FARTHEST)
        elif outer.offset - inner.offset <= CLOSE * outer.offset:
            break
        else:
            share = -inner.excess / (outer.excess - inner.excess)
            # Where the curve is none of a parabola, halving is faster.
            parabolic = np.isfinite(share) and outer.excess < ALIKE * asked and count % 4 < 3
            share = float(np.clip(share, 0.05, 0.95)) if parabolic else 0.5
            offset = inner.offset + share * (outer.offset - inner.offset)
    return None if outer is None else outer.values


def _predicted(
    solution: Solution, sweep: Sweep, hold: tuple[int, float], inner: _Held, outer: _Held | None
) -> FloatArray:
    """Where the rest will go when a parameter is held: on the line through what is known."""
    index, value = hold
    best, behind = solution.values, inner.values
    if outer is not None:
        along = (outer.values - behind) / (outer.values[index] - behind[index])
    elif inner.offset:
        along = (behind - best) / (behind[index] - best[index])
    else:
        along = solution.covariance[index] / solution.covariance[index, index]
    starts = [behind + slope * (value - behind[index]) for slope in (along, 0.0)]
    for start in starts:
        start[index] = value
    # A valley that bends leads off the line.
    equation = LoopEquation(solution.model, sweep, solution.noise)
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        squares = [sum_of_squares(equation.residuals(start)) for start in starts]
    return np.asarray(starts[0] if squares[0] <= squares[1] else starts[1])
