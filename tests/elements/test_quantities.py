"""Zero time, poles, gain-bandwidth, crossover and phase margin: exact derivatives against differences."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import NOMINAL, drawn

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design import Bench, Design
from fitamp.elements.circuit import Circuit
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
from fitamp.margins import margins

FULL = NOMINAL.with_changes(Cgd=15e-15, mirror_pole_hz=400e6, delay_s=0.2e-9, beta=0.5)


def of_transfer(elements: Elements) -> dict[Quantity, float | None]:
    """The same quantities by way of the roots of the whole loop gain."""
    core = elements.with_changes(mirror_pole_hz=None).transfer()
    seen = margins(elements.transfer())
    return {
        Quantity.ZERO_TIME: core.zero_time_s,
        Quantity.POLE2: abs(core.poles_hz[1]),
        Quantity.PHASE_MARGIN: seen.phase_margin_deg,
        Quantity.CROSSOVER: seen.crossover_hz,
        Quantity.GAIN_BANDWIDTH: core.gain_bandwidth_hz,
    }


@pytest.mark.parametrize("elements", [FULL, drawn(3), drawn(4).with_changes(Rz=0.0)])
def test_values_are_those_of_the_loop_gain(elements: Elements) -> None:
    found = quantities_and_slopes(elements)
    for quantity, expected in of_transfer(elements).items():
        assert found[quantity][0] == pytest.approx(expected, rel=1e-9)


def test_sensitivities_are_those_of_differences() -> None:
    found = quantities_and_slopes(FULL)
    for name in (*ELEMENT_NAMES, "Cgd", "mirror_pole_hz"):
        value = getattr(FULL, name)
        up, down = (of_transfer(FULL.with_changes(**{name: value * (1 + sign * 1e-5)})) for sign in (1, -1))
        for quantity in Quantity:
            above, below, (centre, slopes) = up[quantity], down[quantity], found[quantity]
            assert above is not None
            assert below is not None
            assert centre is not None
            difference = (above - below) / (2e-5 * value)
            # Poles and crossovers are polished to rounding: 1e-12 of the quantity over a step of 1e-5.
            rounding = 1e-6 * abs(centre / value)
            assert slopes.get(name, 0.0) == pytest.approx(difference, rel=1e-5, abs=rounding)


def test_textbook_sensitivities_of_the_zero() -> None:
    # τz = Cc·(Rz − 1/gm2): ∂τz/∂Rz = Cc, ∂τz/∂Cc = Rz − 1/gm2 and ∂τz/∂gm2 = Cc/gm2², by hand.
    slopes = quantities_and_slopes(NOMINAL)[Quantity.ZERO_TIME][1]
    assert slopes["Rz"] == NOMINAL.Cc
    assert slopes["Cc"] == pytest.approx(NOMINAL.Rz - 1 / NOMINAL.gm2)
    assert slopes["gm2"] == pytest.approx(NOMINAL.Cc / NOMINAL.gm2**2)
    assert slopes["CL"] == 0.0


def test_a_loop_gain_below_one_has_no_crossover() -> None:
    found = quantities_and_slopes(NOMINAL.with_changes(beta=1e-5))
    for quantity in (Quantity.CROSSOVER, Quantity.PHASE_MARGIN):
        assert found[quantity][0] is None
        assert math.isnan(found[quantity][1]["gm1"])
    assert found[Quantity.POLE2][0] is not None


def test_derivatives_by_the_vector_count_the_bench_load_as_load() -> None:
    design = Design.from_elements(FULL, bench=Bench(load_f=2e-12, load_spread=0.05))
    circuit = Circuit.from_design(design)
    values = circuit.designed
    _, slopes = quantities_and_slopes(circuit.loaded(values))[Quantity.POLE2]
    found = by_vector(circuit, values, slopes)
    for index, name in enumerate(circuit.names):
        step = np.zeros(len(values))
        step[index] = 1e-5
        up, down = (of_transfer(circuit.loaded(values + sign * step))[Quantity.POLE2] for sign in (1, -1))
        assert up is not None
        assert down is not None
        assert_allclose(found[index], (up - down) / 2e-5, rtol=1e-5, atol=1.0, err_msg=name)
    without = by_vector(circuit, values, slopes, without=("CL", "bench_load_f"))
    assert without[circuit.names.index("CL")] == without[circuit.names.index("bench_load_f")] == 0.0


def test_units_are_those_of_the_names() -> None:
    assert [quantity.unit for quantity in Quantity] == ["s", "Hz", "deg", "Hz", "Hz"]
