"""Estimates of functions of a circuit's vector beside Rz = 0: against a search by brute force, and how often right."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import numpy as np
import pytest
from scipy.optimize import minimize
from simulated_parts import NOMINAL, noise_free

from fitamp.arrays import FloatArray
from fitamp.comparison import bounded
from fitamp.comparison.bounded import bounded_estimates
from fitamp.elements import Circuit, Condition, Parameter
from fitamp.elements.residual import Measured
from fitamp.elements.solving import CircuitSolution
from fitamp.estimate import Estimate
from fitamp.fitting.leastsq import Optimum
from fitamp.sweep import NoiseLevels

QUANTILE = 1.96
COVARIANCE = np.array([[0.04, 0.018], [0.018, 0.01]])  # of Rz in units of its scale, and of ln Cc
SWEEP = Measured(
    sweep=noise_free(NOMINAL),
    condition=Condition(),
    noise=NoiseLevels(error_channel=1e-5, return_channel=1e-5, relative=1e-3),
)
Function = Callable[[FloatArray], float]


def solution_at(free: FloatArray, *, held: bool = False) -> CircuitSolution:
    """A solution whose chi-square is a parabola about `free`, (Rz over its scale, ln Cc), ended at Rz ≥ 0.

    held : a circuit in which Rz is as designed and CL takes its place in the vector
    """
    first = Parameter(name="CL" if held else "Rz", scale=600.0)
    circuit = Circuit(
        nominal=NOMINAL,
        bench_load_f=0.0,
        bench_delay_s=0.0,
        parameters=(first, Parameter(name="Cc", scale=1.8e-12)),
    )
    is_held = free[0] < 0 and not held
    values = free - COVARIANCE[:, 0] * free[0] / COVARIANCE[0, 0] if is_held else free
    optimum = Optimum(
        names=circuit.names,
        values=values,
        covariance=COVARIANCE,
        chi_square=0.0,
        residuals=np.zeros(0),
        converged=True,
    )
    return CircuitSolution(circuit=circuit, sweeps=(SWEEP,), optimum=optimum, unbounded=free if is_held else None)


@pytest.fixture(autouse=True)
def parabola(monkeypatch: pytest.MonkeyPatch) -> None:
    """Refits with Rz held are those of a parabola: the conditional mean, from where they start anyway."""

    def held(
        circuit: Circuit, sweeps: object, start: FloatArray, *, hold: Mapping[int, float], **_: object
    ) -> CircuitSolution:
        del circuit, sweeps
        ((index, number),) = hold.items()
        values = start.copy()
        values[index] = number
        return solution_at(values)

    monkeypatch.setattr(bounded, "solve_free", held)


def estimated(function: Function, solution: CircuitSolution) -> Estimate:
    """One estimate."""
    (found,) = bounded_estimates((function,), solution, quantile=QUANTILE)
    return found


def straight(along: tuple[float, float]) -> Function:
    """A linear function of the vector."""
    return lambda vector: float(np.dot(along, vector))


def searched(function: Function, free: FloatArray) -> tuple[float, float]:
    """Least and largest value where chi-square is within q² of its least with Rz ≥ 0, by SLSQP."""
    inverse = np.linalg.inv(COVARIANCE)

    def chi_square(vector: FloatArray) -> float:
        return float((vector - free) @ inverse @ (vector - free))

    least = free[0] ** 2 / COVARIANCE[0, 0] if free[0] < 0 else 0.0
    start = np.array([max(free[0], 0.0) + 0.01, free[1]])
    within = {"type": "ineq", "fun": lambda vector: QUANTILE**2 + least - chi_square(vector)}
    positive = {"type": "ineq", "fun": lambda vector: vector[0]}
    ends = [
        side * minimize(lambda vector, s=side: s * function(vector), start, constraints=[within, positive]).fun
        for side in (1.0, -1.0)
    ]
    return ends[0], ends[1]


@pytest.mark.parametrize("along", [(1.0, 0.0), (1.0, -1.0), (0.3, 1.0), (-1.0, 0.5), (0.0, 1.0)])
@pytest.mark.parametrize("resistor", [2.0, 0.35, 0.1, -0.1, -0.5])
def test_ends_are_those_of_a_search_by_brute_force(along: tuple[float, float], resistor: float) -> None:
    free = np.array([resistor, 0.2])
    found = estimated(straight(along), solution_at(free))
    low, high = searched(straight(along), free)
    assert found.ci95 == pytest.approx((low, high), abs=2e-4)
    assert found.value == pytest.approx(straight(along)(solution_at(free).values))


def test_far_from_the_bound_it_is_the_propagation_of_errors() -> None:
    # JCGM 100:2008, sec. 5.2: the variance of a + 2b is var(a) + 4 cov(a, b) + 4 var(b) = 0.152.
    found = estimated(straight((1.0, 2.0)), solution_at(np.array([2.0, 0.0])))
    sd = np.sqrt(0.04 + 4 * 0.018 + 4 * 0.01)
    assert found.stderr == pytest.approx(sd)
    assert found.ci95 == pytest.approx((2.0 - QUANTILE * sd, 2.0 + QUANTILE * sd))


def test_a_product_that_rz_makes_0_is_exactly_0_on_the_bound() -> None:
    # (Rz)·(1 + ln Cc) with Rz a little above 0: linear to the bound, it would end beside 0.
    found = estimated(lambda vector: float(vector[0] * (1 + vector[1])), solution_at(np.array([0.3, 0.3])))
    assert found.ci95[0] == 0.0
    assert found.ci95[1] is not None
    assert found.ci95[1] > 0.39


def test_a_resistor_at_its_bound_has_its_interval_on_one_side() -> None:
    free = np.array([-0.1, 0.0])
    found = estimated(straight((1.0, 0.0)), solution_at(free))
    # (x + 0.1)² − 0.1² = (1.96·0.2)², by hand.
    high = np.hypot(0.1, QUANTILE * 0.2) - 0.1
    assert found.value == 0.0
    assert found.ci95 == pytest.approx((0.0, high))
    assert found.stderr == pytest.approx(high / (2 * QUANTILE))


def test_a_resistor_that_is_held_bounds_nothing() -> None:
    found = estimated(straight((1.0, 0.0)), solution_at(np.array([-0.5, 0.0]), held=True))
    assert found.ci95 == pytest.approx((-0.5 - QUANTILE * 0.2, -0.5 + QUANTILE * 0.2))


def test_what_does_not_depend_on_the_vector_has_no_error() -> None:
    found = estimated(lambda _: 3.0, solution_at(np.array([0.1, 0.0])))
    assert (found.value, found.stderr, found.ci95) == (3.0, 0.0, (3.0, 3.0))


@pytest.mark.parametrize("along", [(1.0, 0.0), (1.0, -1.0), (0.4, 1.0)])
def test_intervals_of_a_missing_resistor_hold_the_truth(along: tuple[float, float]) -> None:
    draws = np.random.default_rng(4).multivariate_normal(np.zeros(2), COVARIANCE, size=2000)
    covered = 0
    for draw in draws:
        low, high = estimated(straight(along), solution_at(draw)).ci95
        assert low is not None
        assert high is not None
        covered += low <= 0.0 <= high
    # At a bound the ordering by likelihood ratio holds in 95 to 97.5 %; three binomial deviations of 2000 are 1.5 %.
    assert 0.935 <= covered / 2000 <= 0.99
