"""Intervals: propagation against the GUM, profiles against an independent optimiser, bounds where a side is open."""

from __future__ import annotations

import numpy as np
import pytest
from bench_loops import NOISE, STANDARD
from scipy import optimize

from fitamp.arrays import FloatArray
from fitamp.estimate import Estimate, Known
from fitamp.fitting.intervals import (
    Profile,
    estimate_by_curvature,
    estimate_by_profile,
    estimates_by_curvature,
    gradient,
    hull,
    profile,
)
from fitamp.fitting.search import Search
from fitamp.fitting.two_pole import DelayPrior, FarPolePrior, Solution, TwoPole, solve
from fitamp.sweep import Sweep

LN_B, ZERO = 2, 3


def impedance(values: FloatArray) -> tuple[float, float, float]:
    """Resistance, reactance and impedance of voltage, current and phase (GUM, equations H.7)."""
    voltage, current, phase = values
    return (
        float(voltage / current * np.cos(phase)),
        float(voltage / current * np.sin(phase)),
        float(voltage / current),
    )


# JCGM 100:2008, example H.2, table H.2: means, their standard uncertainties and correlation coefficients.
GUM_MEANS = np.array([4.9990, 19.661e-3, 1.04446])
GUM_DEVIATIONS = np.array([0.0032, 0.0095e-3, 0.00075])
GUM_CORRELATIONS = np.array([[1, -0.36, 0.86], [-0.36, 1, -0.65], [0.86, -0.65, 1]])
GUM_COVARIANCE = GUM_CORRELATIONS * np.outer(GUM_DEVIATIONS, GUM_DEVIATIONS)


def test_correlated_propagation_is_that_of_the_gum() -> None:
    # Table H.3 of the same example. The inputs are printed with two digits, so the deviations agree to about 1 %.
    estimates = estimates_by_curvature(
        impedance, GUM_MEANS, GUM_COVARIANCE, quantile=1.96, positive=(False, False, False)
    )
    values = [estimate.value for estimate in estimates]
    stderrs = [estimate.stderr for estimate in estimates]
    assert values == pytest.approx([127.732, 219.847, 254.260], abs=0.006)
    assert stderrs == pytest.approx([0.071, 0.295, 0.236], rel=0.015)
    low, high = estimates[2].ci95
    assert (low, high) == pytest.approx((254.260 - 1.96 * 0.236, 254.260 + 1.96 * 0.236), abs=0.01)


def test_correlations_of_the_results_are_those_of_the_gum() -> None:
    slopes = gradient(impedance, GUM_MEANS)
    covariance = slopes @ GUM_COVARIANCE @ slopes.T
    deviations = np.sqrt(np.diag(covariance))
    correlations = covariance / np.outer(deviations, deviations)
    # r(R, X), r(R, Z), r(X, Z) of table H.3.
    assert correlations[[0, 0, 1], [1, 2, 2]] == pytest.approx([-0.588, -0.485, 0.993], abs=0.012)


def test_gradient_is_that_of_algebra() -> None:
    voltage, current, phase = GUM_MEANS
    slopes = gradient(impedance, GUM_MEANS)
    ratio = voltage / current
    expected = [
        [np.cos(phase) / current, -ratio * np.cos(phase) / current, -ratio * np.sin(phase)],
        [np.sin(phase) / current, -ratio * np.sin(phase) / current, ratio * np.cos(phase)],
        [1 / current, -ratio / current, 0],
    ]
    assert slopes == pytest.approx(np.array(expected), rel=1e-6, abs=1e-6)


def test_a_quantity_that_does_not_exist_nearby_is_not_known() -> None:
    def crossing(values: FloatArray) -> float | None:
        return float(values[0]) if values[0] >= 1 else None

    estimate = estimate_by_curvature(crossing, np.array([1.0]), np.eye(1), quantile=1.96, positive=False)
    assert estimate.known is Known.UNDETERMINED
    assert estimate.value is None


def test_a_positive_quantity_keeps_its_sign_and_one_larger_in_error_than_in_value_is_not_known() -> None:
    def exponential(values: FloatArray) -> float:
        return float(np.exp(values[0]))

    near = estimate_by_curvature(exponential, np.zeros(1), np.array([[0.25]]), quantile=1.96, positive=True)
    assert near.ci95 == pytest.approx((np.exp(-0.98), np.exp(0.98)), rel=1e-6)
    wide = estimate_by_curvature(exponential, np.zeros(1), np.array([[1.2]]), quantile=1.96, positive=True)
    assert wide.known is Known.UNDETERMINED


@pytest.fixture(scope="module")
def sweep() -> Sweep:
    return STANDARD.measured(1)


@pytest.fixture(scope="module")
def solution(sweep: Sweep) -> Solution:
    model = TwoPole(time_s=1 / (2 * np.pi * 58e6))
    start = model.vector(g=9.5e7, q=7.5e3, b=2.7e-9, zero_time_s=1.4e-9)
    return solve(model, sweep, NOISE, start)


@pytest.mark.parametrize("index", range(4))
def test_profile_of_a_near_quadratic_likelihood_is_the_curvature(sweep: Sweep, solution: Solution, index: int) -> None:
    edges = profile(solution, sweep, index)
    assert edges.below is not None
    assert edges.above is not None
    half = 1.96 * np.sqrt(solution.covariance[index, index])
    centre = solution.values[index]
    assert [edges.below[index], edges.above[index]] == pytest.approx([centre - half, centre + half], abs=0.03 * half)


def chi_square_held(sweep: Sweep, index: int, held: float, start: FloatArray) -> float:
    """Least chi-square with one parameter held, by scipy's trust-region solver and a residual written out here."""
    free = [i for i in range(4) if i != index]
    time_s = 1 / (2 * np.pi * 58e6)
    s = 2j * np.pi * sweep.freq_hz

    def residual(partial: FloatArray) -> FloatArray:
        values = start.copy()
        values[index], values[free] = held, partial
        g, q, b = np.exp(values[:3])
        gain = g * (1 + s * values[3] * time_s) / (q + s + b * s**2)
        variance = NOISE.return_channel**2 + np.abs(gain * NOISE.error_channel) ** 2
        variance = variance + NOISE.relative**2 * np.abs(sweep.gain / (1 + sweep.gain)) ** 2
        scaled = (sweep.gain - gain) / (1 + sweep.gain) / np.sqrt(variance / 2)
        return np.concatenate([scaled.real, scaled.imag])

    found = optimize.least_squares(residual, start[free], x_scale="jac", xtol=1e-12, ftol=1e-12, gtol=1e-12)
    return 2 * float(found.cost)


@pytest.mark.parametrize("index", [LN_B, ZERO])
def test_chi_square_at_the_ends_has_risen_by_the_95_percent_point(sweep: Sweep, solution: Solution, index: int) -> None:
    # Δχ² = 3.841: 95 % point of chi-square with one degree of freedom; ends are right to 0.2 %, so the rise to 0.4 %.
    edges = profile(solution, sweep, index)
    best = chi_square_held(sweep, index, float(solution.values[index]), np.array(solution.values))
    assert best == pytest.approx(solution.optimum.chi_square, abs=1e-4)
    for edge in (edges.below, edges.above):
        assert edge is not None
        rise = chi_square_held(sweep, index, float(edge[index]), np.array(edge)) - best
        assert rise == pytest.approx(3.841, rel=0.006)


def test_inflation_widens_a_profile_by_its_root(sweep: Sweep, solution: Solution) -> None:
    edges = [profile(solution, sweep, ZERO, inflation=factor) for factor in (1.0, 4.0)]
    widths = []
    for edge in edges:
        assert edge.above is not None
        widths.append(edge.above[ZERO] - solution.values[ZERO])
    assert widths[1] / widths[0] == pytest.approx(2.0, rel=0.01)


def test_a_pole_above_the_band_has_an_open_side() -> None:
    low = STANDARD.measured(2, freq_hz=np.geomspace(100.0, 2e6, 81))
    found = Search(sweep=low, noise=NOISE, known=None).best(FarPolePrior(), DelayPrior())
    at_ends = profile(found, low, LN_B)
    assert at_ends.below is None
    assert at_ends.above is not None

    def pole2_hz(values: FloatArray) -> float:
        return float(np.exp(-values[LN_B]) / (2 * np.pi))

    estimate = estimate_by_profile(pole2_hz, found, at_ends, rising=False)
    assert estimate.known is Known.LOWER_BOUND
    assert estimate.value is None
    assert estimate.ci95[0] is not None
    assert estimate.ci95[0] < 58e6
    assert estimate.ci95[1] is None


def first(values: FloatArray) -> float:
    return float(values[0])


def ends(solution: Solution, below: float | None, above: float | None) -> Profile:
    def shifted(offset: float | None) -> FloatArray | None:
        return None if offset is None else np.array([solution.values[0] + offset, *solution.values[1:]])

    return Profile(below=shifted(below), above=shifted(above))


def test_closed_and_open_profiles_become_numbers_and_bounds(solution: Solution) -> None:
    centre = float(solution.values[0])
    closed = estimate_by_profile(first, solution, ends(solution, -0.2, 0.2), rising=True)
    assert closed.value == centre
    assert closed.stderr == pytest.approx(0.2 / 1.96, rel=1e-3)
    assert closed.ci95 == pytest.approx((centre - 0.2, centre + 0.2))
    assert estimate_by_profile(first, solution, ends(solution, None, 0.2), rising=True).known is Known.UPPER_BOUND
    assert estimate_by_profile(first, solution, ends(solution, -0.2, None), rising=True).known is Known.LOWER_BOUND
    assert estimate_by_profile(first, solution, ends(solution, None, None), rising=True).known is Known.UNDETERMINED
    falling = estimate_by_profile(lambda v: -first(v), solution, ends(solution, None, 0.2), rising=False)
    assert falling.known is Known.LOWER_BOUND
    assert falling.ci95 == pytest.approx((-centre - 0.2, None))


def test_a_profile_wider_than_the_value_is_not_a_number(solution: Solution) -> None:
    centre = float(solution.values[0])
    wide = estimate_by_profile(first, solution, ends(solution, -0.99 * centre, 10 * centre), rising=True)
    assert wide.known is Known.UNDETERMINED
    assert wide.value is None
    assert wide.ci95[0] is not None


def test_hull_holds_both_intervals() -> None:
    one = Estimate(value=1.0, stderr=0.1, ci95=(0.8, 1.2))
    other = Estimate(value=2.0, stderr=0.1, ci95=(-0.5, 1.0))
    both = hull(one, other)
    assert both.ci95 == (-0.5, 1.2)
    assert both.value == 1.0
    assert both.stderr == pytest.approx(1.7 / (2 * 1.96), rel=1e-3)
    assert hull(one, Estimate(value=None, stderr=None, ci95=(None, 3.0))).ci95 == (None, 3.0)
