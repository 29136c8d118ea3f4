"""The two-stage amplifier: exact loop gain against nodal analysis, textbook examples and facts of the trade."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from fitamp.amplifier import ELEMENT_NAMES, Elements, coefficients
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.errors import DesignError
from fitamp.transfer import Transfer

TWO_PI = 2 * math.pi
FREQ_HZ = np.logspace(1, 11, 61)
# Invented values of a usual size.
USUAL = Elements(gm1=160e-6, R1=1e6, C1=0.15e-12, gm2=1.6e-3, R2=50e3, CL=5e-12, Cc=1.8e-12, Rz=1300.0)


def varied(count: int, *, seed: int) -> list[Elements]:
    """Amplifiers spread over a factor of 30 in every element."""
    rng = np.random.default_rng(seed)
    return [
        Elements(**{name: getattr(USUAL, name) * 30 ** rng.uniform(-0.5, 0.5) for name in ELEMENT_NAMES})
        for _ in range(count)
    ]


def solve_nodes(e: Elements, freq_hz: FloatArray) -> ComplexArray:
    """Return the loop gain from Kirchhoff's current law, solved numerically with three nodes.

    Nodes: 0 first stage's output, 1 second stage's output, 2 between Cc and Rz (joined with 1 where Rz is 0). A
    test voltage of 1 V drives gm1. Each element is stamped on its own; nothing is shared with the closed form.
    """

    def stamp(matrix: ComplexArray, admittance: complex, a: int, b: int | None = None) -> None:
        matrix[a, a] += admittance
        if b is not None:
            matrix[b, b] += admittance
            matrix[a, b] -= admittance
            matrix[b, a] -= admittance

    size = 3 if e.Rz else 2
    gains = []
    for s in 2j * np.pi * freq_hz:
        matrix = np.zeros((size, size), dtype=complex)
        stamp(matrix, 1 / e.R1, 0)
        stamp(matrix, s * e.C1, 0)
        stamp(matrix, 1 / e.R2, 1)
        stamp(matrix, s * e.CL, 1)
        stamp(matrix, s * e.Cc, 0, size - 1)
        if e.Rz:
            stamp(matrix, 1 / e.Rz, 2, 1)
        stamp(matrix, s * e.Cgd, 0, 1)
        matrix[1, 0] += e.gm2
        # An inverting second stage inside needs an inverting first one for negative feedback: gm1 pulls its node
        # down, and the loop gain is +beta times the output.
        voltages = np.linalg.solve(matrix, np.array([-e.gm1, 0, 0][:size], dtype=complex))
        gains.append(e.beta * voltages[1])
    return np.array(gains)


@pytest.mark.parametrize("overlap_f", [0.0, 8e-15, 0.3e-12])
def test_loop_gain_is_that_of_nodal_analysis(overlap_f: float) -> None:
    for drawn in varied(8, seed=3):
        elements = drawn.with_changes(Cgd=overlap_f, beta=0.4)
        assert_allclose(elements.transfer().evaluate(FREQ_HZ), solve_nodes(elements, FREQ_HZ), rtol=1e-10)


@pytest.mark.parametrize("overlap_f", [0.0, 1e-14])
def test_without_a_resistor_two_poles_and_one_zero_are_left(overlap_f: float) -> None:
    elements = USUAL.with_changes(Rz=0, Cgd=overlap_f)
    assert len(elements.transfer().poles_hz) == 2
    assert len(elements.transfer().zeros_hz) == 1
    assert_allclose(elements.transfer().evaluate(FREQ_HZ), solve_nodes(elements, FREQ_HZ), rtol=1e-10)


def test_coefficients_are_the_written_out_ones() -> None:
    # Textbook small-signal algebra without Cgd, multiplied out by hand.
    for e in varied(5, seed=5):
        numerator, denominator = coefficients(**{name: getattr(e, name) for name in ELEMENT_NAMES})
        gain = e.gm1 * e.R1 * e.gm2 * e.R2
        a1 = e.R2 * (e.CL + e.Cc) + e.R1 * (e.C1 + e.Cc) + e.gm2 * e.R1 * e.R2 * e.Cc + e.Rz * e.Cc
        a2 = e.R1 * e.R2 * (e.C1 * e.CL + e.Cc * e.C1 + e.Cc * e.CL)
        a2 += e.Rz * e.Cc * (e.R1 * e.C1 + e.R2 * e.CL)
        a3 = e.R1 * e.R2 * e.Rz * e.C1 * e.CL * e.Cc
        assert_allclose(denominator, [1, a1, a2, a3], rtol=1e-13)
        assert_allclose(numerator, [gain, gain * e.Cc * (e.Rz - 1 / e.gm2), 0], rtol=1e-12)


def test_coefficients_differentiate_by_a_complex_step() -> None:
    values: dict[str, Any] = {name: getattr(USUAL, name) for name in ELEMENT_NAMES} | {"Cgd": 1e-14, "beta": 0.7}
    for name, value in values.items():
        tiny = value * 1e-30
        stepped = np.concatenate(coefficients(**(values | {name: value + 1j * tiny}))).imag / tiny
        up = np.concatenate(coefficients(**(values | {name: value * 1.0001})))
        down = np.concatenate(coefficients(**(values | {name: value * 0.9999})))
        # Every coefficient is at most linear in each element, so central differences are exact but for rounding.
        assert np.all(np.abs(stepped * value - (up - down) / 2e-4) <= 1e-11 * np.abs(up))


def test_textbook_two_stage_design() -> None:
    # Allen & Holberg, CMOS Analog Circuit Design, two-stage design example, from memory: GB 5 MHz, CL 10 pF, Cc 3 pF,
    # gm2 942.5 µS; second pole gm2/CL = 15 MHz, zero gm2/Cc = 50 MHz in the right half plane. The book's second pole
    # neglects C1, which is set small here (10 fF), and all output conductances.
    example = Elements(gm1=TWO_PI * 5e6 * 3e-12, R1=2e6, C1=10e-15, gm2=942.5e-6, R2=200e3, CL=10e-12, Cc=3e-12, Rz=0.0)
    loop_gain = example.transfer()
    assert example.gain_bandwidth_approx_hz == pytest.approx(5e6)
    assert example.pole2_approx_hz == pytest.approx(15e6, rel=0.01)
    assert loop_gain.gain_bandwidth_hz == pytest.approx(5e6, rel=0.02)
    assert loop_gain.poles_hz[1].real == pytest.approx(-15e6, rel=0.02)
    assert_allclose(loop_gain.zeros_hz, [50e6], rtol=1e-3)
    # The same book, nulling resistor that puts the zero on the second pole: (1 + CL/Cc)/gm2 = 4.6 kΩ.
    assert example.pole_cancelling_resistor == pytest.approx(4.6e3, rel=0.005)
    nulled = example.with_changes(Rz=4.6e3).transfer()
    assert nulled.zeros_hz[0].real == pytest.approx(nulled.poles_hz[1].real, rel=0.03)


def test_compensation_splits_the_poles() -> None:
    # Gray, Hurst, Lewis & Meyer, Analysis and Design of Analog Integrated Circuits, pole splitting, from memory: with
    # Cc growing, the dominant pole goes down towards 1/(gm2·R1·R2·Cc) and the second up towards gm2/(C1 + CL).
    base = USUAL.with_changes(Rz=0, C1=1e-12)
    uncompensated = sorted([1 / (TWO_PI * base.R1 * base.C1), 1 / (TWO_PI * base.R2 * base.CL)])
    nearly_none = base.with_changes(Cc=1e-19).transfer()
    assert_allclose(-np.real(nearly_none.poles_hz), uncompensated, rtol=1e-3)
    split = [base.with_changes(Cc=1e-13 * 2**step).transfer().poles_hz for step in range(12)]
    assert np.all(np.diff([abs(poles[0]) for poles in split]) < 0)
    assert np.all(np.diff([abs(poles[1]) for poles in split]) > 0)
    much = base.with_changes(Cc=1e-9).transfer()
    assert abs(much.poles_hz[0]) == pytest.approx(1 / (TWO_PI * base.gm2 * base.R1 * base.R2 * 1e-9), rel=0.02)
    assert abs(much.poles_hz[1]) == pytest.approx(base.gm2 / (TWO_PI * (base.C1 + base.CL)), rel=0.02)


def test_without_a_resistor_the_zero_is_at_gm2_over_cc_on_the_right() -> None:
    # Fact of the trade (common practice): an inverting stage with a capacitor across it has its zero at +gm/C.
    zero = USUAL.with_changes(Rz=0).transfer().zeros_hz
    assert_allclose(zero, [USUAL.gm2 / (TWO_PI * USUAL.Cc)], rtol=1e-12)


def test_nulling_product_of_one_sends_the_zero_to_infinity() -> None:
    # Fact of the trade. gm2 = 2^-10 S and Rz = 2^10 Ω make the product exactly 1 in binary.
    nulled = USUAL.with_changes(gm2=2.0**-10, Rz=2.0**10)
    assert nulled.nulling_product == 1
    assert nulled.zero_time_s == 0
    assert nulled.transfer().zeros_hz == ()
    assert nulled.transfer().zero_time_s == 0


def test_zero_time_is_a_straight_line_through_the_nulling_point() -> None:
    for product in (0.0, 0.5, 0.999, 1.001, 2.0, 4.0):
        elements = USUAL.with_changes(Rz=product / USUAL.gm2)
        expected = USUAL.Cc / USUAL.gm2 * (product - 1)
        assert elements.zero_time_s == pytest.approx(expected, rel=1e-12)
        assert elements.transfer().zero_time_s == pytest.approx(expected, rel=1e-10)


def test_pole_and_zero_coincide_for_an_ideally_driven_stage() -> None:
    # Fact of the trade: at n = 1 + CL/Cc the zero cancels a pole exactly when stage 1 has no capacitance and the stages
    # no conductance. Small C1 and high R1, R2 come close.
    driven = USUAL.with_changes(C1=1e-19, R1=1e12, R2=1e12)
    cancelled = driven.with_changes(Rz=(1 + driven.CL / driven.Cc) / driven.gm2).transfer()
    assert cancelled.poles_hz[1].real == pytest.approx(cancelled.zeros_hz[0].real, rel=1e-5)


def test_overlap_capacitor_brings_a_right_half_plane_zero_back() -> None:
    nulled = USUAL.with_changes(Rz=2 / USUAL.gm2)
    assert all(zero.real < 0 for zero in nulled.transfer().zeros_hz)
    bridged = nulled.with_changes(Cgd=10e-15).transfer()
    assert sorted(zero.real > 0 for zero in bridged.zeros_hz) == [False, True]
    # The numerator gm2·D − N has s·(Cc·(gm2·Rz − 1) − Cgd) in it.
    assert bridged.zero_time_s == pytest.approx(nulled.zero_time_s - 10e-15 / nulled.gm2, rel=1e-9)


def test_third_pole_acts_like_a_negative_zero_time() -> None:
    # To first order 1/(1 + s/p3) is 1 − s/p3: with n = 1 the phase that is left is that of pole 3 alone.
    nulled = USUAL.with_changes(Rz=1 / USUAL.gm2)
    pole3_hz = abs(nulled.transfer().poles_hz[2])
    assert nulled.pole3_approx_hz == pytest.approx(pole3_hz, rel=0.2)
    assert USUAL.with_changes(Rz=0).pole3_approx_hz is None


def test_mirror_adds_a_pole_and_a_zero_at_twice_its_frequency() -> None:
    # Common practice: (1 + s/(2·p))/(1 + s/p), because one half of the signal goes through the mirror.
    mirrored = USUAL.with_changes(mirror_pole_hz=200e6).transfer()
    half_mirrored = 0.5 * (1 + 1 / (1 + 1j * FREQ_HZ / 200e6))
    assert_allclose(mirrored.evaluate(FREQ_HZ), USUAL.transfer().evaluate(FREQ_HZ) * half_mirrored, rtol=1e-12)


def test_delay_turns_the_phase_only() -> None:
    delayed = USUAL.with_changes(delay_s=0.3e-9).transfer().evaluate(FREQ_HZ[:40])
    plain = USUAL.transfer().evaluate(FREQ_HZ[:40])
    assert_allclose(delayed / plain, np.exp(-1j * TWO_PI * FREQ_HZ[:40] * 0.3e-9), rtol=1e-11)


def test_feedback_factor_scales_the_loop_gain() -> None:
    half = USUAL.with_changes(beta=0.5).transfer()
    assert half == Transfer(
        dc_gain=USUAL.transfer().dc_gain / 2,
        poles_hz=USUAL.transfer().poles_hz,
        zeros_hz=USUAL.transfer().zeros_hz,
    )


def test_approximations_are_near_for_a_usual_amplifier() -> None:
    loop_gain = USUAL.transfer()
    assert USUAL.gain_bandwidth_approx_hz == pytest.approx(loop_gain.gain_bandwidth_hz, rel=0.05)
    assert USUAL.pole2_approx_hz == pytest.approx(abs(loop_gain.poles_hz[1]), rel=0.1)
    cancelled = USUAL.with_changes(Rz=USUAL.pole_cancelling_resistor).transfer()
    assert abs(cancelled.zeros_hz[0]) == pytest.approx(abs(cancelled.poles_hz[1]), rel=0.1)


@pytest.mark.parametrize("name", [*ELEMENT_NAMES, "Cgd", "delay_s", "beta", "mirror_pole_hz"])
@pytest.mark.parametrize("faulty", [-1.0, math.nan, math.inf, "1 mS", True])
def test_faulty_value_is_refused_by_name(name: str, faulty: Any) -> None:
    with pytest.raises(DesignError, match=f"^{name} must be"):
        USUAL.with_changes(**{name: faulty})


@pytest.mark.parametrize("name", ["gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "beta", "mirror_pole_hz"])
def test_zero_is_refused_where_an_element_must_be_there(name: str) -> None:
    with pytest.raises(DesignError, match=f"{name} must be finite and above 0, but is 0"):
        USUAL.with_changes(**{name: 0.0})


def test_none_is_a_value_for_the_mirror_only() -> None:
    with pytest.raises(DesignError, match="Cc must be a number above 0, but is None"):
        USUAL.with_changes(Cc=None)
    assert USUAL.with_changes(mirror_pole_hz=None).mirror_pole_hz is None


def test_unknown_element_is_refused() -> None:
    with pytest.raises(DesignError, match="no element is named Cm, Rc; known are gm1, R1"):
        USUAL.with_changes(Rc=1.0, Cm=2.0)
