"""The zero by the circuit: elements fitted to the same sweep as two poles and a zero, and whether to lean on them.

The circuit knows what its third pole, its mirror and its overlap capacitor do to the response for any elements within
the design's spreads, where two poles and a zero have them as designed.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.comparison.bounded import bounded_estimates
from fitamp.comparison.expectation import POLE2_LN_SD
from fitamp.comparison.other_side import other_side, zero_time_of
from fitamp.comparison.rows import is_far_beyond
from fitamp.comparison.zero_profile import followed
from fitamp.design import Design
from fitamp.elements import Condition, ElementEstimate, ElementNoteCode, ElementParasitics, estimate_elements
from fitamp.elements.derived import element_parasitics
from fitamp.elements.residual import Measured
from fitamp.elements.search import RACE_TOLERANCE, floored
from fitamp.elements.solving import CircuitSolution, residuals_at, solve
from fitamp.errors import FitampError
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.fitting import LoopFit
from fitamp.fitting.adequacy import Adequacy, judge
from fitamp.fitting.intervals import hull
from fitamp.fitting.result import text_of
from fitamp.units import si

__all__ = ["CircuitZero", "zero_by_circuit"]

# By so much more chi-square than two poles and a zero leave, the circuit misses something of the sweep. The two have
# about as many free numbers, and the noise may be larger than estimated.
MISSED = 20.0
# Below this standard error, as a share of Cc/gm2, the zero time is as good as linear in all that may move it.
SURELY_STRAIGHT = 0.01
TWO_SETS = "two sets of elements describe the sweep equally well"
# Two answers from the same data are two where they differ by so many standard errors of both.
APART = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuitZero:
    """What the circuit says of the zero.

    estimate : elements with the design's spreads
    solution : fitted with the load free by a factor of two: a forgotten probe must not be made up for by the zero
    adequacy : of that
    zero_time_s, gm2_rz : Cc·(Rz − 1/gm2) − Cgd/gm2, and gm2·Rz, of this part
    rz_change_ohm : change of Rz that puts this part's zero at the designed place; rz_ohm : its resistor as estimated
    is_split : whether a zero in the other half plane, with another delay, describes the sweep as well; the three
        estimates then hold both
    parasitics : capacitance that nobody designed
    doubt : why not to lean on all this, in words; None where there is no doubt
    """

    estimate: ElementEstimate
    solution: CircuitSolution
    adequacy: Adequacy
    zero_time_s: Estimate
    gm2_rz: Estimate
    rz_change_ohm: Estimate
    rz_ohm: float
    is_split: bool
    parasitics: ElementParasitics
    doubt: str | None

    @property
    def of_other_set(self) -> Estimate | None:
        """Zero time of the other set of elements that describes the sweep as well, about as certain; None without."""
        other = self.estimate.other_valley
        if other is None or self.zero_time_s.stderr is None:
            return None
        zero_time_s = other.zero_time_s - other.Cgd / other.gm2
        return Estimate.gaussian(zero_time_s, self.zero_time_s.stderr, quantile=self.estimate.quantile)


def zero_by_circuit(fit: LoopFit, design: Design) -> CircuitZero | str:
    """Fit the circuit to the sweep of a fit; words on why, where there is no circuit to be had.

    Parameters
    ----------
    design
        With elements.
    """
    try:
        estimate = estimate_elements(fit.sweep, design, fits=[fit])
    except FitampError as error:
        return f"no circuit could be fitted: {error}"
    solution, quantile = _with_free_load(estimate), estimate.quantile
    zero_time, product, change = _zero(solution, design, quantile)
    other = other_side(solution)
    if other is not None:
        seen = (zero_time, product, change)
        zero_time, product, change = map(hull, seen, _zero(other, design, quantile))
    low, high = product.ci95
    if low is not None:
        product = replace(product, ci95=(max(low, 0.0), high))
    found = CircuitZero(
        estimate=estimate,
        solution=solution,
        adequacy=judge(solution.residuals_of(0), fit.sweep.freq_hz),
        zero_time_s=zero_time,
        gm2_rz=product,
        rz_change_ohm=change,
        rz_ohm=max(solution.circuit.physical(solution.values)["Rz"], 0.0),
        is_split=other is not None,
        parasitics=element_parasitics(solution, quantile=quantile),
        doubt=None,
    )
    return replace(found, doubt=_doubt(found, fit, design))


def _zero(solution: CircuitSolution, design: Design, quantile: float) -> tuple[Estimate, Estimate, Estimate]:
    """Zero time, gm2·Rz, and the change of Rz that puts the zero at the designed place."""
    circuit = solution.circuit

    def nulling_product(values: FloatArray) -> float:
        found = circuit.physical(values)
        return found["gm2"] * found["Rz"]

    def missing_resistor(values: FloatArray) -> float:
        return (design.zero_time_s - zero_time_of(circuit, values)) / circuit.physical(values)["Cc"]

    zero_time, product, change = bounded_estimates(
        (lambda values: zero_time_of(circuit, values), nulling_product, missing_resistor), solution, quantile=quantile
    )
    is_curved = circuit.index("Rz") is not None and solution.unbounded is None
    if not is_curved or (zero_time.stderr or 0.0) < SURELY_STRAIGHT * _bare_zero_time_s(design):
        return zero_time, product, change
    zero_time = followed(zero_time, solution, quantile=quantile)
    found = circuit.physical(solution.values)
    rate, inverse = found["gm2"] / found["Cc"], 1 / found["Cc"]
    # Of given gm2 and Cc both are straight in the zero time.
    product = _straight_in(
        zero_time, rate, product, abs((product.value or 0.0) - 1) * _sd_of_ratio(solution, "gm2", "Cc"), quantile
    )
    change = _straight_in(
        zero_time, -inverse, change, abs(change.value or 0.0) * _sd_of_ratio(solution, "Cc"), quantile
    )
    return zero_time, product, change


def _straight_in(zero_time: Estimate, slope: float, linear: Estimate, own_sd: float, quantile: float) -> Estimate:
    """A quantity that follows the zero time with a slope, and has a standard deviation of its own beside it."""
    if zero_time.value is None or zero_time.stderr is None or linear.value is None:
        return NOT_KNOWN
    low_s, high_s = zero_time.ci95
    assert low_s is not None
    assert high_s is not None
    reaches = sorted((slope * (low_s - zero_time.value), slope * (high_s - zero_time.value)))
    below, above = (math.hypot(reach, quantile * own_sd) for reach in reaches)
    return Estimate(
        value=linear.value,
        stderr=math.hypot(slope * zero_time.stderr, own_sd),
        ci95=(linear.value - below, linear.value + above),
    )


def _sd_of_ratio(solution: CircuitSolution, *names: str) -> float:
    """Standard deviation of the logarithm of the first number, over the second where there are two."""
    weights = np.zeros(len(solution.values))
    for name, sign in zip(names, (1.0, -1.0), strict=False):
        index = solution.circuit.index(name)
        if index is not None:
            weights[index] = sign
    return math.sqrt(max(float(weights @ solution.covariance @ weights), 0.0))


def _with_free_load(estimate: ElementEstimate) -> CircuitSolution:
    """The same circuit with CL known to a factor of two, as pole 2 is in a fit without elements."""
    circuit = estimate.circuit
    parameters = tuple(
        replace(one, prior_sd=max(one.prior_sd, POLE2_LN_SD)) if one.name == "CL" and one.prior_sd is not None else one
        for one in circuit.parameters
    )
    freed = replace(circuit, parameters=parameters)
    solution = solve(freed, estimate.solution.sweeps, estimate.vector)
    if not solution.optimum.converged:
        solution = solve(freed, estimate.solution.sweeps, solution.values, tolerance=RACE_TOLERANCE)
    return solution


def _doubt(found: CircuitZero, fit: LoopFit, design: Design) -> str | None:
    """Why not to lean on the circuit: what is wrong with it alone, then what contradicts the fit."""
    notes = {note.code for note in found.estimate.notes}
    if not found.solution.optimum.converged or ElementNoteCode.NOT_CONVERGED in notes:
        return "the search for the elements did not settle"
    if found.estimate.other_valley is not None:
        return TWO_SETS
    if ElementNoteCode.FACTOR_TAKEN_OVER in notes:
        return "what is there beside the amplifier (a resonance, a doublet, a range step) is not the circuit's"
    if not found.adequacy.adequate:
        return f"the circuit does not describe the sweep: {found.adequacy.sentence}"
    if not found.zero_time_s.is_measured or (found.zero_time_s.stderr or 0.0) > _bare_zero_time_s(design):
        return "the circuit leaves the zero open"
    pole2_hz = _pole2_hz(found.solution)
    if is_far_beyond(pole2_hz, design):
        return f"the circuit's pole 2 would lie at {si(pole2_hz, 'Hz')}"
    return _contradiction(found, fit, design)


def _bare_zero_time_s(design: Design) -> float:
    """Cc/gm2, the zero time without a resistor."""
    assert design.elements is not None
    return design.elements.Cc / design.elements.gm2


def _pole2_hz(solution: CircuitSolution) -> float:
    """Distance of the second pole of the compensation, with the bench's load."""
    core = replace(solution.circuit.loaded(solution.values), mirror_pole_hz=None, delay_s=0.0)
    return sorted(map(abs, core.transfer().poles_hz))[1]


def _contradiction(found: CircuitZero, fit: LoopFit, design: Design) -> str | None:
    """What the fit of two poles and a zero sees in the sweep and the circuit does not."""
    measured = Measured(sweep=fit.sweep, condition=Condition(), noise=floored(fit.noise))
    chi_square = residuals_at(found.solution.circuit, found.solution.values, measured).chi_square
    more = chi_square - float((abs(fit.residuals()) ** 2).sum())
    if more > MISSED:
        return f"the circuit leaves more of the sweep unexplained than two poles and a zero do, chi-square +{more:.0f}"
    theirs, ours = fit.parameters.zero_time_s, found.zero_time_s
    assert design.elements is not None
    # Overlap capacitor and mirror are as designed in the fit, which makes up for theirs by the zero.
    if design.elements.Cgd or design.elements.mirror_pole_hz is not None or not fit.adequacy.adequate:
        return None
    if not (theirs.is_measured and ours.is_measured):
        return None
    assert theirs.value is not None
    assert theirs.stderr is not None
    assert ours.value is not None
    assert ours.stderr is not None
    if abs(theirs.value - ours.value) <= APART * (theirs.stderr**2 + ours.stderr**2) ** 0.5:
        return None
    return (
        f"the circuit puts the zero time at {text_of('zero_time_s', ours)}, two poles and a zero at "
        f"{text_of('zero_time_s', theirs)}"
    )
