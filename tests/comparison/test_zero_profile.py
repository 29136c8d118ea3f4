"""The zero time's interval by following chi-square, and the zero on the other side of an unstated delay."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, DESIGN, NOMINAL, SPREADS, measured

from fitamp.comparison.bounded import bounded_estimates
from fitamp.comparison.other_side import other_side, zero_time_of
from fitamp.comparison.zero_profile import followed
from fitamp.design import Bench, Design
from fitamp.elements import estimate_elements
from fitamp.elements.circuit import BENCH_DELAY
from fitamp.elements.solving import CircuitSolution, solve_free
from fitamp.estimate import Estimate, Known
from fitamp.sweep import Sweep

UNSTATED = Design.from_elements(NOMINAL, spreads=SPREADS, bench=Bench(load_f=2e-12, load_spread=0.05))
QUANTILE = 1.96


def solution_of(sweep: Sweep, design: Design = DESIGN) -> CircuitSolution:
    """The circuit's solution for one sweep."""
    return estimate_elements(sweep, design).solution


def straight(solution: CircuitSolution) -> Estimate:
    """Zero time by curvature."""
    (found,) = bounded_estimates((lambda values: zero_time_of(solution.circuit, values),), solution, quantile=QUANTILE)
    return found


def ends_of(estimate: Estimate) -> tuple[float, float]:
    """Ends of a closed interval."""
    low, high = estimate.ci95
    assert low is not None
    assert high is not None
    return low, high


def test_where_chi_square_is_a_parabola_both_agree() -> None:
    solution = solution_of(measured(NOMINAL, 71))
    curved, found = straight(solution), followed(straight(solution), solution, quantile=QUANTILE)
    assert found.value == curved.value
    assert found.stderr == pytest.approx(curved.stderr, rel=0.04)
    assert ends_of(found) == pytest.approx(ends_of(curved), abs=0.1 * (curved.stderr or 0.0))


def test_at_its_ends_chi_square_has_risen_by_the_square_of_the_quantile() -> None:
    # The check is by other refits: Rz held so that with the refitted gm2 and Cc the zero time is that of the end.
    solution = solution_of(measured(NOMINAL.with_changes(Rz=625.0), 72), UNSTATED)
    index = solution.circuit.index("Rz")
    assert index is not None
    for end_s in ends_of(followed(straight(solution), solution, quantile=QUANTILE)):
        least = min(
            (_held(solution, index, number) for number in np.linspace(0.6, 1.4, 33)),
            key=lambda held: abs(zero_time_of(held.circuit, held.values) - end_s) + 1e-12 * held.optimum.chi_square,
        )
        # Along the valley of all resistors the one that comes nearest to the end has risen no less than asked, less
        # what the grid misses.
        missed_s = abs(zero_time_of(least.circuit, least.values) - end_s)
        assert missed_s < 0.05e-9
        assert least.optimum.chi_square - solution.optimum.chi_square > 0.2 * QUANTILE**2


def _held(solution: CircuitSolution, index: int, number: float) -> CircuitSolution:
    return solve_free(solution.circuit, solution.sweeps, solution.values, hold={index: number}, tolerance=1e-7)


def test_a_bent_valley_ends_where_its_curvature_does_not() -> None:
    solution = solution_of(measured(NOMINAL.with_changes(Rz=625.0), 13), UNSTATED)
    found = followed(straight(solution), solution, quantile=QUANTILE)
    low, high = ends_of(found)
    assert -0.15e-9 < low < 0 < high < 0.15e-9
    assert found.stderr == pytest.approx((high - low) / (2 * QUANTILE))


def test_what_chi_square_does_not_end_is_open() -> None:
    solution = solution_of(measured(NOMINAL, 73, freq_hz=np.geomspace(10, 0.3e6, 61)))
    curved = straight(solution)
    # An error far too small looks for the ends far too near.
    tiny = replace(curved, stderr=1e-4 * (curved.stderr or 0.0))
    found = followed(tiny, solution, quantile=QUANTILE)
    assert found.known in {Known.UNDETERMINED, Known.LOWER_BOUND, Known.UPPER_BOUND}
    assert found.value is None


def test_without_an_error_there_is_nothing_to_follow() -> None:
    solution = solution_of(measured(NOMINAL, 71))
    exact = Estimate.gaussian(1e-9, 0.0, quantile=QUANTILE)
    assert followed(exact, solution, quantile=QUANTILE) is exact


def test_an_end_without_a_resistor_stays_where_it_was() -> None:
    solution = solution_of(measured(NOMINAL.with_changes(Rz=150.0), 74, freq_hz=np.geomspace(10, 3e6, 121)))
    assert solution.unbounded is None
    curved = straight(solution)
    found = followed(curved, solution, quantile=QUANTILE)
    assert found.ci95[0] == curved.ci95[0]
    assert found.ci95[1] != curved.ci95[1]


def test_the_other_side_has_the_delay_that_makes_up_for_it() -> None:
    # To first order only τz − delay shows: −1.1 ns and 0.4 ns, or +1.2 ns and some 2.5 ns.
    sweep = measured(NOMINAL.with_changes(Rz=0.0), 1, freq_hz=np.geomspace(10, 15e6, 121))
    solution = solution_of(sweep, UNSTATED)
    other = other_side(solution)
    assert other is not None
    zeros_s = [zero_time_of(one.circuit, one.values) for one in (solution, other)]
    delays_s = [one.circuit.physical(one.values)[BENCH_DELAY] for one in (solution, other)]
    assert zeros_s[0] * zeros_s[1] < 0
    assert zeros_s[0] - delays_s[0] == pytest.approx(zeros_s[1] - delays_s[1], abs=0.4e-9)
    assert abs(zeros_s[1] - zeros_s[0]) > 2e-9


def test_a_delay_that_is_stated_has_no_other_side() -> None:
    assert (
        other_side(solution_of(measured(NOMINAL.with_changes(Rz=0.0), 1, freq_hz=np.geomspace(10, 15e6, 121)))) is None
    )
    assert BENCH.delay_s is not None


def test_a_sweep_that_shows_the_zero_excludes_the_other_side() -> None:
    assert other_side(solution_of(measured(NOMINAL.with_changes(Rz=0.0), 1), UNSTATED)) is None
