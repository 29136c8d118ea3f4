"""How near the Cramér–Rao bound the fit is, and whether its intervals hold what they promise; seeded simulations."""

from __future__ import annotations

import numpy as np
import pytest
from bench_loops import FREQ_HZ, QUANTITIES, STANDARD, cramer_rao
from scipy import optimize

from fitamp.arrays import FloatArray
from fitamp.fitting import LoopFit, fit_sweep
from fitamp.sweep import Sweep

RUNS = 40
BOUND = cramer_rao(STANDARD)


@pytest.fixture(scope="module")
def fits() -> list[LoopFit]:
    return [fit_sweep(STANDARD.measured(seed)) for seed in range(RUNS)]


def column(fits: list[LoopFit], name: str) -> FloatArray:
    return np.array([getattr(fit.parameters, name).value for fit in fits])


def ratio(errors: FloatArray, index: int) -> float:
    """RMSE over the bound."""
    return float(np.sqrt(np.mean(errors**2)) / BOUND[index])


@pytest.mark.parametrize(("index", "name"), list(enumerate(QUANTITIES)))
def test_errors_are_as_small_as_the_bound_allows(fits: list[LoopFit], index: int, name: str) -> None:
    # The ratio of 40 runs scatters by 1/sqrt(80) = 11 %. The noise is not told to the fit.
    assert 0.75 < ratio(column(fits, name) - STANDARD.truth()[index], index) < 1.3


@pytest.mark.parametrize(("index", "name"), list(enumerate(QUANTITIES)))
def test_there_is_no_bias_beyond_chance(fits: list[LoopFit], index: int, name: str) -> None:
    # Mean of 40 in units of the bound: 0.16 by chance.
    assert abs(np.mean(column(fits, name) - STANDARD.truth()[index])) < 0.5 * BOUND[index]


@pytest.mark.parametrize(("index", "name"), list(enumerate(QUANTITIES)))
def test_intervals_hold_the_truth_as_often_as_they_say(fits: list[LoopFit], index: int, name: str) -> None:
    truth = STANDARD.truth()[index]
    estimates = [getattr(fit.parameters, name) for fit in fits]
    covered = sum(estimate.ci95[0] <= truth <= estimate.ci95[1] for estimate in estimates)
    assert covered >= 35  # of 40 at 95 %: 35 or more with p = 0.986


@pytest.mark.parametrize(("index", "name"), list(enumerate(QUANTITIES)))
def test_standard_errors_are_the_bound(fits: list[LoopFit], index: int, name: str) -> None:
    stderrs = np.array([getattr(fit.parameters, name).stderr for fit in fits])
    assert np.median(stderrs) == pytest.approx(BOUND[index], rel=0.15)


def test_roots_carry_the_same_errors_as_the_parameters(fits: list[LoopFit]) -> None:
    for fit in fits[:5]:
        for root, name in zip(fit.poles, ("pole1_hz", "pole2_hz"), strict=True):
            assert root.covariance is not None
            assert -root.value_hz.real == pytest.approx(getattr(fit.parameters, name).value, rel=1e-9)
            assert np.sqrt(root.covariance[0, 0]) == pytest.approx(getattr(fit.parameters, name).stderr, rel=1e-3)
            assert root.covariance[1, 1] == 0
        (zero,) = fit.zeros
        zero_time = fit.parameters.zero_time_s
        assert zero_time.value is not None
        assert zero_time.stderr is not None
        assert zero.covariance is not None
        assert zero.value_hz.real == pytest.approx(-1 / (2 * np.pi * zero_time.value), rel=1e-9)
        relative = np.sqrt(zero.covariance[0, 0]) / abs(zero.value_hz)
        assert relative == pytest.approx(zero_time.stderr / zero_time.value, rel=1e-3)


def test_no_alarm_on_good_sweeps(fits: list[LoopFit]) -> None:
    assert sum(not fit.adequacy.adequate for fit in fits) <= 1
    assert {fit.zero.half_plane.value for fit in fits} == {"left"}


def relative_fit(sweep: Sweep) -> FloatArray:
    """The usual script: relative residuals of T, all points alike."""
    w2 = 2 * np.pi * 58e6

    def residual(values: FloatArray) -> FloatArray:
        dc_gain, pole1_hz, pole2_hz = np.exp(values[:3])
        s = 2j * np.pi * FREQ_HZ
        model = dc_gain * (1 + s * values[3] / w2) / ((1 + 1j * FREQ_HZ / pole1_hz) * (1 + 1j * FREQ_HZ / pole2_hz))
        miss = (sweep.gain - model) / sweep.gain
        return np.concatenate([miss.real, miss.imag])

    truth = STANDARD.truth()
    start = np.array([*np.log(truth[:3]), truth[3] * w2])
    found = optimize.least_squares(residual, start).x
    return np.array([*np.exp(found[:3]), found[3] / w2])


def test_the_bounds_above_are_ones_that_a_wrong_weighting_fails() -> None:
    errors = np.array([relative_fit(STANDARD.measured(seed)) for seed in range(15)]) - STANDARD.truth()
    assert all(ratio(errors[:, index], index) > 3 for index in range(4))
