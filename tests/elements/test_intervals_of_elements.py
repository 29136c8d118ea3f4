"""Intervals of single numbers: curvature where that is right, profiles where not, one side at the bound."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.optimize import brentq
from stepped_parts import BASE, DESIGN, NOMINAL, drawn, swept

from fitamp.design import Bench
from fitamp.elements import Condition, ElementEstimate, estimate_elements
from fitamp.elements.intervals import estimate_number
from fitamp.elements.solving import solve_free

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))


@pytest.fixture(scope="module")
def single() -> ElementEstimate:
    return estimate_elements(swept(drawn(1), [BASE], seed=2, bench_load_f=0.0), BARE)


def profiled_end(estimate: ElementEstimate, name: str, side: int) -> float:
    """Where chi-square has risen by quantile², by root finding on refits with tight tolerance."""
    solution = estimate.solution
    index = solution.circuit.names.index(name)
    sd = float(np.sqrt(estimate.covariance[index, index]))
    centre = float(solution.values[index])

    def excess(offset: float) -> float:
        held = solve_free(solution.circuit, solution.sweeps, solution.values, hold={index: centre + side * offset})
        return held.optimum.chi_square - solution.optimum.chi_square - estimate.quantile**2

    offset = float(brentq(excess, 0.2 * sd, 6 * sd, xtol=1e-4 * sd))
    return solution.circuit.parameters[index].to_si(centre + side * offset)


@pytest.mark.parametrize("name", ["gm2", "R1", "CL", "Rz"])
def test_ends_are_those_of_the_profile(single: ElementEstimate, name: str) -> None:
    found = single.element(name).estimate
    assert found.stderr is not None
    for side, end in zip((-1, 1), found.ci95, strict=True):
        assert end is not None
        assert end == pytest.approx(profiled_end(single, name, side), abs=0.12 * found.stderr)


def test_a_lopsided_likelihood_gives_a_lopsided_interval() -> None:
    # A single sweep with nothing known of CL: C1 is drawn along, and the two ends lie unlike far.
    estimate = estimate_elements(
        swept(drawn(1), [BASE], seed=2, bench_load_f=0.0), replace(BARE, under_test=frozenset({"Rz", "gm2", "CL"}))
    )
    found = estimate.element("Rz").estimate
    low, high = found.ci95
    assert low is not None
    assert high is not None
    for side, end in ((-1, low), (1, high)):
        assert end == pytest.approx(profiled_end(estimate, "Rz", side), rel=0.05)


def test_the_end_at_the_bound_is_that_of_the_profile_from_it() -> None:
    die = drawn(3).with_changes(Rz=0.0)
    steps = (BASE, Condition(load_added_f=5e-12), Condition(rz_added_ohm=500.0))
    for seed in range(6):
        estimate = estimate_elements(swept(die, steps, seed, bench_load_f=0.0), BARE, conditions=steps)
        if estimate.solution.unbounded is not None:
            break
    solution = estimate.solution
    assert solution.unbounded is not None
    index = solution.circuit.names.index("Rz")
    high = estimate.element("Rz").estimate.ci95[1]
    assert high is not None
    held = solve_free(
        solution.circuit,
        solution.sweeps,
        solution.values,
        hold={index: solution.circuit.parameters[index].from_si(high)},
    )
    rise = held.optimum.chi_square - solution.optimum.chi_square
    assert rise == pytest.approx(estimate.quantile**2, rel=0.02)


def test_a_number_that_nothing_holds_is_not_known(single: ElementEstimate) -> None:
    free = estimate_elements(swept(NOMINAL, [BASE], seed=2, bench_load_f=0.0), BARE, under_test=["R1", "R2", "gm1"])
    index = free.circuit.names.index("R1")
    found = estimate_number(free.solution, index, free.covariance, quantile=1.96)
    assert found.value is None
    assert single.element("R1").estimate.value is not None
