"""The loop-equation residual of a circuit, and the information that sweeps will hold."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import DESIGN, FREQ_HZ, NOISE, NOMINAL, STEPS, exact_sweep, swept

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.design import Bench
from fitamp.elements.circuit import Circuit
from fitamp.elements.condition import Condition
from fitamp.elements.residual import Measured, information, stacked

CIRCUIT = Circuit.from_design(DESIGN)
WIDE_HZ = np.geomspace(10.0, 100e6, 281)


def test_the_residual_of_the_truth_is_the_noise() -> None:
    sweeps = swept(NOMINAL, STEPS, seed=1)
    measured = [Measured(sweep=sweep, condition=step, noise=NOISE) for sweep, step in zip(sweeps, STEPS, strict=True)]
    residuals = stacked(CIRCUIT, CIRCUIT.designed, measured)[0]
    rows = 2 * len(FREQ_HZ) * len(STEPS)
    # Chi-square of 1410 normal deviates: 1410 ± 53.
    assert residuals[:rows] @ residuals[:rows] == pytest.approx(rows, abs=4 * np.sqrt(2 * rows))
    assert_allclose(residuals[rows:], 0.0)


def test_derivatives_are_those_of_differences() -> None:
    measured = [
        Measured(sweep=exact_sweep(NOMINAL.with_changes(gm2=1.7e-3), step), condition=step, noise=NOISE)
        for step in STEPS[:2]
    ]
    values = CIRCUIT.designed
    slopes = stacked(CIRCUIT, values, measured)[1]
    for index in range(len(values)):
        step = np.zeros(len(values))
        step[index] = 1e-6
        difference = (
            stacked(CIRCUIT, values + step, measured)[0] - stacked(CIRCUIT, values - step, measured)[0]
        ) / 2e-6
        assert_allclose(slopes[:, index], difference, rtol=1e-5, atol=1e-7 * np.abs(difference).max())


def test_a_floor_of_the_ratio_and_of_a_receiver_enter_by_their_own_laws() -> None:
    # Receiver floors of 1e-4 each on T = 10^4 at DC: ±|T|·|1 + T|·1e-4 there, so that T off by 1 % is 1e-2 σ·√2 off.
    loop = exact_sweep(NOMINAL)
    low = replace(loop, freq_hz=loop.freq_hz[:1], gain=loop.gain[:1] * 1.01)
    noise = replace(NOISE, error_channel=1e-4, return_channel=0.0, relative=0.0)
    residuals = stacked(CIRCUIT, CIRCUIT.designed, [Measured(sweep=low, condition=STEPS[0], noise=noise)])[0]
    size = abs(loop.gain[0])
    expected = np.sqrt(2) * 0.01 * size / (size * 1e-4) / abs(1 + 1.01 * loop.gain[0])
    assert np.hypot(*residuals[:2]) == pytest.approx(expected, rel=1e-6)


@pytest.mark.parametrize(
    ("steps", "expected"),
    [
        # Relative standard deviations of gm1, R1, C1, gm2, R2, CL, Cc and Rz found while the method was designed, with
        # an independent sketch of the same circuit and bench: one sweep, added loads, added resistances.
        ([(0, 0)], {"gm1": 0.12, "R1": 0.16, "C1": 0.07, "gm2": 0.13, "R2": 0.16, "CL": 0.12, "Cc": 0.12, "Rz": 0.07}),
        ([(0, 0), (5, 0), (10, 0), (20, 0)], {"gm2": 0.005, "CL": 0.002}),
        ([(0, 0), (0, -400), (0, 400)], {"Cc": 0.0005, "gm1": 0.002}),
    ],
)
def test_expected_precision_of_steps(steps: list[tuple[float, float]], expected: dict[str, float]) -> None:
    design = replace(DESIGN, bench=Bench(delay_s=0.0), under_test=frozenset())
    circuit = Circuit.from_design(design)
    total = circuit.prior_information()
    for load_pf, rz_ohm in steps:
        condition = Condition(load_added_f=load_pf * 1e-12, rz_added_ohm=rz_ohm)
        total = total + information(circuit, circuit.designed, WIDE_HZ, NOISE, condition=condition)
    sds = dict(zip(circuit.names, np.sqrt(np.diag(np.linalg.inv(total))), strict=True))
    sds["Rz"] /= NOMINAL.nulling_product  # in units of 1/gm2
    assert set(sds) == set(ELEMENT_NAMES)
    for name, sd in expected.items():
        assert sds[name] == pytest.approx(sd, rel=0.15)  # the sketch's numbers are rounded
