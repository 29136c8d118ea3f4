"""Estimates of single numbers of the vector: from the curvature, or, where that misleads, by following chi-square.

Chi-square of sweeps and priors together is held against its rise by the square of Student's quantile, 3.84 for many
points, with all other numbers refitted. Rz ends at 0: an interval there is one-sided.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.circuit import Parameter
from fitamp.elements.residual import stacked
from fitamp.elements.solving import CircuitSolution, least_resistor_ohm, solve_free
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting.leastsq import triangle_of

__all__ = ["estimate_number"]

# A number known no better than this, as a logarithm or in units of its scale, is not known.
UNDETERMINED_SD = 2.0
# Below this standard deviation every element enters the loop gain as good as linearly.
SURELY_QUADRATIC = 0.05
# Chi-square at the ends that the curvature promises may be off its rise by this share: a twentieth of a standard error.
QUADRATIC_SHARE = 0.1
# How far an end is sought, in standard errors by curvature, and how well it is found.
REACH = 4.0
END_SHARE = 0.02
REFIT_TOLERANCE = 1e-7
REFIT_STEPS = 100


def estimate_number(
    solution: CircuitSolution, index: int, covariance: FloatArray, *, quantile: float, may_profile: bool = True
) -> Estimate:
    """Estimate of number `index` of the vector, in SI units.

    may_profile : False where the covariance holds more than the curvature of chi-square, which then is no guide
    """
    parameter = solution.circuit.parameters[index]
    sd = float(np.sqrt(covariance[index, index]))
    if parameter.prior_sd is None and sd > UNDETERMINED_SD:
        return NOT_KNOWN
    number = float(solution.values[index])
    low, high = number - quantile * sd, number + quantile * sd
    bound = -np.inf
    if parameter.name == "Rz":
        bound = parameter.from_si(least_resistor_ohm(solution.sweeps))
        if solution.unbounded is not None:
            return _at_bound(solution, index, bound, sd, quantile)
    if may_profile and sd > SURELY_QUADRATIC:
        if not _is_quadratic(solution, index, covariance, -quantile):
            low = _edge(solution, index, covariance, -1, quantile)
        if not _is_quadratic(solution, index, covariance, quantile):
            high = _edge(solution, index, covariance, +1, quantile)
    return _in_si(parameter, number, max(low, bound), high, sd)


def _in_si(parameter: Parameter, number: float, low: float, high: float, sd: float) -> Estimate:
    ends = [parameter.to_si(end) if np.isfinite(end) else None for end in (low, high)]
    known = Known.MEASURED
    if None in ends:
        if ends == [None, None]:
            return NOT_KNOWN
        known = Known.LOWER_BOUND if ends[1] is None else Known.UPPER_BOUND
        return Estimate(value=None, stderr=None, ci95=(ends[0], ends[1]), known=known)
    slope = parameter.slope(number)
    return Estimate(value=parameter.to_si(number), stderr=slope * sd, ci95=(ends[0], ends[1]), known=known)


def _at_bound(solution: CircuitSolution, index: int, bound: float, sd: float, quantile: float) -> Estimate:
    """From the bound to where chi-square has risen over what it is there.

    Chi-square of Rz alone is a parabola with its least value below the bound, at z: (x − z)² − (bound − z)² = (q·sd)².
    An interval so made holds a true Rz at or near 0 in 95 to 97.5 % of cases (likelihood ratio ordering: G. J. Feldman
    and R. D. Cousins, Phys. Rev. D 57, 1998).
    """
    parameter = solution.circuit.parameters[index]
    assert solution.unbounded is not None
    least = float(solution.unbounded[index])
    high = least + np.hypot(bound - least, quantile * sd)
    scale = parameter.slope(bound)
    return Estimate(
        value=parameter.to_si(bound),
        stderr=scale * float(high - bound) / quantile,
        ci95=(parameter.to_si(bound), parameter.to_si(float(high))),
    )


def _is_quadratic(solution: CircuitSolution, index: int, covariance: FloatArray, quantile: float) -> bool:
    """Whether chi-square rises by quantile² where the curvature says so, the others refitted in one step."""
    values = solution.values + quantile * covariance[:, index] / np.sqrt(covariance[index, index])
    residuals, slopes = stacked(solution.circuit, values, solution.sweeps)
    # What is left of the residuals after the others' step is the last corner of the triangle.
    left = triangle_of(np.column_stack([np.delete(slopes, index, axis=1), residuals]))[-1, -1]
    rise = float(left**2) - solution.optimum.chi_square
    return abs(rise - quantile**2) < QUADRATIC_SHARE * quantile**2


def _edge(solution: CircuitSolution, index: int, covariance: FloatArray, side: int, quantile: float) -> float:
    """Where chi-square has risen by quantile², by regula falsi on its root; infinite where that is out of reach."""
    sd = float(np.sqrt(covariance[index, index]))
    direction = covariance[:, index] / covariance[index, index]
    centre = float(solution.values[index])

    def root_of_rise(offset: float) -> float:
        start = solution.values + side * offset * direction
        held = solve_free(
            solution.circuit,
            solution.sweeps,
            start,
            hold={index: centre + side * offset},
            tolerance=REFIT_TOLERANCE,
            max_steps=REFIT_STEPS,
        )
        rise = held.optimum.chi_square - solution.optimum.chi_square
        return float(np.sqrt(max(rise, 0.0))) if np.isfinite(rise) else np.inf

    inner, inner_root = 0.0, 0.0
    outer = quantile * sd
    outer_root = root_of_rise(outer)
    while outer_root < quantile:
        if outer > REACH * quantile * sd:
            return side * np.inf
        inner, inner_root = outer, outer_root
        outer *= 1.5
        outer_root = root_of_rise(outer)
    while outer - inner > END_SHARE * outer:
        middle = 0.5 * (inner + outer)
        if np.isfinite(outer_root):
            # The root rises nearly in a straight line; kept off the ends, so that the bracket shrinks.
            middle = inner + (outer - inner) * np.clip((quantile - inner_root) / (outer_root - inner_root), 0.05, 0.95)
        middle_root = root_of_rise(float(middle))
        if abs(middle_root - quantile) < 0.5 * END_SHARE * quantile:
            return centre + side * float(middle)
        if middle_root < quantile:
            inner, inner_root = float(middle), middle_root
        else:
            outer, outer_root = float(middle), middle_root
    return centre + side * outer
