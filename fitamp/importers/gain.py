"""Columns of numbers to frequency and complex loop gain."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.importers.columns import Column
from fitamp.importers.quantity import Quantity, Unit

__all__ = ["AGREEMENT", "differing", "frequency_hz", "gain_fault", "loop_gain"]

_HZ_PER = {Unit.HZ: 1.0, Unit.KHZ: 1e3, Unit.MHZ: 1e6, Unit.GHZ: 1e9, Unit.RAD_PER_S: 1 / (2 * math.pi)}
# Real and imaginary part, and magnitude and phase, of one file agree when they differ by less than this part of |T|:
# columns rounded to three digits, or to a tenth of a degree, still do.
AGREEMENT = 5e-3


def frequency_hz(column: Column, numbers: FloatArray) -> FloatArray:
    """Frequency in hertz, shape (n,)."""
    return numbers * _HZ_PER[column.unit or Unit.HZ]


def loop_gain(columns: Sequence[Column], numbers: Sequence[FloatArray | ComplexArray]) -> ComplexArray:
    """Complex loop gain from its one or two columns, shape (n,); see `gain_fault` for what is none."""
    first, *second = numbers
    if columns[0].quantity is Quantity.COMPLEX:
        return np.asarray(first, dtype=complex)
    (other,) = second
    if columns[0].quantity is Quantity.REAL:
        gain = np.empty(len(first), dtype=complex)
        gain.real, gain.imag = first, other
        return gain
    size = _size(columns[0], np.asarray(first, dtype=float))
    angle = np.radians(other) if columns[1].unit is Unit.DEGREE else np.asarray(other, dtype=float)
    with np.errstate(invalid="ignore", over="ignore"):
        return np.asarray(size * np.exp(1j * angle))


def gain_fault(
    columns: Sequence[Column], numbers: Sequence[FloatArray | ComplexArray]
) -> tuple[NDArray[np.bool_], str]:
    """Where a magnitude cannot be one, shape (n,), and what the first of them is."""
    if columns[0].quantity is not Quantity.MAGNITUDE:
        return np.zeros(len(numbers[0]), dtype=bool), ""
    size = _size(columns[0], np.asarray(numbers[0], dtype=float))
    fault = ~np.isfinite(size) | (size < 0)
    below = fault.any() and size[int(np.argmax(fault))] < 0
    return fault, "a linear magnitude below 0" if below else "a level far beyond any loop gain"


def differing(gain: ComplexArray, other: ComplexArray) -> NDArray[np.bool_]:
    """Where two readings of the same gain differ by more than rounding."""
    return np.asarray(np.abs(other - gain) > AGREEMENT * np.abs(gain))


def _size(column: Column, numbers: FloatArray) -> FloatArray:
    if column.unit is not Unit.DB:
        return numbers
    with np.errstate(over="ignore"):
        return np.asarray(10 ** (numbers / 20), dtype=float)
