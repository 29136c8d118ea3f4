"""The two-pole model and its loop equation: derivatives against differences, responses against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from bench_loops import FREQ_HZ, NOISE, STANDARD
from scipy import signal

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.two_pole import DelayPrior, FarPolePrior, TwoPole, loop_equation, solve
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

TIME_S = 3e-9
MIRROR = Transfer(dc_gain=1.0, poles_hz=(-90e6,), zeros_hz=(-180e6,))
FREE_FAR_POLE = FarPolePrior(intercept_s=0.2e-9, slope=0.3, sd_s=0.1e-9)
FREE_DELAY = DelayPrior(mean_s=0.4e-9, sd_s=0.2e-9)
MODELS = {
    "plain": TwoPole(time_s=TIME_S),
    "far pole": TwoPole(time_s=TIME_S, far_pole=FREE_FAR_POLE),
    "delay": TwoPole(time_s=TIME_S, delay=FREE_DELAY),
    "both": TwoPole(time_s=TIME_S, far_pole=FREE_FAR_POLE, delay=FREE_DELAY),
    "both and a known factor": TwoPole(time_s=TIME_S, far_pole=FREE_FAR_POLE, delay=FREE_DELAY, known=MIRROR),
    "held": TwoPole(
        time_s=TIME_S, far_pole=FarPolePrior(intercept_s=0.3e-9), delay=DelayPrior(mean_s=0.1e-9), known=MIRROR
    ),
}
# (g, q, b, τz): real poles with the zero on either side and none, a complex pair, an integrator-like pole 1.
POINTS = {
    "left": (9.5e7, 7.5e3, 2.7e-9, 1.4e-9),
    "right": (9.5e7, 7.5e3, 2.7e-9, -1.4e-9),
    "none": (9.5e7, 7.5e3, 2.7e-9, 0.0),
    "pair": (3.0e8, 2.0e7, 4.0e-8, 2.0e-9),
    "low pole 1": (9.5e7, 1e-3, 2.7e-9, 1.4e-9),
}


def vector(model: TwoPole, point: str) -> FloatArray:
    g, q, b, zero_time_s = POINTS[point]
    return model.vector(g=g, q=q, b=b, zero_time_s=zero_time_s)


def differences(function: object, values: FloatArray) -> ComplexArray:
    """Central differences with Richardson's extrapolation, fourth order."""
    assert callable(function)
    columns = []
    for index in range(len(values)):
        unit = np.zeros(len(values))
        unit[index] = 1e-3
        coarse = (function(values + unit) - function(values - unit)) / 2e-3
        fine = (function(values + unit / 2) - function(values - unit / 2)) / 1e-3
        columns.append((4 * fine - coarse) / 3)
    return np.stack(columns, axis=1)


@pytest.mark.parametrize("point", POINTS)
@pytest.mark.parametrize("name", MODELS)
def test_derivatives_of_the_model(name: str, point: str) -> None:
    model = MODELS[name]
    values = vector(model, point)
    gain, slopes = model.gain_and_derivatives(values, FREQ_HZ)
    assert slopes.shape == (len(FREQ_HZ), len(model.names))
    expected = differences(lambda v: model.gain(v, FREQ_HZ), values)
    assert slopes / gain[:, np.newaxis] == pytest.approx(expected / gain[:, np.newaxis], rel=1e-8, abs=1e-9)


@pytest.mark.parametrize("noise", [NOISE, NoiseLevels(error_channel=1e-3, return_channel=1e-5, relative=0.0)])
@pytest.mark.parametrize("name", MODELS)
def test_derivatives_of_the_loop_equation_with_the_variance_in_them(name: str, noise: NoiseLevels) -> None:
    # The sweep is not the model's own, so the term through the variance counts.
    model = MODELS[name]
    sweep = STANDARD.measured(3)
    values = vector(model, "right") + 0.1
    _, slopes = loop_equation(model, values, sweep, noise)
    expected = differences(lambda v: loop_equation(model, v, sweep, noise)[0], values)
    assert slopes == pytest.approx(expected, rel=1e-6, abs=1e-6 * float(np.abs(expected).max(axis=0).min()))


def test_loop_equation_is_in_standard_deviations_of_the_bench() -> None:
    # Receivers' floors put through T = return/error to first order (the linearised quotient); the true loop is the
    # model, so each component has mean square 1. 281 points × 40 sweeps: 1 % is three standard errors.
    w1, w2 = 2 * np.pi * 1.2e3, 2 * np.pi * 58e6
    a1, a2 = 1 / w1 + 1 / w2, 1 / (w1 * w2)
    model = TwoPole(time_s=TIME_S)
    values = model.vector(g=STANDARD.dc_gain / a1, q=1 / a1, b=a2 / a1, zero_time_s=STANDARD.zero_time_s)
    assert model.gain(values, FREQ_HZ) == pytest.approx(STANDARD.gain(), rel=1e-12)
    residuals = [loop_equation(model, values, STANDARD.measured(seed), NOISE)[0] for seed in range(40)]
    assert np.mean(np.abs(residuals) ** 2) == pytest.approx(2.0, rel=0.02)
    thirds = np.array_split(np.mean(np.abs(residuals) ** 2, axis=0), 3)
    assert [third.mean() for third in thirds] == pytest.approx([2.0, 2.0, 2.0], rel=0.06)


@pytest.mark.parametrize("point", POINTS)
def test_gain_is_that_of_the_polynomials(point: str) -> None:
    g, q, b, zero_time_s = POINTS[point]
    model = TwoPole(time_s=TIME_S, far_pole=FarPolePrior(intercept_s=0.3e-9), delay=DelayPrior(mean_s=0.1e-9))
    far_s, delay_s = 0.3e-9, 0.1e-9
    numerator = [g * zero_time_s, g] if zero_time_s else [g]
    _, expected = signal.freqresp((numerator, [b * far_s, b, 1, q]), 2 * np.pi * FREQ_HZ)
    expected = expected * np.exp(-2j * np.pi * FREQ_HZ * delay_s)
    assert model.gain(vector(model, point), FREQ_HZ) == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize("point", POINTS)
@pytest.mark.parametrize("name", MODELS)
def test_response_is_the_gain_without_delay_and_known_factor(name: str, point: str) -> None:
    model = MODELS[name]
    values = vector(model, point)
    delay_s = model.physical(values)[5]
    expected = model.response(values).evaluate(FREQ_HZ) * np.exp(-2j * np.pi * FREQ_HZ * delay_s)
    if model.known is not None:
        expected = expected * model.known.evaluate(FREQ_HZ)
    assert model.gain(values, FREQ_HZ) == pytest.approx(expected, rel=1e-9)


def test_response_has_the_roots_that_were_put_in() -> None:
    # (1 + s/ω1)(1 + s/ω2) with ω/2π of 1 kHz and 10 MHz, and the zero at 20 MHz in the right half plane.
    w1, w2, wz = 2 * np.pi * 1e3, 2 * np.pi * 10e6, 2 * np.pi * 20e6
    a1, a2 = 1 / w1 + 1 / w2, 1 / (w1 * w2)
    model = TwoPole(time_s=TIME_S)
    response = model.response(model.vector(g=500 / a1, q=1 / a1, b=a2 / a1, zero_time_s=-1 / wz))
    assert response.dc_gain == pytest.approx(500, rel=1e-12)
    assert sorted(abs(pole) for pole in response.poles_hz) == pytest.approx([1e3, 10e6], rel=1e-12)
    assert all(pole.real < 0 for pole in response.poles_hz)
    assert response.zeros_hz[0] == pytest.approx(20e6, rel=1e-12)


def test_no_zero_time_is_no_zero_and_a_negative_far_pole_time_no_pole() -> None:
    model = TwoPole(time_s=TIME_S, far_pole=FarPolePrior(sd_s=np.inf))
    values = model.vector(g=1e8, q=1e4, b=1e-9, zero_time_s=0.0)
    values[4] = -0.01
    response = model.response(values)
    assert response.zeros_hz == ()
    assert len(response.poles_hz) == 2
    values[4] = 0.01
    assert len(model.response(values).poles_hz) == 3


@pytest.mark.parametrize("name", MODELS)
@pytest.mark.parametrize("point", POINTS)
def test_vector_and_physical_are_inverse(name: str, point: str) -> None:
    model = MODELS[name]
    g, q, b, zero_time_s, *_ = model.physical(vector(model, point))
    assert (g, q, b) == pytest.approx(POINTS[point][:3], rel=1e-12)
    assert zero_time_s == pytest.approx(POINTS[point][3], rel=1e-12, abs=1e-24)


def test_priors_count_in_standard_deviations() -> None:
    model = MODELS["both"]
    zero_time_s, far_s, delay_s = 1.0e-9, 0.65e-9, 0.1e-9
    values = model.vector(g=1e8, q=1e4, b=1e-9, zero_time_s=zero_time_s, far_pole_s=far_s)
    values[5] = delay_s / TIME_S
    residuals, rows = model.prior_rows(values)
    # τ3 against 0.2 ns + 0.3·τz ± 0.1 ns, τd against 0.4 ± 0.2 ns.
    assert residuals == pytest.approx([(0.65 - 0.2 - 0.3) / 0.1, (0.1 - 0.4) / 0.2])
    assert rows == pytest.approx(differences(lambda v: model.prior_rows(v)[0], values).real, rel=1e-9)


@pytest.mark.parametrize("sd_s", [0.0, np.inf])
def test_nothing_known_and_all_known_add_no_prior_rows(sd_s: float) -> None:
    model = TwoPole(time_s=TIME_S, far_pole=FarPolePrior(sd_s=sd_s), delay=DelayPrior(sd_s=sd_s))
    residuals, rows = model.prior_rows(vector(model, "left"))
    assert residuals.shape == (0,)
    assert rows.shape == (0, len(model.names))


def test_far_pole_and_delay_come_back_from_an_exact_sweep() -> None:
    model = TwoPole(time_s=TIME_S, far_pole=FarPolePrior(sd_s=np.inf), delay=DelayPrior(sd_s=np.inf))
    truth = model.vector(g=9.5e7, q=7.5e3, b=2.7e-9, zero_time_s=1.4e-9, far_pole_s=0.3e-9)
    truth[5] = 0.2e-9 / TIME_S
    sweep = Sweep(freq_hz=FREQ_HZ, gain=model.gain(truth, FREQ_HZ))
    found = solve(model, sweep, NOISE, truth + 0.05)
    assert found.optimum.converged
    assert found.values == pytest.approx(truth, rel=1e-6, abs=1e-8)


def test_a_held_parameter_stays_and_has_no_variance() -> None:
    model = TwoPole(time_s=TIME_S)
    sweep = STANDARD.measured(1)
    free = solve(model, sweep, NOISE, vector(model, "left"))
    held = solve(model, sweep, NOISE, free.values, hold=(3, 0.25))
    assert held.values[3] == 0.25
    assert held.covariance[3].tolist() == [0, 0, 0, 0]
    assert held.optimum.names == model.names
    assert held.optimum.chi_square > free.optimum.chi_square
    assert len(held.residuals) == len(sweep)
