"""Loop gain by admittances, and its derivatives, against nodal analysis and against a complex step."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import BASE, NOMINAL, solve_nodes

from fitamp.amplifier import ELEMENT_NAMES, coefficients
from fitamp.elements.response import loop_gain_and_slopes

FREQ_HZ = np.geomspace(1.0, 10e9, 41)
S = np.asarray(2j * np.pi * FREQ_HZ, dtype=np.complex128)
FULL: dict[str, Any] = {name: getattr(NOMINAL, name) for name in ELEMENT_NAMES} | {
    "Cgd": 10e-15,
    "mirror_pole_hz": 600e6,
    "delay_s": 0.3e-9,
    "beta": 0.6,
}


def test_loop_gain_is_that_of_nodal_analysis() -> None:
    elements = NOMINAL.with_changes(Cgd=10e-15, mirror_pole_hz=600e6, delay_s=0.3e-9, beta=0.6)
    assert_allclose(loop_gain_and_slopes(FULL, S)[0], solve_nodes(elements, FREQ_HZ, BASE), rtol=1e-10)


@pytest.mark.parametrize("resistor_ohm", [0.0, 1300.0])
def test_slopes_by_the_circuit_are_those_of_a_complex_step(resistor_ohm: float) -> None:
    # Real and imaginary part of T(s) as functions of a complex element: at s and at its conjugate the polynomials of
    # `coefficients` are analytic in the element, T(s*) = T(s)* for real ones, and so the step is done for both.
    values = FULL | {"Rz": resistor_ohm, "mirror_pole_hz": None, "delay_s": 0.0}
    slopes = loop_gain_and_slopes(values, S)[1]
    names = (*ELEMENT_NAMES, "Cgd", "beta")
    plain = {name: values[name] for name in names}
    for name in (*ELEMENT_NAMES, "Cgd"):
        tiny = 1e-25 * FULL[name]
        numerator, denominator = coefficients(**(plain | {name: plain[name] + 1j * tiny}))
        top, bottom = (np.polynomial.polynomial.polyval(S, part.real) for part in (numerator, denominator))
        top_slope, bottom_slope = (
            np.polynomial.polynomial.polyval(S, part.imag / tiny) for part in (numerator, denominator)
        )
        expected = (top_slope - top / bottom * bottom_slope) / bottom
        # Some sums of the polynomials cancel at high frequency, hence not to the last digits.
        assert_allclose(slopes[name], expected, rtol=1e-7, atol=1e-12 * np.abs(expected).max())


@pytest.mark.parametrize("name", ["mirror_pole_hz", "delay_s"])
def test_slopes_by_mirror_and_delay_are_those_of_differences(name: str) -> None:
    step = 1e-5 * FULL[name]
    up, down = (loop_gain_and_slopes(FULL | {name: FULL[name] + sign * step}, S)[0] for sign in (1, -1))
    gain, slopes = loop_gain_and_slopes(FULL, S)
    rounding = 1e-15 * np.abs(gain).max() / step
    assert_allclose(slopes[name], (up - down) / (2 * step), rtol=1e-4, atol=rounding)


def test_a_resistor_below_zero_is_taken_as_it_is() -> None:
    # An iterate may pass 0; the loop gain must not have a kink there.
    below, at, above = (loop_gain_and_slopes(FULL | {"Rz": rz}, S)[0] for rz in (-1e-3, 0.0, 1e-3))
    assert_allclose(below + above, 2 * at, rtol=1e-9)
