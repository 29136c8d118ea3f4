"""The circuit as a model of a vector: what is free, priors, conditions, derivatives."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import DESIGN, FREQ_HZ, NOMINAL, solve_nodes

from fitamp.design import Bench, Design, HalfPlane, Roots
from fitamp.elements.circuit import Circuit
from fitamp.elements.condition import Condition
from fitamp.errors import UsageError

FULL = replace(
    Design.from_elements(
        NOMINAL.with_changes(Cgd=10e-15, mirror_pole_hz=600e6, delay_s=0.1e-9, beta=0.5),
        bench=Bench(load_f=2e-12, load_spread=0.05, delay_s=0.4e-9, delay_spread_s=0.02e-9),
    )
)
EVERYTHING = (
    "gm1",
    "R1",
    "C1",
    "gm2",
    "R2",
    "CL",
    "Cc",
    "Rz",
    "Cgd",
    "mirror_pole_hz",
    "bench_load_f",
    "bench_delay_s",
)


def test_what_has_a_spread_is_free_and_what_is_under_test_has_no_prior() -> None:
    circuit = Circuit.from_design(FULL)
    assert circuit.names == EVERYTHING
    assert [p.name for p in circuit.parameters if p.prior_sd is None] == ["Rz"]
    assert [p.prior_sd for p in circuit.parameters if p.name in ("gm1", "bench_load_f")] == [0.2, 0.05]


def test_what_has_no_spread_is_held() -> None:
    exact = Design.from_elements(NOMINAL, spreads={"gm1": 0.0, "Rz": 0.0}, under_test=(), bench=Bench(delay_s=0.0))
    names = Circuit.from_design(exact).names
    assert {"gm1", "Rz", "bench_load_f", "bench_delay_s"}.isdisjoint(names)


def test_a_delay_that_is_not_stated_is_free_without_a_prior() -> None:
    circuit = Circuit.from_design(replace(DESIGN, bench=Bench()))
    (delay,) = (p for p in circuit.parameters if p.name == "bench_delay_s")
    assert delay.prior_sd is None


def test_more_can_be_put_under_test() -> None:
    circuit = Circuit.from_design(DESIGN, under_test=["CL"])
    assert [p.name for p in circuit.parameters if p.prior_sd is None] == ["CL", "Rz"]


def test_the_designed_vector_is_the_design_on_its_bench() -> None:
    circuit = Circuit.from_design(FULL)
    assert_allclose(circuit.gain(circuit.designed, FREQ_HZ), FULL.on_bench().evaluate(FREQ_HZ), rtol=1e-10)
    assert circuit.elements(circuit.designed) == FULL.elements


def test_a_condition_adds_load_and_resistance() -> None:
    circuit = Circuit.from_design(FULL)
    moved = NOMINAL.with_changes(
        gm1=170e-6,
        C1=150e-15,
        CL=4.5e-12,
        Cc=1.7e-12,
        Rz=900.0,
        Cgd=12e-15,
        mirror_pole_hz=500e6,
        delay_s=0.1e-9,
        beta=0.5,
    )
    values = circuit.vector(
        **{name: getattr(moved, name) for name in EVERYTHING[:-2]}, bench_load_f=2.1e-12, bench_delay_s=0.35e-9
    )
    condition = Condition(load_added_f=5e-12, rz_added_ohm=-400.0)
    expected = solve_nodes(moved, FREQ_HZ, condition, bench_load_f=2.1e-12, delay_s=0.35e-9)
    assert_allclose(circuit.gain(values, FREQ_HZ, condition), expected, rtol=1e-9)
    loaded = circuit.loaded(values, condition)
    assert_allclose([loaded.CL, loaded.Rz], [11.6e-12, 500.0])


def test_derivatives_are_those_of_differences() -> None:
    circuit = Circuit.from_design(FULL)
    condition = Condition(load_added_f=5e-12, rz_added_ohm=200.0)
    values = circuit.designed + 0.1
    gain, slopes = circuit.gain_and_derivatives(values, FREQ_HZ, condition)
    size = np.abs(gain).max()
    for index in range(len(values)):
        step = np.zeros(len(values))
        step[index] = 1e-6
        difference = (
            circuit.gain(values + step, FREQ_HZ, condition) - circuit.gain(values - step, FREQ_HZ, condition)
        ) / 2e-6
        # A difference of two loop gains of 80 dB is no better than their rounding.
        assert_allclose(slopes[:, index], difference, rtol=1e-6, atol=1e-9 * size)


def test_priors_count_standard_deviations() -> None:
    circuit = Circuit.from_design(FULL)
    values = circuit.vector(gm1=NOMINAL.gm1 * np.exp(0.2), bench_delay_s=0.44e-9)
    residuals, rows = circuit.prior_rows(values)
    assert_allclose(residuals[[0, -1]], [1.0, 2.0], rtol=1e-12)
    assert_allclose(rows @ (values - circuit.designed), residuals, atol=1e-12)
    # Where there is no prior, a factor of e^10 is expected.
    assert_allclose(np.diag(circuit.prior_information())[[0, 7]], [25.0, 0.01])


def test_an_iterate_with_a_negative_resistor_has_elements_with_none() -> None:
    circuit = Circuit.from_design(DESIGN)
    values = circuit.vector(Rz=-50.0)
    assert circuit.physical(values)["Rz"] == pytest.approx(-50.0)
    assert circuit.elements(values).Rz == 0.0


def test_a_design_by_roots_has_no_elements_to_estimate() -> None:
    roots = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=50e6, zero_hz=100e6, half_plane=HalfPlane.LEFT)
    with pytest.raises(UsageError, match=r"the design gives roots; elements can only be estimated"):
        Circuit.from_design(Design.from_roots(roots))


@pytest.mark.parametrize(
    ("name", "complaint"),
    [("Rx", "no element is named Rx; known are gm1"), ("Cgd", "Cgd is under test, but the design has none")],
)
def test_what_is_not_there_cannot_be_under_test(name: str, complaint: str) -> None:
    with pytest.raises(UsageError, match=complaint):
        Circuit.from_design(DESIGN, under_test=[name])
