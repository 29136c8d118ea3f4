"""What follows from the elements, with exact derivatives: zero time, poles, gain-bandwidth, crossover, phase margin.

Derivatives of the roots are implicit ones, dp = −(∂P/∂x)/(∂P/∂s); so are those of the crossover.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Mapping
from enum import StrEnum
from typing import Any

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES, Elements, coefficients
from fitamp.arrays import FloatArray
from fitamp.elements.circuit import BENCH_LOAD, MIRROR_POLE, Circuit
from fitamp.elements.response import loop_gain_and_slopes
from fitamp.margins import margins
from fitamp.transfer import TWO_PI, Transfer

__all__ = ["Quantity", "Slopes", "by_vector", "quantities_and_slopes"]

# Step of the complex differentiation, relative; the coefficients are polynomials in every element.
COMPLEX_STEP = 1e-30
_IN_COEFFICIENTS = (*ELEMENT_NAMES, "Cgd")

Slopes = dict[str, float]


class Quantity(StrEnum):
    """What elements are blamed for, by the names that fits and designs use."""

    ZERO_TIME = "zero_time_s"
    POLE2 = "pole2_hz"
    PHASE_MARGIN = "phase_margin_deg"
    CROSSOVER = "crossover_hz"
    GAIN_BANDWIDTH = "gain_bandwidth_hz"

    @property
    def unit(self) -> str:
        """Unit of its numbers."""
        return {"zero_time_s": "s", "phase_margin_deg": "deg"}.get(self.value, "Hz")


def quantities_and_slopes(elements: Elements) -> dict[Quantity, tuple[float | None, Slopes]]:
    """Each quantity of an amplifier and its derivatives by element, in SI units.

    A crossover that there is not is None, with derivatives that are NaN.
    """
    return _of_roots(elements) | _of_crossover(elements)


def by_vector(
    circuit: Circuit, values: FloatArray, slopes: Mapping[str, float], *, without: Collection[str] = ()
) -> FloatArray:
    """Derivatives by the vector, shape (p,), of one with derivatives by element; the bench's load acts as CL does.

    without : names of the vector that have no part in it, because another value stands in their place
    """
    by_name = {**slopes, BENCH_LOAD: slopes["CL"]}
    return np.array(
        [
            0.0 if one.name in without else by_name.get(one.name, 0.0) * one.slope(float(number))
            for one, number in zip(circuit.parameters, values, strict=True)
        ]
    )


def _of_roots(elements: Elements) -> dict[Quantity, tuple[float | None, Slopes]]:
    e = elements
    zero_time_s = e.Cc * (e.Rz - 1 / e.gm2) - e.Cgd / e.gm2
    zero_slopes = dict.fromkeys(_IN_COEFFICIENTS, 0.0) | {
        "Cc": e.Rz - 1 / e.gm2,
        "Rz": e.Cc,
        "gm2": (e.Cc + e.Cgd) / e.gm2**2,
        "Cgd": -1 / e.gm2,
    }
    arguments: dict[str, Any] = {name: getattr(e, name) for name in (*_IN_COEFFICIENTS, "beta")}
    numerator, denominator = coefficients(**arguments)
    moved = {}
    for name in _IN_COEFFICIENTS:
        # An element that is 0 still has a derivative: its step is that of a usual size.
        step = COMPLEX_STEP * (arguments[name] or 1.0)
        moved[name] = coefficients(**(arguments | {name: arguments[name] + 1j * step}))[1].imag / step
    poles = [TWO_PI * pole for pole in Transfer.from_polynomials(numerator[:1], denominator).poles_hz]
    first, first_slopes = _distance(poles[0], denominator, moved)
    second, second_slopes = _distance(poles[1], denominator, moved)
    dc_gain = e.beta * e.gm1 * e.R1 * e.gm2 * e.R2
    by_gain = {name: 1 / arguments[name] if name in ("gm1", "R1", "gm2", "R2") else 0.0 for name in _IN_COEFFICIENTS}
    gain_bandwidth_hz = dc_gain * first
    return {
        Quantity.ZERO_TIME: (zero_time_s, zero_slopes),
        Quantity.POLE2: (second, second_slopes),
        Quantity.GAIN_BANDWIDTH: (
            gain_bandwidth_hz,
            {name: gain_bandwidth_hz * (by_gain[name] + first_slopes[name] / first) for name in _IN_COEFFICIENTS},
        ),
    }


def _distance(pole: complex, denominator: FloatArray, moved: Mapping[str, FloatArray]) -> tuple[float, Slopes]:
    """|pole|/2π and its derivatives, of a pole in rad/s."""
    powers = pole ** np.arange(len(denominator))
    steepness = complex((denominator[1:] * np.arange(1, len(denominator))) @ powers[:-1])
    slopes = {}
    for name, change in moved.items():
        shift = -complex(change @ powers) / steepness if steepness else complex(math.nan)
        slopes[name] = (pole.conjugate() * shift).real / abs(pole) / TWO_PI
    return abs(pole) / TWO_PI, slopes


def _of_crossover(elements: Elements) -> dict[Quantity, tuple[float | None, Slopes]]:
    response = elements.transfer()
    seen = margins(response)
    freq_hz = seen.crossover_hz
    names = (*_IN_COEFFICIENTS, MIRROR_POLE)
    if freq_hz is None or seen.phase_margin_deg is None:
        nowhere = dict.fromkeys(names, math.nan)
        return {Quantity.CROSSOVER: (None, nowhere), Quantity.PHASE_MARGIN: (None, nowhere)}
    arguments = {name: getattr(elements, name) for name in (*_IN_COEFFICIENTS, MIRROR_POLE, "beta", "delay_s")}
    gain, slopes = loop_gain_and_slopes(arguments, np.array([2j * np.pi * freq_hz]))
    by_ln_f = _slope_by_ln_f(response, freq_hz)
    crossover, phase = {}, {}
    for name in names:
        by_name = complex(slopes[name][0] / gain[0])
        ln_f = -by_name.real / by_ln_f.real
        crossover[name] = freq_hz * ln_f
        phase[name] = math.degrees(by_name.imag + by_ln_f.imag * ln_f)
    return {Quantity.CROSSOVER: (freq_hz, crossover), Quantity.PHASE_MARGIN: (seen.phase_margin_deg, phase)}


def _slope_by_ln_f(response: Transfer, freq_hz: float) -> complex:
    """Derivative of ln T by ln f."""
    slope = -1j * TWO_PI * response.delay_s * freq_hz
    for sign, roots in ((1, response.zeros_hz), (-1, response.poles_hz)):
        for root in roots:
            ratio = 1j * freq_hz / root
            slope -= sign * ratio / (1 - ratio)
    return slope
