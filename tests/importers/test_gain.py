"""Columns to frequency and complex gain: Python's cmath is the reference."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest

from fitamp.importers.columns import Column
from fitamp.importers.gain import differing, frequency_hz, gain_fault, loop_gain
from fitamp.importers.quantity import Quantity, Unit


def column(quantity: Quantity, unit: Unit | None = None) -> Column:
    return Column(index=0, name="", quantity=quantity, unit=unit)


@pytest.mark.parametrize(
    ("unit", "hertz"),
    [(Unit.HZ, 1), (Unit.KHZ, 1e3), (Unit.MHZ, 1e6), (Unit.GHZ, 1e9), (Unit.RAD_PER_S, 0.5 / math.pi)],
)
def test_frequency_in_hertz(unit: Unit, hertz: float) -> None:
    assert frequency_hz(column(Quantity.FREQUENCY, unit), np.array([2.0]))[0] == pytest.approx(2 * hertz, rel=1e-15)


@pytest.mark.parametrize("size_unit", [Unit.DB, Unit.LINEAR])
@pytest.mark.parametrize("angle_unit", [Unit.DEGREE, Unit.RADIAN])
def test_magnitude_and_phase(size_unit: Unit, angle_unit: Unit) -> None:
    size, angle = 12.5, -2.1
    gain = loop_gain(
        [column(Quantity.MAGNITUDE, size_unit), column(Quantity.PHASE, angle_unit)],
        [
            np.array([20 * math.log10(size) if size_unit is Unit.DB else size]),
            np.array([math.degrees(angle) if angle_unit is Unit.DEGREE else angle]),
        ],
    )
    assert gain[0] == pytest.approx(cmath.rect(size, angle), rel=1e-14)


def test_real_and_imaginary_keep_every_bit() -> None:
    gain = loop_gain([column(Quantity.REAL), column(Quantity.IMAGINARY)], [np.array([0.1]), np.array([-0.0])])
    assert (gain[0].real, math.copysign(1, gain[0].imag)) == (0.1, -1)


def test_magnitude_that_cannot_be_one() -> None:
    linear = [column(Quantity.MAGNITUDE, Unit.LINEAR), column(Quantity.PHASE, Unit.DEGREE)]
    fault, what = gain_fault(linear, [np.array([1.0, -1.0]), np.zeros(2)])
    assert (fault.tolist(), what) == ([False, True], "a linear magnitude below 0")
    decibels = [column(Quantity.MAGNITUDE, Unit.DB), column(Quantity.PHASE, Unit.DEGREE)]
    fault, what = gain_fault(decibels, [np.array([9999.0, 1.0]), np.zeros(2)])
    assert (fault.tolist(), what) == ([True, False], "a level far beyond any loop gain")


def test_rounding_is_no_difference() -> None:
    gain = np.array([100 + 0j, 100 + 0j])
    assert differing(gain, np.array([100.4 + 0j, 101 + 0j])).tolist() == [False, True]
