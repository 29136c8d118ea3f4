"""What estimated elements say, in sentences that text and pictures share."""

from __future__ import annotations

import math
import os
from collections.abc import Iterator, Sequence
from pathlib import PurePath

from fitamp.elements import Condition, EstimatedElement, LineFit, LineKind, Quantity, QuantityBlame
from fitamp.elements.circuit import UNITS
from fitamp.elements.result import MOSTLY_INFORMED
from fitamp.estimate import Estimate
from fitamp.findings import ElementFindings
from fitamp.fitting.result import LABELS, text_of
from fitamp.units import si, si_with_error

__all__ = [
    "added_words",
    "blame_sentence",
    "element_label",
    "element_text",
    "from_data_words",
    "is_told",
    "line_sentence",
    "load_sentence",
    "moved_elements",
    "moved_sentence",
    "parasitic_sentences",
    "percent",
    "resistor_sentence",
    "share_text",
    "short_names",
    "sweeps_name",
]

_LABELS = {"bench_load_f": "bench load", "bench_delay_s": "bench delay", "mirror_pole_hz": "mirror pole"}
_QUANTITIES = {Quantity.ZERO_TIME: "the zero", Quantity.PHASE_MARGIN: "the phase margin"}
# Shares of what is known from which on an element counts as measured, as told by the sweeps more than by the design,
# and as told by them at all.
MEASURED, MOST, NEXT_TO_NOTHING = 0.95, MOSTLY_INFORMED, 0.05
MOST_NAMED = 4
# A contribution is named where it is at least this share of the largest one.
WORTH_NAMING = 0.25
# So many standard errors apart, two ways to one number are said to disagree.
CLEARLY = 3.0


def element_label(name: str) -> str:
    """An element as it is written: its symbol, or what of the bench it is."""
    return _LABELS.get(name, name)


def element_text(one: EstimatedElement) -> str:
    """Estimate ± standard error, or why there is none."""
    if one.held:
        return si(one.estimate.value, one.unit)
    if one.estimate.value is None:
        return "undetermined"
    return si_with_error(one.estimate.value, one.estimate.stderr, one.unit)


def is_told(one: EstimatedElement) -> bool:
    """Whether the sweeps tell an element more than its design does.

    Of sweeps that contradict one another the errors are wider than each of them gives, and may be than the design's.
    """
    found = one.estimate
    if one.held or not one.is_informed or found.value is None or found.stderr is None:
        return False
    spread = one.spread if one.unit == "s" or one.spread is None else one.spread * abs(found.value)
    return spread is None or found.stderr <= spread


def from_data_words(one: EstimatedElement) -> str:
    """How much of what is said of an element came from the sweeps: what the design handed back is no measurement."""
    if one.held:
        return "held, no spread"
    if one.estimate.value is None or (one.is_informed and not is_told(one)):
        return "NOT TOLD"
    share = f"{100 * one.informed:.0f} %"
    if one.informed >= MEASURED:
        return f"{share}, measured"
    if one.informed >= MOST:
        return f"{share}, part design"
    return f"{share}, {'MOSTLY DESIGN' if one.informed >= NEXT_TO_NOTHING else 'DESIGN ONLY'}"


def percent(deviation: float | None) -> str:
    """A relative deviation: "−16.0 %"."""
    if deviation is None:
        return "–"
    if deviation >= 1:
        return f"× {1 + deviation:.3g}".replace("-", "−")
    return f"{100 * deviation:+.{2 if abs(deviation) < 0.0095 else 1}f} %".replace("-", "−")


def added_words(condition: Condition) -> str:
    """What was added in a sweep: "+5.00 pF", "−400 Ω", or "nothing"."""
    parts = []
    if condition.load_added_f:
        parts.append(f"+{si(condition.load_added_f, 'F', digits=3)}")
    if condition.rz_added_ohm:
        sign = "+" if condition.rz_added_ohm > 0 else ""
        parts.append(f"{sign}{si(condition.rz_added_ohm, 'Ω', digits=3)}")
    return ", ".join(parts) or "nothing"


def short_names(files: Sequence[str]) -> tuple[str, ...]:
    """File names without the folders that all of them share."""
    if len(files) < 2:
        return tuple(files)
    try:
        common = os.path.commonpath([PurePath(file).parent for file in files])
        return tuple(PurePath(file).relative_to(common).as_posix() for file in files)
    except ValueError:  # on different drives, or some absolute and some not
        return tuple(files)


def sweeps_name(findings: ElementFindings) -> str:
    """The sweeps as one name: the file, or how many there are and in which folder."""
    files = [check.file for check in findings.estimate.checks]
    if len(files) == 1:
        return files[0]
    folders = {PurePath(file).parent for file in files}
    folder = folders.pop().name if len(folders) == 1 else "several folders"
    return f"{len(files)} sweeps in {folder}" if folder else f"{len(files)} sweeps"


def _listed(words: Sequence[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def moved_elements(findings: ElementFindings) -> list[EstimatedElement]:
    """Elements that the sweeps, not the design, put off by more than their designed spread; the farthest first."""
    spreads = findings.design.spreads
    moved = []
    for one in findings.estimate.elements:
        low, high = one.estimate.ci95
        if not is_told(one) or one.designed is None:
            continue
        is_apart = (low is not None and low > one.designed) or (high is not None and high < one.designed)
        if is_apart and (one.deviation is None or abs(one.deviation) > spreads.get(one.name, 0.0)):
            moved.append(one)
    return sorted(moved, key=lambda one: -math.inf if one.deviation is None else -abs(one.deviation))


def _off_by(one: EstimatedElement) -> str:
    """The deviation; of an element that was designed to be absent what is there."""
    return (
        f"{si(one.estimate.value, one.unit, digits=3)} instead of none" if not one.designed else percent(one.deviation)
    )


def moved_sentence(findings: ElementFindings) -> str:
    """Which elements are off by more than their spread, and which were not measured at all."""
    moved = moved_elements(findings)
    measured = [one for one in findings.estimate.elements if is_told(one)]
    rest = [one.name for one in findings.estimate.elements if not (one.held or is_told(one))]
    if moved:
        named = [f"{element_label(one.name)} {_off_by(one)}" for one in moved[:MOST_NAMED]]
        if len(moved) > MOST_NAMED:
            named.append(f"{len(moved) - MOST_NAMED} more")
        sentence = f"off by more than {'its spread' if len(moved) == 1 else 'their spreads'}: {', '.join(named)}"
    elif measured:
        sentence = f"within the design's spreads: {', '.join(element_label(one.name) for one in measured)}"
    else:
        sentence = "the sweeps tell none of the elements"
    if rest:
        sentence += f"; NOT MEASURED, the design's own: {', '.join(element_label(name) for name in rest)}"
    return sentence


def share_text(quantity: str, share: Estimate) -> str:
    """A contribution with its sign: "−6.12 ± 0.03 MHz"."""
    text = text_of(quantity, share)
    return f"+{text}" if (share.value or 0.0) > 0 else text


def blame_sentence(blamed: Sequence[QuantityBlame]) -> str:
    """What moved each quantity, by its largest contributions: "the zero was moved by Rz and gm2; pole 2 by gm2"."""
    parts: list[str] = []
    unmoved: list[str] = []
    for one in blamed:
        label = _QUANTITIES.get(one.quantity, LABELS[one.quantity.value])
        # What pulls the other way has moved nothing.
        toward = [part for part in one.contributions if (part.share.value or 0.0) * (one.change.value or 0.0) > 0]
        largest = max((abs(part.share.value or 0.0) for part in toward), default=0.0)
        if one.change.touches(0.0, 0.0) or not toward:
            unmoved.append(label)
            continue
        named = [
            element_label(part.name)
            for part in toward[:MOST_NAMED]
            if abs(part.share.value or 0.0) >= WORTH_NAMING * largest
        ]
        parts.append(f"{label} {'' if parts else 'was moved '}by {_listed(named)}")
    if unmoved:
        parts.append(f"{_listed(unmoved)} {'is' if len(unmoved) == 1 else 'are'} as designed, within the errors")
    return "; ".join(parts)


def _rough(share: Estimate) -> Estimate:
    """Without the error, for a headline."""
    return Estimate(value=share.value, stderr=None, ci95=(None, None))


def parasitic_sentences(findings: ElementFindings) -> Iterator[str]:
    """Capacitance that nobody designed."""
    found = findings.estimate.parasitics
    bench = findings.design.bench.load_f
    without = f"designed and the bench's {si(bench, 'F', digits=3)}" if bench else "designed"
    if found.load_f.value is not None:
        whole = text_of("load_f", found.load_total_f)
        yield f"load {whole} in all, {text_of('load_f', found.load_f)} beyond the {without}"
    else:
        yield "load: not told by these sweeps; one with a known load added tells it"
    if found.first_stage_f.value is not None:
        yield f"first stage {text_of('first_stage_f', found.first_stage_f)} beyond the designed C1"


def line_sentence(line: LineFit, findings: ElementFindings) -> str:
    """What a classic line says, beside what the joint fit of the circuit does."""
    if line.kind is LineKind.POLE2:
        joint, what = findings.estimate.parasitics.load_f, "load that nobody designed"
    else:
        joint, what = findings.estimate.element("Cc").estimate, "Cc"
    own, other = text_of("load_f", line.meaning), text_of("load_f", joint)
    sentence = f"{what} {own} by the line, {other} by the joint fit"
    values = (line.meaning.value, line.meaning.stderr, joint.value, joint.stderr)
    if any(value is None for value in values):
        return sentence
    value, stderr, other_value, other_stderr = (float(number or 0.0) for number in values)
    agree = abs(value - other_value) <= CLEARLY * (stderr**2 + other_stderr**2) ** 0.5
    return f"{sentence}: {'they agree' if agree else 'THEY DISAGREE'}"


def load_sentence(findings: ElementFindings) -> str:
    """Up to which load the wanted phase margin is kept."""
    loads = findings.loads
    if loads is None:
        return "no phase margin is wanted: state one with --margin-wanted, or as a limit in the design file"
    wanted = f"{loads.phase_margin_deg:g}°"
    if not loads.keeps and loads.low_f is None and loads.high_f is None:
        return f"no load keeps {wanted}"
    ends = [
        f"{word} {text_of('load_f', end)}"
        for word, end in (("from", loads.low_f), ("up to", loads.high_f))
        if end is not None
    ]
    if not ends and findings.estimate.derived.crossover_hz.value is None:
        return "without a crossover there is no phase margin to lose"
    if not ends:
        return f"{wanted} are kept with any load"
    sentence = f"{wanted} are kept {' '.join(ends)} at the output"
    room = loads.room_f
    if room is None or room.value is None:
        return sentence
    amount = text_of("load_f", _rough(Estimate(value=abs(room.value), stderr=None, ci95=(None, None))))
    return f"{sentence}: {amount} {'more than' if room.value > 0 else 'LESS than'} on the bench"


def resistor_sentence(findings: ElementFindings) -> str:
    """Over which resistors it is kept, and what the restored zero gives."""
    parts = []
    found = findings.resistors
    has_crossover = findings.estimate.derived.crossover_hz.value is not None
    if found is not None and findings.wanted_deg is not None and has_crossover:
        wanted = f"{findings.wanted_deg:g}°"
        ends = [
            f"{word} {si(end, UNITS['Rz'], digits=3)}"
            for word, end in (("from", found.low_ohm), ("up to", found.high_ohm))
            if end is not None
        ]
        if not found.keeps:
            parts.append(f"{wanted} are not kept with the part's Rz")
        else:
            parts.append(f"{wanted} are kept {'with Rz ' + ' '.join(ends) if ends else 'with any Rz'}")
    needed, margin = findings.restoring.rz_ohm, findings.restored_margin_deg
    if needed.value is not None and needed.value >= 0:
        gives = "" if margin.value is None else f" and gives {margin.value:.1f}°"
        parts.append(f"Rz = {si(needed.value, 'Ω')} restores the designed zero{gives}")
    return "; ".join(parts) or "no resistor restores the designed zero"
