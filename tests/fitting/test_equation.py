"""The loop equation as it is evaluated in a fit: each point once, and never spoilt by who was given it."""

from __future__ import annotations

import numpy as np
import pytest
from bench_loops import FREQ_HZ, NOISE, STANDARD
from test_two_pole import MODELS, TIME_S, differences, vector

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.equation import Grid, LoopEquation
from fitamp.fitting.two_pole import TwoPole, loop_equation
from fitamp.sweep import NoiseLevels


@pytest.mark.parametrize(
    "noise", [NOISE, NoiseLevels(error_channel=0.0, return_channel=1e-5, relative=0.0, ratio=1e-4)]
)
@pytest.mark.parametrize("name", MODELS)
def test_rows_are_the_equation_re_and_im_in_turn_and_then_the_priors(name: str, noise: NoiseLevels) -> None:
    model, sweep = MODELS[name], STANDARD.measured(3)
    values = vector(model, "left") + 0.05
    equation = LoopEquation(model, sweep, noise)
    rows, slopes = equation.residuals(values), equation.slopes(values)
    # Written out as the module's head has it.
    gain = model.gain(values, FREQ_HZ)
    through = 1 + sweep.gain
    variance = noise.return_channel**2 + np.abs(gain) ** 2 * noise.error_channel**2
    variance = variance + (noise.relative * np.abs(sweep.gain / through)) ** 2 + (noise.ratio / np.abs(through)) ** 2
    expected = (sweep.gain - gain) / through * np.sqrt(2 / variance)
    assert rows[: 2 * len(sweep) : 2] == pytest.approx(expected.real, rel=1e-10, abs=1e-12)
    assert rows[1 : 2 * len(sweep) : 2] == pytest.approx(expected.imag, rel=1e-10, abs=1e-12)
    priors, prior_rows = model.prior_rows(values)
    assert rows[2 * len(sweep) :] == pytest.approx(priors, rel=1e-12)
    assert slopes[2 * len(sweep) :] == pytest.approx(prior_rows, rel=1e-12)
    steep = differences(equation.residuals, values)
    assert slopes == pytest.approx(steep, rel=1e-6, abs=1e-6 * float(np.abs(steep).max(axis=0).min()))
    residual, slope = loop_equation(model, values, sweep, noise)
    assert residual == pytest.approx(expected, rel=1e-10)
    assert slope.shape == (len(sweep), len(values))


def test_who_writes_into_the_residuals_does_not_change_them() -> None:
    model = MODELS["plain"]
    equation = LoopEquation(model, STANDARD.measured(3), NOISE)
    values = vector(model, "left")
    before = equation.residuals(values)
    kept = before.copy()
    before[:] = 0.0
    assert equation.residuals(values).tolist() == kept.tolist()


def test_residuals_and_slopes_of_one_point_take_one_evaluation() -> None:
    counted: list[bytes] = []

    class Counting(TwoPole):
        def gain_and_log_slopes(self, values: FloatArray, grid: Grid) -> tuple[ComplexArray, ComplexArray]:
            counted.append(values.tobytes())
            return TwoPole.gain_and_log_slopes(self, values, grid)

    model = Counting(time_s=TIME_S)
    equation = LoopEquation(model, STANDARD.measured(3), NOISE)
    here, there = vector(model, "left"), vector(model, "right")
    for values in (here, there, here):
        equation.residuals(values)
        equation.slopes(values)
        equation.residuals(values)
    assert len(counted) == 3
