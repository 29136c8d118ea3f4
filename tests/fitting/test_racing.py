"""The descent that only has to tell which start is best: against certified fits, and at the edges."""

from __future__ import annotations

import numpy as np
import pytest
from test_leastsq import MODELS, complex_step, read_set

from fitamp.arrays import FloatArray
from fitamp.fitting.leastsq import minimise
from fitamp.fitting.racing import descend


@pytest.mark.parametrize("start", [0, 1])
@pytest.mark.parametrize("name", ["Hahn1", "Kirby2", "Thurber", "MGH09"])
def test_certified_residual_sums_are_reached_from_both_starts(name: str, start: int) -> None:
    # NIST/ITL Statistical Reference Datasets.
    certified, model = read_set(name), MODELS[name]
    end = descend(
        lambda b: model(b, certified.x) - certified.y,
        complex_step(model, certified.x),
        certified.starts[start],
        tolerance=1e-9,
        max_steps=2000,
    )
    assert end.settled
    residuals = model(end.values, certified.x) - certified.y
    assert residuals @ residuals == pytest.approx(certified.residual_sum, rel=1e-6)


def test_a_coarse_fit_goes_by_it_and_still_knows_its_errors() -> None:
    certified, model = read_set("Kirby2"), MODELS["Kirby2"]
    ends = [
        minimise(
            lambda b: model(b, certified.x) - certified.y,
            certified.starts[1],
            names=[f"b{index}" for index in range(5)],
            jacobian=complex_step(model, certified.x),
            tolerance=tolerance,
        )
        for tolerance in (1e-9, 1e-15)
    ]
    assert all(end.converged for end in ends)
    assert ends[0].values == pytest.approx(ends[1].values, rel=1e-4)
    assert np.diag(ends[0].covariance) == pytest.approx(np.diag(ends[1].covariance), rel=1e-3)


def test_columns_that_depend_on_each_other_run_alike_every_time() -> None:
    # Two parameters act only by their sum; before each run the memory is left in another state.
    x = np.linspace(0.1, 2.0, 281)

    def residual(b: FloatArray) -> FloatArray:
        return np.asarray(np.exp((b[0] + b[1]) * x) * b[2] - 2 * np.exp(x) + 0.1 * np.sin(40 * x))

    def slopes(b: FloatArray) -> FloatArray:
        rising = np.exp((b[0] + b[1]) * x)
        return np.stack([x * rising * b[2], x * rising * b[2] * (1 + 1e-15), rising], axis=1)

    ends = set()
    for seed in range(20):
        litter = [np.random.default_rng(seed).standard_normal(50 * seed + k) for k in range(5)]
        end = descend(residual, slopes, [0.3, 0.3, 1.0], tolerance=1e-9, max_steps=200)
        assert end.settled
        ends.add(end.values.tobytes())
        del litter
    assert len(ends) == 1


def test_a_parameter_without_effect_stays() -> None:
    x = np.arange(1.0, 6.0)
    end = descend(
        lambda b: (b[0] - 3) * x, lambda _: np.stack([x, 0 * x], axis=1), [1.0, 7.0], tolerance=1e-9, max_steps=50
    )
    assert end.settled
    assert end.values == pytest.approx([3.0, 7.0], rel=1e-6)


def test_a_start_or_a_slope_that_is_no_number_is_not_settled() -> None:
    for level, slope in ((np.nan, 1.0), (1.0, np.nan)):
        numbers = np.full((2, 4), [[level], [slope]])

        def residual(b: FloatArray, numbers: FloatArray = numbers) -> FloatArray:
            return np.asarray(numbers[0] * b[0])

        def slopes(_: FloatArray, numbers: FloatArray = numbers) -> FloatArray:
            return np.asarray(numbers[1][:, np.newaxis])

        end = descend(residual, slopes, [1.0], tolerance=1e-7, max_steps=50)
        assert not end.settled
        assert end.values.tolist() == [1.0]


def test_a_trial_beyond_the_range_of_floats_is_turned_back_from() -> None:
    # The first step from far on the flat side of the exponential overshoots to where it overflows.
    with np.errstate(over="ignore", invalid="ignore"):
        end = descend(
            lambda b: np.exp(b) - 3.0, lambda b: np.exp(b)[:, np.newaxis], [-9.0], tolerance=1e-9, max_steps=200
        )
    assert end.settled
    assert end.values[0] == pytest.approx(np.log(3.0), rel=1e-6)


def test_too_few_steps_are_not_the_end() -> None:
    certified, model = read_set("MGH09"), MODELS["MGH09"]
    end = descend(
        lambda b: model(b, certified.x) - certified.y,
        complex_step(model, certified.x),
        certified.starts[0],
        tolerance=1e-9,
        max_steps=5,
    )
    assert not end.settled


def test_a_descent_ends_where_enough_is_reached_and_where_it_cannot_be() -> None:
    # Two circles' worth of residual: (x² + y² − 1, 10) has the least square sum 100.
    def residual(b: FloatArray) -> FloatArray:
        return np.array([b[0] ** 2 + b[1] ** 2 - 1, 10.0])

    def slopes(b: FloatArray) -> FloatArray:
        return np.array([[2 * b[0], 2 * b[1]], [0.0, 0.0]])

    early = descend(residual, slopes, [3.0, 4.0], tolerance=1e-9, max_steps=100, enough=150.0)
    assert not early.settled
    assert 100 < float(residual(early.values) @ residual(early.values)) < 150
    whole = descend(residual, slopes, [3.0, 4.0], tolerance=1e-9, max_steps=100, enough=50.0)
    assert whole.settled
    assert float(whole.values @ whole.values) == pytest.approx(1.0, rel=1e-4)


def test_a_pace_that_leads_nowhere_is_settled_only_for_who_asks_for_enough() -> None:
    # The millesimal root falls for ever, by some hundredths a step, and from 10 000 never to 9000.
    def residual(b: FloatArray) -> FloatArray:
        return np.array([float(b[0]) ** -0.001, 100.0])

    def slopes(b: FloatArray) -> FloatArray:
        return np.array([[-0.001 * float(b[0]) ** -1.001], [0.0]])

    for enough, settled in ((0.0, False), (9000.0, True)):
        end = descend(residual, slopes, [1.0], tolerance=1e-300, max_steps=50, enough=enough)
        assert end.settled == settled
