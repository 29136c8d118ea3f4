"""Verdict and advice on the nulling resistor, taken on the line of zero times.

On that line the zero passes through infinity at 0 without a jump, so every verdict is an interval in one region.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from functools import reduce

import numpy as np

from fitamp.comparison.result import Advice, Nulling, Route, Row, Verdict, Window
from fitamp.comparison.rows import pole2_may_be_hidden
from fitamp.comparison.settling import hidden_pole, what_settles
from fitamp.design import Design, HalfPlane
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting import LoopFit
from fitamp.fitting.intervals import hull
from fitamp.fitting.result import LABELS, text_of
from fitamp.units import si, si_with_error

__all__ = [
    "advice_of_change",
    "advise",
    "decided_sentence",
    "describes",
    "judge_nulling",
    "nulling_product",
    "open_sentence",
    "place_among",
    "regions_of",
    "window_of",
    "with_broken_limits",
]

# Window of a design without limits: 95 % of parts built with the design's own spreads.
WINDOW_QUANTILE = 1.96
# A design given by roots has no element spreads; its zero may be this far off.
ROOTS_WINDOW = 0.10

# Without noise to hide it, a model's fault below this share of the loop gain, above a thirtieth of crossover, moves the
# zero by no more than a few times as much.
NEAR_ENOUGH = 1e-3
DECIDING_BAND = 1 / 30

Regions = tuple[tuple[Nulling, float, float], ...]


def window_of(design: Design) -> Window:
    """Zero times inside the limits, or, without limits, those that the design's own spreads give."""
    side = -1.0 if design.half_plane is HalfPlane.RIGHT else 1.0
    limit = design.limits.get("zero_hz")
    if limit is not None and design.half_plane is not HalfPlane.INFINITY:
        nearest = math.inf if not limit.low else 1 / (2 * math.pi * limit.low)
        farthest = 0.0 if limit.high is None else 1 / (2 * math.pi * limit.high)
        low, high = sorted((side * farthest, side * nearest))
        return Window(low_s=low, high_s=high, source="the limits on the zero")
    centre, small = design.zero_time_s, design.small_zero_time_s
    if design.elements is not None:
        elements, spreads = design.elements, design.spreads
        sd = math.hypot(
            centre * spreads["Cc"],
            elements.Cc * elements.Rz * spreads["Rz"],
            elements.Cc / elements.gm2 * spreads["gm2"],
        )
        reach, source = WINDOW_QUANTILE * sd, "the design's own spreads"
    else:
        reach, source = ROOTS_WINDOW * abs(centre), "10 % around the designed zero"
    if design.half_plane is HalfPlane.INFINITY:
        if reach < small:
            reach, source = small, "what counts as no zero"
        return Window(low_s=-reach, high_s=reach, source=source)
    # The designed half plane is part of what was designed; a half plane can be stated for a zero that is itself small.
    if side > 0:
        return Window(low_s=max(centre - reach, 0.0), high_s=max(centre + reach, small), source=source)
    return Window(low_s=min(centre - reach, -small), high_s=min(centre + reach, 0.0), source=source)


def regions_of(design: Design, window: Window) -> Regions:
    """The regions that tile the line of zero times, as (verdict, from, to)."""
    small, inf = design.small_zero_time_s, math.inf
    if design.half_plane is HalfPlane.INFINITY:
        return (
            (Nulling.TOO_LITTLE, -inf, window.low_s),
            (Nulling.AS_DESIGNED, window.low_s, window.high_s),
            (Nulling.TOO_MUCH, window.high_s, inf),
        )
    mirrored = design.half_plane is HalfPlane.RIGHT
    low, high = (-window.high_s, -window.low_s) if mirrored else (window.low_s, window.high_s)
    edge = min(small, low)
    tiles: Regions = (
        (Nulling.WRONG_SIDE, -inf, -small),
        (Nulling.AT_INFINITY, -small, edge),
        (Nulling.TOO_LITTLE, edge, low),
        (Nulling.AS_DESIGNED, low, high),
        (Nulling.TOO_MUCH, high, inf),
    )
    if mirrored:
        tiles = tuple((verdict, -to, -start) for verdict, start, to in tiles)
    return tuple(tile for tile in tiles if tile[1] < tile[2])


def place_among(zero_time: Estimate, design: Design, window: Window) -> tuple[Nulling, tuple[Nulling, ...]]:
    """The region that all of an interval is in, undecided where there is none; and all that it reaches into."""
    tiles = regions_of(design, window)
    whole = [verdict for verdict, start, to in tiles if zero_time.is_within(start, to)]
    touched = tuple(verdict for verdict, start, to in tiles if zero_time.touches(start, to))
    return (whole[0] if whole else Nulling.UNDECIDED), touched


def judge_nulling(fit: LoopFit, design: Design, *, others: Sequence[Estimate] = ()) -> Verdict:
    """Verdict of a fit made with the design's priors.

    others : zero times that describe the sweep as well; the verdict is on all together
    """
    window = window_of(design)
    zero_time = fit.parameters.zero_time_s
    if zero_time.is_measured:
        zero_time = reduce(hull, others, zero_time)
    if not describes(fit):
        nulling = Nulling.UNDECIDED
        reason = (
            "two poles, a zero, the designed third pole and the bench's delay do not describe this sweep: "
            f"{fit.adequacy.sentence}; no verdict can be leaned on before that is explained"
        )
    elif zero_time.known is Known.UNDETERMINED:
        nulling, reason = Nulling.UNDECIDED, f"the sweep does not determine the zero; {what_settles(fit, design)}"
    elif pole2_may_be_hidden(fit, design):
        nulling, reason, zero_time = Nulling.UNDECIDED, hidden_pole(fit, design), NOT_KNOWN
    else:
        nulling, touched = place_among(zero_time, design, window)
        if nulling is Nulling.UNDECIDED:
            reason = f"{open_sentence(zero_time, touched, window=window, design=design)}; {what_settles(fit, design)}"
        else:
            reason = decided_sentence(nulling, zero_time, window=window, design=design)
    return Verdict(
        nulling=nulling,
        reason=reason,
        route=Route.BEHAVIOUR,
        zero_time_s=zero_time,
        gm2_rz=nulling_product(zero_time, design),
        window=window,
    )


def describes(fit: LoopFit) -> bool:
    """Whether the model is near enough to the sweep for a verdict.

    Adequate, or, where hardly any noise lets the smallest fault of a model stand out, within a thousandth.
    """
    if fit.adequacy.adequate:
        return True
    sweep = fit.sweep
    fitted = fit.evaluate(sweep.freq_hz)
    above = sweep.freq_hz > DECIDING_BAND * (fit.margins.crossover_hz.value or 0.0)
    miss = np.abs(sweep.gain / fitted - 1)[above]
    return bool(len(miss) and np.sqrt(np.mean(miss**2)) < NEAR_ENOUGH)


def open_sentence(zero_time: Estimate, touched: Sequence[Nulling], *, window: Window, design: Design) -> str:
    """Into which regions an interval reaches that is not in a single one."""
    names = ", ".join(verdict.value for verdict in touched)
    into = "every region" if len(touched) == len(regions_of(design, window)) else names
    return f"the 95 % interval of the zero time, {_ends(zero_time)}, reaches into {into}"


def decided_sentence(nulling: Nulling, zero_time: Estimate, *, window: Window, design: Design) -> str:
    """Why a zero time belongs to the region that all of its interval is in."""
    place = "" if zero_time.value is None else f" ({place_of(zero_time.value)})"
    seen = f"zero time {text_of('zero_time_s', zero_time)}{place}"
    allowed = f"{span_of(window.low_s, window.high_s)}, from {window.source}"
    small = si(design.small_zero_time_s, "s")
    if nulling is Nulling.TOO_LITTLE and design.half_plane is not HalfPlane.LEFT:
        return f"{seen} lies short of the window {allowed}"
    sentences = {
        Nulling.AS_DESIGNED: f"{seen} lies in the window {allowed}",
        Nulling.TOO_LITTLE: f"{seen} gives less lead than the window {allowed}",
        Nulling.TOO_MUCH: f"{seen} lies beyond the window {allowed}",
        Nulling.WRONG_SIDE: f"{seen} is in the other half plane than designed ({design.half_plane.value})",
        Nulling.AT_INFINITY: f"{seen} is within ±{small}, so far out that it neither helps nor harms; "
        f"designed was {place_of(design.zero_time_s)}",
    }
    return sentences[nulling]


def _ends(zero_time: Estimate) -> str:
    low, high = zero_time.ci95
    if low is None:
        return "open" if high is None else f"anything up to {si(high, 's')}"
    return f"{si(low, 's')} and up" if high is None else f"{si(low, 's')} to {si(high, 's')}"


def place_of(zero_time_s: float) -> str:
    """A zero time as a place: "left half plane, 110 MHz"."""
    if zero_time_s == 0:
        return "at infinity"
    side = "left" if zero_time_s > 0 else "right"
    return f"{side} half plane, {si(1 / (2 * math.pi * abs(zero_time_s)), 'Hz', digits=3)}"


def span_of(low_s: float, high_s: float) -> str:
    """A window of zero times in words."""
    if math.isinf(high_s):
        return f"above {si(low_s, 's', digits=3)}"
    if math.isinf(low_s):
        return f"below {si(high_s, 's', digits=3)}"
    return f"{si(low_s, 's', digits=3)} to {si(high_s, 's', digits=3)}"


def nulling_product(zero_time: Estimate, design: Design) -> Estimate:
    """gm2·Rz = 1 + τz·gm2/Cc, uncertain by the fit and by the spreads of gm2 and Cc."""
    elements = design.elements
    if elements is None or zero_time.value is None or zero_time.stderr is None:
        return NOT_KNOWN
    rate = elements.gm2 / elements.Cc
    spread = abs(zero_time.value) * rate * math.hypot(design.spreads["gm2"], design.spreads["Cc"])
    return Estimate.gaussian(
        1 + zero_time.value * rate, math.hypot(zero_time.stderr * rate, spread), quantile=WINDOW_QUANTILE
    )


def advise(verdict: Verdict, design: Design, designed_zero_s: float, *, fit: LoopFit, rows: tuple[Row, ...]) -> Advice:
    """Change of Rz that would put the zero at the designed place, (τz_designed − τz)/Cc; other broken limits."""
    if not describes(fit):
        return Advice(
            rz_change_ohm=NOT_KNOWN,
            sentence="change nothing yet; the residuals show where the sweep is not what the model says: look there "
            "for a delay or pole that is not stated, a resonance, or bad points",
        )
    return with_broken_limits(_advise_on_resistor(verdict, design, designed_zero_s), verdict, rows)


def with_broken_limits(advice: Advice, verdict: Verdict, rows: tuple[Row, ...]) -> Advice:
    """Advice on Rz that also names what else is outside its limits."""
    broken = [LABELS[row.quantity] for row in rows if row.inside is False and row.quantity != "zero_time_s"]
    if not broken:
        return advice
    outside = f"{' and '.join(broken)} {'is' if len(broken) == 1 else 'are'} outside the limits"
    if verdict.nulling is Nulling.AS_DESIGNED:
        return replace(advice, sentence=f"Rz needs no change, but {outside}: look for what else moved")
    return replace(advice, sentence=f"{advice.sentence}; {outside}")


def _advise_on_resistor(verdict: Verdict, design: Design, designed_zero_s: float) -> Advice:
    zero_time, elements = verdict.zero_time_s, design.elements
    if elements is None:
        return Advice(
            rz_change_ohm=NOT_KNOWN,
            sentence="a design given by roots has no Cc: give [elements] for the change of Rz",
        )
    if zero_time.value is None or zero_time.stderr is None:
        return Advice(rz_change_ohm=NOT_KNOWN, sentence=f"no change of Rz can be advised; {verdict.reason}")
    spread = design.spreads["Cc"]

    def change_to(zero_time_s: float) -> float:
        return (designed_zero_s - zero_time_s) / elements.Cc

    change = change_to(zero_time.value)
    stderr = math.hypot(zero_time.stderr / elements.Cc, change * spread)
    # A profiled interval need not be symmetric: its own ends are carried over, the spread of Cc added to each.
    own_spread = WINDOW_QUANTILE * abs(change) * spread
    low, high = zero_time.ci95
    ends = (
        None if high is None else change - math.hypot(change - change_to(high), own_spread),
        None if low is None else change + math.hypot(change_to(low) - change, own_spread),
    )
    return advice_of_change(verdict, Estimate(value=change, stderr=stderr, ci95=ends))


def advice_of_change(verdict: Verdict, change: Estimate) -> Advice:
    """Advice to change Rz by so much."""
    if change.value is None or change.stderr is None:
        return Advice(rz_change_ohm=NOT_KNOWN, sentence=f"no change of Rz can be advised; {verdict.reason}")
    return Advice(
        rz_change_ohm=change, sentence=_advice_sentence(verdict.nulling, change.value, change.stderr, change.ci95)
    )


def _advice_sentence(nulling: Nulling, change: float, stderr: float, ends: tuple[float | None, float | None]) -> str:
    amount = si_with_error(abs(change), stderr, "Ω")
    direction = "raise" if change > 0 else "lower"
    if nulling is Nulling.AS_DESIGNED:
        if abs(change) < WINDOW_QUANTILE * stderr:
            return "nothing has to change"
        way = "more" if change > 0 else "less"
        return f"nothing has to change; the exact nominal place would take {amount} {way} Rz"
    if nulling is Nulling.UNDECIDED:
        low, high = ("unknown" if end is None else si(end, "Ω", digits=3) for end in ends)
        return f"settle the verdict first; the change of Rz that the sweep allows reaches from {low} to {high}"
    return f"{direction} Rz by {amount} to put the zero at the designed place"
