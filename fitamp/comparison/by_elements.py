"""Verdict, limits and advice from estimated elements: as a comparison's, with the part's own gm2 and Cc.

The zero time, the margins and all poles are those of the exact circuit, so that neither a third pole nor the design's
spreads have a part in them.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from fitamp.comparison.result import Advice, Nulling, Route, Row, Verdict
from fitamp.comparison.rows import QUANTITIES, designed_values, deviation_from, is_inside, limits_on
from fitamp.comparison.verdict import decided_sentence, open_sentence, regions_of, window_of
from fitamp.elements import ElementEstimate, RestoringResistor
from fitamp.elements.attribution import Blame
from fitamp.elements.quantities import Quantity
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting.result import LABELS
from fitamp.margins import margins
from fitamp.units import si_with_error

__all__ = ["advise_on_elements", "element_rows", "judge_elements"]

# A contribution is named where it is at least this share of the largest one.
WORTH_NAMING = 0.3
MOST_NAMED = 3
# Below this share from the data, blame on an element is no more than likely.
SURELY_TOLD = 0.95
NAMES = {"bench_load_f": "the bench's load"}


def judge_elements(estimate: ElementEstimate) -> Verdict:
    """Verdict on the nulling resistor; undecided where the estimate is not to be trusted."""
    design = estimate.design
    window = window_of(design)
    zero_time, product = estimate.derived.zero_time_s, estimate.derived.gm2_rz
    touched = [verdict for verdict, start, to in regions_of(design, window) if zero_time.touches(start, to)]
    whole = [verdict for verdict, start, to in regions_of(design, window) if zero_time.is_within(start, to)]
    nulling = Nulling.UNDECIDED
    if not estimate.is_trustworthy:
        why = estimate.notes[0].message if estimate.notes else "the sweeps leave too much open"
        reason = f"no verdict can be leaned on before this is explained: {why}"
    elif zero_time.known is Known.UNDETERMINED:
        reason = "the sweeps do not determine the zero; sweeps with an added resistance do"
    elif whole:
        nulling = whole[0]
        reason = decided_sentence(nulling, zero_time, window=window, design=design)
    else:
        where = open_sentence(zero_time, touched, window=window, design=design)
        reason = f"{where}; sweeps with an added resistance narrow it, and so does a measured delay"
    return Verdict(
        nulling=nulling, reason=reason, route=Route.CIRCUIT, zero_time_s=zero_time, gm2_rz=product, window=window
    )


def element_rows(estimate: ElementEstimate) -> tuple[Row, ...]:
    """Each quantity designed, by the estimated elements, and against its limit, all with the bench's load.

    The circuit is exact, so that the design as measured is the design itself.
    """
    design = estimate.design
    window, designed, found = window_of(design), designed_values(design), dict(estimate.derived.items())
    rows = []
    for quantity in QUANTITIES:
        low, high = limits_on(quantity, design, window)
        deviation, sigma = deviation_from(quantity, found[quantity], designed[quantity])
        if quantity == "zero_time_s" and abs(design.zero_time_s) <= design.small_zero_time_s:
            deviation = None  # percents of next to nothing say nothing
        inside = None
        if estimate.is_trustworthy:
            is_unlimited = quantity == "gain_margin_db" and found[quantity].value is None
            seen = _gain_margin(estimate) if is_unlimited else found[quantity]
            inside = is_inside(seen, low, high)
        rows.append(
            Row(
                quantity=quantity,
                designed=designed[quantity],
                designed_as_measured=designed[quantity],
                measured=found[quantity],
                deviation=deviation,
                sigma=sigma,
                low=low,
                high=high,
                inside=inside,
            )
        )
    return tuple(rows)


def _gain_margin(estimate: ElementEstimate) -> Estimate:
    """The gain margin of a part whose phase does not reach −180°, or not for sure: the least and the largest about it.

    Looked at are the part and the ends of the axes of its 95 % ellipsoid; without a crossing the margin is infinite.
    """
    variances, axes = np.linalg.eigh(estimate.covariance)
    steps = estimate.quantile * np.sqrt(variances.clip(0)) * axes
    found = []
    for vector in (estimate.vector, *(estimate.vector + sign * step for step in steps.T for sign in (1, -1))):
        margin_db = margins(estimate.circuit.loaded(vector).transfer()).gain_margin_db
        found.append(math.inf if margin_db is None else margin_db)
    return Estimate(value=found[0], stderr=None, ci95=(min(found), max(found)))


def advise_on_elements(
    estimate: ElementEstimate,
    verdict: Verdict,
    rows: tuple[Row, ...],
    *,
    blame: Blame,
    restoring: RestoringResistor,
    restored_margin_deg: Estimate,
) -> Advice:
    """Change of Rz that puts this part's zero at the designed place, and what else moved a broken limit.

    restored_margin_deg : phase margin with that resistor, with the bench's load
    """
    if not estimate.is_trustworthy:
        return Advice(rz_change_ohm=NOT_KNOWN, sentence="change nothing yet; first settle what the notes say")
    advice = _advise_on_resistor(verdict, restoring, restored_margin_deg)
    broken = [row for row in rows if row.inside is False and row.quantity != "zero_time_s"]
    if not broken:
        return advice
    parts = [_outside(row, blame) for row in broken]
    sentence = f"{advice.sentence}; {', and '.join(parts)}"
    if verdict.nulling is Nulling.AS_DESIGNED:
        sentence = f"Rz needs no change, but {', and '.join(parts)}"
    return replace(advice, sentence=sentence)


def _advise_on_resistor(verdict: Verdict, restoring: RestoringResistor, margin_deg: Estimate) -> Advice:
    change, needed = restoring.change_ohm, restoring.rz_ohm
    if change.value is None or change.stderr is None or needed.value is None:
        return Advice(rz_change_ohm=NOT_KNOWN, sentence=f"no change of Rz can be advised; {verdict.reason}")
    amount = si_with_error(abs(change.value), change.stderr, "Ω")
    if verdict.nulling is Nulling.UNDECIDED:
        sentence = "settle the verdict first, with sweeps that have a resistance added"
    elif verdict.nulling is Nulling.AS_DESIGNED:
        sentence = "nothing has to change"
        if abs(change.value) > 2 * change.stderr:
            way = "more" if change.value > 0 else "less"
            sentence += f"; the exact nominal place would take {amount} {way} Rz"
    elif needed.value < 0:
        sentence = "no resistor puts this part's zero at the designed place; gm2 or Cc has to change"
    else:
        way = "raise" if change.value > 0 else "lower"
        sentence = f"{way} Rz by {amount} to put the zero at the designed place"
        if margin_deg.value is not None:
            sentence += f" (phase margin then {margin_deg.value:.1f}°)"
    return Advice(rz_change_ohm=change, sentence=sentence)


def _outside(row: Row, blame: Blame) -> str:
    """That a quantity is outside its limits, and which elements moved it there."""
    name = f"{LABELS[row.quantity]} is outside its limits"
    known = {quantity.value for quantity in Quantity}
    shares = blame.of(Quantity(row.quantity)) if row.quantity in known else None
    if shares is None or not shares.change.value:
        return name
    toward = [one for one in shares.contributions if (one.share.value or 0.0) * shares.change.value > 0]
    largest = max((abs(one.share.value or 0.0) for one in toward), default=0.0)
    shown = [one for one in toward[:MOST_NAMED] if abs(one.share.value or 0.0) >= WORTH_NAMING * largest]
    # What leans on the design's spreads is as right as they are.
    named = [
        f"{'' if one.informed >= SURELY_TOLD else 'most likely '}by {NAMES.get(one.name, one.name)} "
        f"({_relative(one.designed, one.estimated)})"
        for one in shown
    ]
    return f"{name}, moved there {' and '.join(named)}" if named else name


def _relative(designed: float, estimated: float) -> str:
    if not designed:
        return "none designed"
    if estimated >= 2 * designed:
        return f"× {estimated / designed:.3g}"
    return f"{100 * (estimated / designed - 1):+.1f} %".replace("-", "−")
