"""Derivatives of roots by the parameters, against differences of the roots themselves."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from test_two_pole import MODELS, POINTS, differences

from fitamp.arrays import FloatArray
from fitamp.fitting.root_slopes import pole_slopes, quantity_slopes, zero_slopes
from fitamp.fitting.two_pole import TwoPole


def vector(model: TwoPole, point: str) -> FloatArray:
    """The far pole well above pole 2, where free: near a double pole differences are no good."""
    g, q, b, zero_time_s = POINTS[point]
    return model.vector(g=g, q=q, b=b, zero_time_s=zero_time_s, far_pole_s=0.1e-9)


def poles_of(model: TwoPole) -> Callable[[FloatArray], FloatArray]:
    return lambda values: np.array(model.response(values).poles_hz)


@pytest.mark.parametrize("point", POINTS)
@pytest.mark.parametrize("name", MODELS)
def test_slopes_are_those_of_differences(name: str, point: str) -> None:
    model = MODELS[name]
    values = vector(model, point)
    response = model.response(values)
    poles = np.array(response.poles_hz)
    expected = differences(poles_of(model), values)
    found = pole_slopes(model, values, response.poles_hz)
    assert found / abs(poles)[:, np.newaxis] == pytest.approx(expected / abs(poles)[:, np.newaxis], rel=1e-6, abs=1e-9)
    found = zero_slopes(model, values, response.zeros_hz)
    assert found.shape == (len(response.zeros_hz), len(values))
    if response.zeros_hz:
        expected = differences(lambda v: np.array(model.response(v).zeros_hz), values)
        assert found == pytest.approx(expected, rel=1e-6, abs=1e-9 * abs(response.zeros_hz[0]))


@pytest.mark.parametrize("point", POINTS)
@pytest.mark.parametrize("name", MODELS)
def test_slopes_of_quantities_are_those_of_differences(name: str, point: str) -> None:
    model = MODELS[name]
    values = vector(model, point)

    def quantities(vector: FloatArray) -> FloatArray:
        response = model.response(vector)
        first, second = (abs(pole) for pole in response.poles_hz[:2])
        _, _, b, zero_time_s, *_ = model.physical(vector)
        dc_gain = response.dc_gain
        return np.array([dc_gain, dc_gain * first, first, second, zero_time_s, zero_time_s - b])

    response = model.response(values)
    found = quantity_slopes(model, values, dc_gain=response.dc_gain, poles_hz=response.poles_hz)
    expected = differences(quantities, values).real
    size = np.abs(expected).max(axis=1, keepdims=True)
    assert found / size == pytest.approx(expected / size, rel=1e-6, abs=1e-8)


def test_a_double_pole_has_no_slope_and_says_so() -> None:
    # (1 + s/ω)², in the model's numbers q = ω/2 and b = 1/(2ω); with powers of two every step is exact.
    model = MODELS["plain"]
    omega = 2.0**20
    values = np.array([10.0, np.log(omega / 2), np.log(1 / (2 * omega)), 1.0])
    slopes = pole_slopes(model, values, [complex(-omega / (2 * np.pi))] * 2)
    assert not (np.abs(slopes[:, 1:3]) < 1e3 * omega).any()


def test_far_pole_of_no_or_negative_time_is_no_pole() -> None:
    model = MODELS["far pole"]
    values = vector(model, "left")
    values[4] = -0.01
    response = model.response(values)
    assert pole_slopes(model, values, response.poles_hz).shape == (2, 5)
    assert (pole_slopes(model, values, response.poles_hz)[:, 4] == 0).all()


def test_quantities_that_are_not_there_have_no_slope() -> None:
    model = MODELS["plain"]
    found = quantity_slopes(model, vector(model, "left"), dc_gain=100.0, poles_hz=())
    assert np.isnan(found[1:4]).all()
    assert np.isfinite(found[[0, 4, 5]]).all()
