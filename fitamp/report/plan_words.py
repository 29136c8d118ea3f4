"""A plan in sentences: what its sweeps will fix, what each adds, what to know."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from fitamp.elements.result import MOSTLY_INFORMED
from fitamp.fitting.result import LABELS
from fitamp.planning import Criterion, Expected, Plan, PlannedSweep, Stage
from fitamp.units import si, si_with_error

__all__ = [
    "NAMES",
    "adding_sentences",
    "and_list",
    "label_of",
    "limit_sentences",
    "name_of",
    "notes",
    "precision",
    "shift",
    "summary",
    "verdict_sentence",
    "way_sentence",
]

NAMES = LABELS | {
    "mirror_pole_hz": "mirror pole",
    "bench_load_f": "bench load",
    "bench_delay_s": "bench delay",
    "gm2_rz": "gm2·Rz",
    "load_parasitic_f": "load parasitic",
    "rz_change_ohm": "advice on Rz",
}
ORDINALS = ("first", "second", "third", "fourth", "fifth", "sixth", "seventh", "eighth", "ninth", "tenth")
# A sweep is said to add to an element where it brings its error down by this factor, and to so many at the most.
ADDS, MOST_NAMED = 1.5, 3
NO_ELEMENT = "no element's error falls by a third"
# Sweeps fix an element where they halve its error.
FIXES = 2.0
CRITERIA = {
    Criterion.DETERMINANT: "for the smallest joint interval of all elements (D-optimal)",
    Criterion.VARIANCE: "for the smallest mean variance of the elements (A-optimal)",
    Criterion.WANTED: "for what is wanted, and beyond that for the smallest joint interval of all elements",
}


def precision(one: Expected, sd: float | None) -> str:
    """A standard deviation in per cent of the value, or in the unit where there is no share of it; "–" if unknown."""
    if sd is None:
        return "–"
    if not one.value or one.name in ("load_parasitic_f", "rz_change_ohm", "phase_margin_deg"):
        return si(sd, "°" if one.unit == "deg" else one.unit, digits=2)
    share = 100 * sd / abs(one.value)
    return f"{share:.0f} %" if share >= 9.95 else f"{share:#.2g} %"


def shift(one: Expected, by: float | None) -> str:
    """What 1 % of error of all that is added does to an element, with its sign."""
    if by is None:
        return "–"
    moved = 0.01 * by
    return f"{'−' if moved < 0 else '+'}{precision(one, abs(moved))}"


def and_list(words: Sequence[str]) -> str:
    """Words with commas, and the last one with "and"."""
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def summary(plan: Plan) -> str:
    """The plan in a sentence."""
    stage, count = plan.last, len(plan.sweeps)
    sweeps = f"{count} more sweeps" if plan.taken else f"{count} sweeps"
    if count == 1:
        sweeps = "one more sweep" if plan.taken else "one sweep"
    what = f"{sweeps}, {_what(plan.sweeps)}, will"
    wanted = [name for name, _ in plan.wanted]
    named = [stage.of(name) for name in wanted] or sorted(
        (one for one in stage.elements if one.sd is not None and _gain(one) >= FIXES),
        key=lambda one: one.relative or 0.0,
    )
    left = [one for one in stage.elements if one.sd != 0 and one not in named and one.name not in wanted]
    parts = [f"{name_of(one)} to {precision(one, one.sd)}" for one in named if one.sd is not None]
    fixes = f"fix {and_list(parts)}" if parts else "fix none of the elements"
    if wanted or not left:
        return f"{what} {fixes}"
    rest = [f"{name_of(one)} {precision(one, one.sd)}" if one.sd is not None else name_of(one) for one in left]
    return f"{what} {fixes}, and tell little of {and_list(rest)}"


def _what(sweeps: Sequence[PlannedSweep]) -> str:
    """What is added and the bands, which are said once where they are alike."""
    bands = {(sweep.band, sweep.points, sweep.averages) for sweep in sweeps}
    if len(bands) > 1:
        return and_list([f"{sweep.added} ({sweep.band})" for sweep in sweeps])
    first = sweeps[0]
    times = f", {first.averages} averages each" if first.averages > 1 else ""
    return f"{and_list([sweep.added for sweep in sweeps])}, {first.band} in {first.points} points{times}"


def label_of(plan: Plan, sweep: PlannedSweep) -> str:
    """A sweep by what is added, and by its band where those of the plan differ."""
    named = plan.sweeps if plan.further is None else plan.further.sweeps
    return f"{sweep.added}, {sweep.band}" if len({one.band for one in named}) > 1 else sweep.added


def name_of(one: Expected) -> str:
    """How an element or quantity is called."""
    return NAMES.get(one.name, one.name)


def adding_sentences(plan: Plan) -> Iterator[str]:
    """What each sweep from the second on adds to those before it, and what the best of those left would."""
    little: list[str] = []
    for number in range(2, len(plan.stages)):
        before, after = plan.stages[number - 1], plan.stages[number]
        ordinal = ORDINALS[number - 1] if number <= len(ORDINALS) else f"{number}th"
        adds = _adds(before, after)
        if adds is None:
            little.append(f"the {ordinal}, {label_of(plan, after.sweeps[-1])}")
            continue
        yield from _little(little)
        little = []
        yield f"the {ordinal}, {label_of(plan, after.sweeps[-1])}, brings {adds}"
    yield from _little(little)
    if plan.further is not None:
        adds = _adds(plan.last, plan.further)
        would = f"would add little: {NO_ELEMENT}" if adds is None else f"would bring {adds}"
        yield f"the best of those left, {label_of(plan, plan.further.sweeps[-1])}, {would}"


def _little(labels: Sequence[str]) -> Iterator[str]:
    if labels:
        yield f"{and_list(labels)} {'adds' if len(labels) == 1 else 'add'} little: {NO_ELEMENT}"


def _adds(before: Stage, after: Stage) -> str | None:
    """What a sweep adds most to; None where that is little for every element."""
    pairs = [(_factor(old, new), old, new) for old, new in zip(before.elements, after.elements, strict=True)]
    most = sorted((pair for pair in pairs if pair[0] >= ADDS), key=lambda pair: -pair[0])[:MOST_NAMED]
    if not most:
        return None
    return and_list(
        [f"{name_of(new)} from {precision(old, old.sd)} to {precision(new, new.sd)}" for _, old, new in most]
    )


def _factor(old: Expected, new: Expected) -> float:
    if new.sd is None or not new.sd:
        return 1.0
    return float("inf") if old.sd is None else old.sd / new.sd


def _gain(one: Expected) -> float:
    if not one.sd:
        return 1.0
    return float("inf") if one.before is None else one.before / one.sd


def way_sentence(plan: Plan) -> str:
    """What the plan is for and how its sweeps were chosen."""
    centre = "for the part as the sweeps taken show it" if plan.taken else "for a part at the design's centre"
    how = "all sets of that size were looked at" if plan.is_exhaustive else "exchanges of one sweep better it no more"
    return f"{centre}; {len(plan.sweeps)} of {len(plan.candidates)} sweeps, chosen {CRITERIA[plan.criterion]}; {how}"


def verdict_sentence(plan: Plan) -> str:
    """Whether the verdict on the zero would be decided."""
    outlook, zero_time = plan.last.outlook, plan.last.of("zero_time_s")
    if outlook.edge_sigma is None or outlook.undecided_share is None:
        return "the zero time stays unknown, and with it the verdict"
    place = f"zero time {si_with_error(zero_time.value, zero_time.sd, 's')}, {_sigmas(outlook.edge_sigma)} inside"
    decided = "decided" if outlook.is_decidable else "NOT decided"
    share = outlook.undecided_share
    open_share = "less than 0.1 %" if share < 1e-3 else f"{100 * share:.2g} %"
    whose = "of where the sweeps taken leave the part" if plan.taken else "of parts with the design's spreads"
    return f"{place} {outlook.region}: {decided}; {open_share} {whose} would stay undecided"


def limit_sentences(plan: Plan) -> Iterator[str]:
    """How far the part is from the design's other limits, and whether that would show."""
    for limit in plan.last.outlook.limits:
        one = plan.last.of(limit.quantity)
        if limit.sigma is None or one.value is None:
            yield f"{name_of(one)} stays unknown"
            continue
        size = si_with_error(one.value, one.sd, "°" if one.unit == "deg" else one.unit)
        side = "inside" if limit.sigma >= 0 else "outside"
        decided = "decided" if limit.is_decidable else "NOT decided"
        yield f"{name_of(one)} {size}, {_sigmas(abs(limit.sigma))} {side} its limits: {decided}"


def _sigmas(sigma: float) -> str:
    return "over 999 σ" if sigma > 999 else f"{sigma:.3g} σ"


def notes(plan: Plan) -> Iterator[str]:
    """What to know about the numbers."""
    for caution in plan.cautions[:1]:
        yield f"the sweeps taken do not settle where the part is, and the plan leans on them: {caution}"
    reach = set(plan.out_of_reach)
    for name in plan.missed:
        one = (plan.everything if name in reach else plan.last).of(name)
        which = f"all {len(plan.candidates)} sweeps together" if name in reach else "these sweeps"
        wanted = precision(one, dict(plan.wanted)[name])
        yield f"{name_of(one)} is wanted to {wanted}, but {which} give {precision(one, one.sd)}"
    if plan.noise.source == "assumed":
        yield "the noise levels are usual ones, assumed; state your bench's with --noise"
    if plan.design.assumed_spreads:
        yield f"a spread of 20 % is assumed for {', '.join(plan.design.assumed_spreads)}, not stated in the design file"
    if any(sweep.condition.load_added_f or sweep.condition.rz_added_ohm for sweep in plan.sweeps):
        yield (
            "what is added counts as exact; by how much elements come out wrong where all added loads, or all added "
            "resistances, are 1 % larger than stated, is in rows of their own"
        )
    yield from _bench_notes(plan)
    if not any(sweep.condition.rz_added_ohm for sweep in plan.candidates):
        yield (
            "no resistance in series with Rz is on the list (--resistances); it would tell gm1 and Cc apart, which "
            "added loads alone do not"
        )


def _bench_notes(plan: Plan) -> Iterator[str]:
    for one in plan.last.bench:
        if one.name == "bench_load_f" and one.sd and (one.informed or 0.0) < MOSTLY_INFORMED:
            yield (
                f"the bench's load, {si_with_error(one.value, one.sd, 'F')}, is told from CL by what is stated of it "
                "alone: CL and the load parasitic are no surer"
            )
        if one.name == "bench_delay_s" and plan.design.bench.delay_s is None:
            yield "the bench's delay is not stated and counts as unknown; the numbers bear with that"
