"""All that an element estimate says, gathered once for text, JSON and pictures: verdict, blame, lines, predictions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.comparison.by_elements import advise_on_elements, element_rows, judge_elements
from fitamp.comparison.result import Advice, Row, Verdict
from fitamp.design import Design
from fitamp.elements import (
    Blame,
    ElementEstimate,
    LineFit,
    LoadRange,
    Prediction,
    RestoringResistor,
    blame,
    line_fits,
    load_range,
    predict,
    resistors_about,
    restoring_resistor,
)
from fitamp.estimate import NOT_KNOWN, Estimate

__all__ = ["ElementFindings", "ResistorRange", "findings_of"]

# Loads looked at: from this share of the smaller to this multiple of the larger of designed and estimated one, and
# past the end of those that keep the wanted margin, where that is not much farther.
LEAST_LOAD, MOST_LOAD = 0.4, 2.5
PAST_END, FARTHEST_LOAD = 1.3, 5.0
POINTS = 25
SAMPLES = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class ResistorRange:
    """Nulling resistors about the part's own that keep a phase margin, on the bench.

    keeps : whether the part's own does; the others are then None
    low_ohm, high_ohm : ends of the stretch; None where it goes on beyond the resistors looked at
    """

    keeps: bool
    low_ohm: float | None
    high_ohm: float | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ElementFindings:
    """An element estimate and what follows from it.

    rows : designed and estimated quantities against their limits, as a comparison has them
    restored_margin_deg : phase margin with the resistor that restores the designed zero
    wanted_deg : phase margin that is wanted, stated or from the design's limits; None where there is none
    loads, resistors : what keeps it; None without it (of resistors also without curves)
    over_load, over_resistor : predictions on a grid, for pictures and scripts; None where they were not asked for
    """

    estimate: ElementEstimate
    verdict: Verdict
    advice: Advice
    rows: tuple[Row, ...]
    blame: Blame
    lines: tuple[LineFit, ...]
    restoring: RestoringResistor
    restored_margin_deg: Estimate
    wanted_deg: float | None
    loads: LoadRange | None
    resistors: ResistorRange | None
    over_load: Prediction | None
    over_resistor: Prediction | None

    @property
    def design(self) -> Design:
        """The design that the elements are held against."""
        return self.estimate.design

    @property
    def broken_limits(self) -> tuple[str, ...]:
        """Quantities other than the zero that are outside their limits beyond doubt."""
        return tuple(row.quantity for row in self.rows if row.inside is False and row.quantity != "zero_time_s")


def findings_of(
    estimate: ElementEstimate, *, wanted_deg: float | None = None, curves: bool = True, samples: int = SAMPLES
) -> ElementFindings:
    """Gather what an estimate says.

    Parameters
    ----------
    wanted_deg
        Phase margin that is wanted; the lower limit on it in the design where None.
    curves
        Predict over loads and resistors, too, which takes longer than all the rest.
    samples
        For the bands of overshoot and settling.

    Raises
    ------
    UsageError
        When the wanted margin is not between −180° and 180°.
    """
    if wanted_deg is None:
        limit = estimate.design.limits.get("phase_margin_deg")
        wanted_deg = None if limit is None else limit.low
    verdict, rows = judge_elements(estimate), element_rows(estimate)
    shares, restoring = blame(estimate), restoring_resistor(estimate)
    restored_margin_deg = _margin_with(estimate, restoring)
    loads = None if wanted_deg is None else load_range(estimate, phase_margin_deg=wanted_deg)
    over_resistor = predict(estimate, rz_ohm=_resistors_about(estimate, restoring), samples=samples) if curves else None
    return ElementFindings(
        estimate=estimate,
        verdict=verdict,
        advice=advise_on_elements(
            estimate,
            verdict,
            rows,
            blame=shares,
            restoring=restoring,
            restored_margin_deg=restored_margin_deg,
        ),
        rows=rows,
        blame=shares,
        lines=line_fits(estimate),
        restoring=restoring,
        restored_margin_deg=restored_margin_deg,
        wanted_deg=wanted_deg,
        loads=loads,
        resistors=None if wanted_deg is None or over_resistor is None else _resistors(over_resistor, wanted_deg),
        over_load=predict(estimate, load_f=_loads_about(estimate, loads), samples=samples) if curves else None,
        over_resistor=over_resistor,
    )


def _margin_with(estimate: ElementEstimate, restoring: RestoringResistor) -> Estimate:
    needed = restoring.rz_ohm.value
    if needed is None or needed < 0:
        return NOT_KNOWN
    # Margins alone; two samples are the fewest for what is not looked at here.
    band = predict(estimate, rz_ohm=[needed], samples=2).phase_margin_deg
    value, low, high = (float(curve[0]) for curve in (band.value, band.low, band.high))
    if not np.isfinite([value, low, high]).all():
        return NOT_KNOWN
    return Estimate.gaussian(value, (high - low) / 2 / estimate.quantile, quantile=estimate.quantile)


def _loads_about(estimate: ElementEstimate, loads: LoadRange | None) -> FloatArray:
    """Whole loads to predict over: evenly spaced, with the part's own on the bench, the designed one, and the ends."""
    own_f, designed_f = (estimate.circuit.loaded(v).CL for v in (estimate.vector, estimate.circuit.designed))
    most_f = MOST_LOAD * max(own_f, designed_f)
    ends = [] if loads is None else [end.value for end in (loads.low_f, loads.high_f) if end is not None and end.value]
    near = [end_f for end_f in ends if PAST_END * end_f < FARTHEST_LOAD * own_f]
    most_f = max(most_f, *(PAST_END * end_f for end_f in near), 0.0)
    even = np.linspace(LEAST_LOAD * min(own_f, designed_f), most_f, POINTS)
    return np.unique([*even, own_f, designed_f, *(end_f for end_f in near if end_f > even[0])])


def _resistors_about(estimate: ElementEstimate, restoring: RestoringResistor) -> FloatArray:
    """Resistors to predict over, with the part's own, the designed one, and the one that restores the zero."""
    even = resistors_about(estimate)
    special = [estimate.amplifier.Rz, estimate.circuit.nominal.Rz, restoring.rz_ohm.value or 0.0]
    return np.unique([*even, *(ohm for ohm in special if even[0] <= ohm <= even[-1])])


def _resistors(over: Prediction, wanted_deg: float) -> ResistorRange:
    """The stretch about the part's own resistor, between points of the curve in straight lines."""
    at, excess = over.at, over.phase_margin_deg.value - wanted_deg
    # Without a crossover there is no margin to lose.
    excess = np.where(np.isnan(excess), 180.0, excess)
    if np.interp(over.estimated_at, at, excess) < 0:
        return ResistorRange(keeps=False, low_ohm=None, high_ohm=None)
    crossings = [
        float(at[i] - excess[i] * (at[i + 1] - at[i]) / (excess[i + 1] - excess[i]))
        for i in range(len(at) - 1)
        if excess[i] * excess[i + 1] < 0
    ]
    below = [ohm for ohm in crossings if ohm <= over.estimated_at]
    above = [ohm for ohm in crossings if ohm > over.estimated_at]
    return ResistorRange(keeps=True, low_ohm=max(below, default=None), high_ohm=min(above, default=None))
