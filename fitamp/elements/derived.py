"""Estimates of what follows from the vector: derived quantities, and capacitance that nobody designed."""

from __future__ import annotations

import math

import numpy as np

from fitamp.amplifier import coefficients
from fitamp.arrays import FloatArray
from fitamp.elements.circuit import BENCH_LOAD, Circuit
from fitamp.elements.intervals import UNDETERMINED_SD
from fitamp.elements.posterior import without_prior
from fitamp.elements.result import DerivedQuantities, ElementParasitics
from fitamp.elements.solving import CircuitSolution
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.fitting.intervals import DIFFERENCE_STEP, gradient
from fitamp.transfer import Transfer
from fitamp.vicinity import Vicinity

__all__ = ["derived_quantities", "element_parasitics"]

# Quantities that keep their sign get an interval in the logarithm.
POSITIVE = {
    "dc_gain", "gain_bandwidth_hz", "pole1_hz", "pole2_hz", "pole3_hz", "crossover_hz", "settling_s"
}  # fmt: skip
NOT_NEGATIVE = ("gm2_rz", "overshoot")
NAMES = tuple(DerivedQuantities.__dataclass_fields__)


def derived_quantities(
    circuit: Circuit, values: FloatArray, covariance: FloatArray, *, quantile: float
) -> DerivedQuantities:
    """Every derived quantity, with the error that the vector's covariance gives (JCGM 100:2008, sec. 5.2)."""
    index = circuit.index("Rz")
    inside = values.copy()
    if index is not None:
        # Differences need a resistor on both sides.
        inside[index] = max(inside[index], 2 * DIFFERENCE_STEP)
    near = Vicinity(response=circuit.loaded(inside).transfer())
    slopes = gradient(lambda vector: _quantities(circuit, vector, near), inside)
    stderrs = np.sqrt(np.maximum(np.einsum("ki,ij,kj->k", slopes, covariance, slopes), 0.0))
    here = near if np.array_equal(inside, values) else Vicinity(response=circuit.loaded(values).transfer())
    found = {
        name: _estimate(value, float(stderr), quantile, positive=name in POSITIVE)
        for name, value, stderr in zip(NAMES, _quantities(circuit, values, here), stderrs, strict=True)
    }
    for name in NOT_NEGATIVE:
        low, high = found[name].ci95
        if low is not None and low < 0:
            found[name] = Estimate(value=found[name].value, stderr=found[name].stderr, ci95=(0.0, high))
    return DerivedQuantities(**found)


def _estimate(value: float | None, stderr: float, quantile: float, *, positive: bool) -> Estimate:
    if value is None or not math.isfinite(stderr) or (positive and stderr > value):
        return NOT_KNOWN
    if positive:
        return Estimate.lognormal(value, stderr / value, quantile=quantile)
    return Estimate.gaussian(value, stderr, quantile=quantile)


def _quantities(circuit: Circuit, values: FloatArray, near: Vicinity) -> tuple[float | None, ...]:
    found = circuit.physical(values)
    gm2, Cc, Rz, Cgd = (found[name] for name in ("gm2", "Cc", "Rz", "Cgd"))
    elements = circuit.loaded(values)
    response = elements.transfer()
    arguments = {name: getattr(elements, name) for name in ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz", "Cgd")}
    numerator, denominator = coefficients(**arguments, beta=elements.beta)
    poles = [abs(pole) for pole in Transfer.from_polynomials(numerator[:1], denominator).poles_hz]
    dc_gain = float(numerator[0])
    seen = near.figures(response)
    return (
        Cc * (Rz - 1 / gm2) - Cgd / gm2,
        gm2 * Rz,
        dc_gain,
        dc_gain * poles[0],
        poles[0],
        poles[1],
        poles[2] if len(poles) > 2 else None,
        seen.crossover_hz,
        seen.phase_margin_deg,
        seen.gain_margin_db,
        seen.overshoot,
        seen.settling_s,
    )


def element_parasitics(solution: CircuitSolution, *, quantile: float) -> ElementParasitics:
    """Load and first stage beyond the design, each by the sweeps without the design's spread of that element.

    With it a capacitor that nobody designed would be drawn towards none. All other priors stay.
    """
    load_total = load = first_stage = NOT_KNOWN
    circuit = solution.circuit
    index = circuit.index("CL")
    if index is not None:
        values, covariance = without_prior(solution, index)
        if covariance[index, index] < UNDETERMINED_SD**2:
            chip_f = circuit.physical(values)["CL"]
            slopes = np.zeros(len(values))
            slopes[index] = chip_f
            load = _shifted(chip_f, math.sqrt(covariance[index, index]), circuit.nominal.CL, quantile)
            bench_index = circuit.index(BENCH_LOAD)
            if bench_index is not None:
                slopes[bench_index] = circuit.physical(values)[BENCH_LOAD]
            total_f = chip_f + circuit.physical(values)[BENCH_LOAD]
            sd_f = math.sqrt(slopes @ covariance @ slopes)
            load_total = Estimate.lognormal(total_f, sd_f / total_f, quantile=quantile)
    index = circuit.index("C1")
    if index is not None:
        values, covariance = without_prior(solution, index)
        if covariance[index, index] < UNDETERMINED_SD**2:
            value_f, sd = circuit.physical(values)["C1"], math.sqrt(covariance[index, index])
            first_stage = _shifted(value_f, sd, circuit.nominal.C1, quantile)
    return ElementParasitics(load_total_f=load_total, load_f=load, first_stage_f=first_stage)


def _shifted(value_f: float, sd: float, by_f: float, quantile: float) -> Estimate:
    """An estimate symmetric in the logarithm, less what was designed."""
    factor = math.exp(quantile * sd)
    return Estimate(value=value_f - by_f, stderr=value_f * sd, ci95=(value_f / factor - by_f, value_f * factor - by_f))
