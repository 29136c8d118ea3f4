"""Element estimates as text: verdict first, what to do, then which element moved, and what moved the poles."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

from fitamp.comparison.result import Row
from fitamp.elements import ElementEstimate, EstimatedElement, LineKind, Quantity, SweepCheck
from fitamp.findings import ElementFindings
from fitamp.fitting.result import LABELS, text_of, unit_of
from fitamp.report.conditions import cautions, conditions
from fitamp.report.console import new_console, print_table, printable, say, text_of_console
from fitamp.report.elements_words import (
    added_words,
    element_label,
    element_text,
    from_data_words,
    is_told,
    line_sentence,
    load_sentence,
    moved_sentence,
    parasitic_sentences,
    percent,
    resistor_sentence,
    share_text,
    short_names,
)
from fitamp.report.tables import deviation_text, estimate_text, interval_text, limits_text, zero_place
from fitamp.units import si, si_with_error, to_db

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["elements_csv", "elements_text"]

# What is blamed in the table; contributions below this share of the largest of each are not shown.
BLAMED = (Quantity.ZERO_TIME, Quantity.POLE2, Quantity.PHASE_MARGIN)
WORTH_SHOWING = 0.02


def elements_text(findings: ElementFindings) -> str:
    """The whole answer, at most 100 columns wide."""
    console = new_console()
    estimate, verdict = findings.estimate, findings.verdict
    say(console, f"{verdict.nulling.value.upper()}: {verdict.reason}", style="bold")
    say(console, f"what to do: {findings.advice.sentence}")
    say(console, f"elements: {moved_sentence(findings)}")
    for sentence in parasitic_sentences(findings):
        say(console, f"parasitic: {sentence}")
    product = verdict.gm2_rz
    if product.value is not None:
        say(
            console,
            f"gm2·Rz: {si_with_error(product.value, product.stderr, '')} (1 puts the zero at infinity), by the part's "
            "own gm2 and Rz",
        )
    _elements_table(console, findings)
    _sweeps_table(console, estimate)
    _quantities_table(console, findings)
    _blame_table(console, findings)
    for line in findings.lines:
        name = "pole 2 over the added load" if line.kind is LineKind.POLE2 else "zero time over the added resistance"
        say(console, f"line, {name}: {line_sentence(line, findings)}")
    say(console, f"what if: {load_sentence(findings)}")
    say(console, f"what if: {resistor_sentence(findings)}")
    _notes(console, findings)
    return text_of_console(console)


def _elements_table(console: Console, findings: ElementFindings) -> None:
    rows = [
        (
            element_label(one.name),
            si(one.designed, one.unit) if one.designed is not None else "not stated",
            element_text(one),
            "–" if one.held else interval_text(one.estimate.ci95, one.unit),
            "–" if one.held else percent(one.deviation),
            from_data_words(one),
        )
        for one in (*findings.estimate.elements, *findings.estimate.bench)
    ]
    headings = ("element", "designed", "estimate ± 1 σ", "95 % interval", "deviation", "from the data")
    title = f"elements, against {printable(findings.design.file)}"
    print_table(console, title, headings, rows, numbers=True)


def _sweeps_table(console: Console, estimate: ElementEstimate) -> None:
    names = short_names([check.file for check in estimate.checks])
    rows = [
        (
            name,
            added_words(check.condition),
            str(check.points),
            f"{check.adequacy.reduced_chi_square:.3g}",
            _same_part(check),
        )
        for name, check in zip(names, estimate.checks, strict=True)
    ]
    print_table(console, "sweeps", ("file", "added", "points", "chi-square", "part"), rows)


def _same_part(check: SweepCheck) -> str:
    if check.changed:
        return "ANOTHER, left out" if check.left_out else "perhaps ANOTHER"
    if not check.adequacy.adequate:
        return "NOT DESCRIBED"
    return "the same" if check.change_chance is not None else "–"


def _quantities_table(console: Console, findings: ElementFindings) -> None:
    rows = []
    for row in findings.rows:
        rows.append(_quantity_row(row))
        if row.quantity == "zero_time_s":
            rows.append(("as a zero at", zero_place(row.designed), zero_place(row.measured.value), "", "", ""))
    derived = findings.estimate.derived
    if derived.pole3_hz.value is not None:
        rows.insert(4, ("pole 3", "", text_of("pole3_hz", derived.pole3_hz), "", "", ""))
    overshoot = derived.overshoot
    if overshoot.value is not None and overshoot.stderr is not None:
        rows.append(("overshoot", "", si_with_error(100 * overshoot.value, 100 * overshoot.stderr, "%"), "", "", ""))
    rows.append((LABELS["settling_s"], "", text_of("settling_s", derived.settling_s), "", "", ""))
    headings = ("with the bench's load", "designed", "estimate ± 1 σ", "deviation", "limits", "within")
    print_table(console, "what follows", headings, rows, numbers=True)


def _quantity_row(row: Row) -> tuple[str, ...]:
    unit = unit_of(row.quantity)
    low, high, designed = row.low, row.high, row.designed
    if row.quantity == "dc_gain":
        # A gain is read in dB at the bench; scripts get V/V.
        unit = "dB"
        low, high, designed = (None if value is None else to_db(value) for value in (low, high, designed))
    measured = estimate_text(row.quantity, row.measured)
    if row.measured.value is None and designed is None:
        # As in the design, there is no such crossing.
        measured = "unlimited" if row.quantity == "gain_margin_db" else "none"
    return (
        LABELS[row.quantity],
        si(designed, unit),
        measured,
        deviation_text(row.deviation, unit_of(row.quantity)),
        limits_text(low, high, unit),
        {True: "yes", False: "NO", None: "–" if low is None and high is None else "?"}[row.inside],
    )


def _blame_table(console: Console, findings: ElementFindings) -> None:
    """Signed contributions, a column a quantity; * where the element's value is the design's more than the data's."""
    blamed = [one for one in (findings.blame.of(quantity) for quantity in BLAMED) if one is not None]
    if not blamed:
        return
    columns = [{part.name: part for part in one.contributions} for one in blamed]
    names: list[str] = []
    for one in blamed:
        largest = max(abs(part.share.value or 0.0) for part in one.contributions)
        names += [
            part.name
            for part in one.contributions
            if part.name not in names and abs(part.share.value or 0.0) > WORTH_SHOWING * largest
        ]
    told = {one.name for one in (*findings.estimate.elements, *findings.estimate.bench) if is_told(one)}
    rows = []
    for name in names:
        mark = "" if name in told else " *"
        cells = [share_text(one.quantity.value, parts[name].share) for one, parts in zip(blamed, columns, strict=True)]
        rows.append((f"{element_label(name)}{mark}", *cells))
    others = [sum(part.share.value or 0.0 for part in one.contributions if part.name not in names) for one in blamed]
    if len(names) < len(columns[0]):
        cells = [
            f"{si(value, unit_of(one.quantity.value), digits=2)}" for one, value in zip(blamed, others, strict=True)
        ]
        rows.append(("others", *cells))
    rows.append(("in all", *(share_text(one.quantity.value, one.change) for one in blamed)))
    headings = ("what moved it", *(LABELS[one.quantity.value] for one in blamed))
    print_table(console, "blame: estimated less designed", headings, rows, numbers=True)
    if any(row[0].endswith("*") for row in rows):
        say(console, "* its value is the design's more than the data's; trust the sum with its neighbours more")


def _notes(console: Console, findings: ElementFindings) -> None:
    estimate = findings.estimate
    for kind, sentence in dict.fromkeys(_on_sweeps(estimate)):
        say(console, f"note ({kind}): {sentence}" if kind else sentence)
    if findings.design.assumed_spreads:
        names = ", ".join(findings.design.assumed_spreads)
        say(console, f"assumed: a spread of 20 % for {names}, not stated in the design file")
    for note in estimate.notes:
        say(console, f"note ({note.code.value}): {note.message}")


def _on_sweeps(estimate: ElementEstimate) -> Iterator[tuple[str, str]]:
    for sweep in estimate.sweeps:
        for sentence in conditions(sweep):
            yield "", sentence
        for code, sentence in cautions(sweep):
            yield code, f"{sweep.origin.file}: {sentence}"
        if sweep.left_out:
            yield "points-left-out", f"{sweep.origin.file}: {len(sweep.left_out)} points left out"


def elements_csv(findings: ElementFindings) -> str:
    """The elements as CSV, in SI units; an unknown cell is empty."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(("element", "unit", "designed", "value", "stderr", "low", "high", "deviation", "informed", "held"))
    for one in (*findings.estimate.elements, *findings.estimate.bench):
        writer.writerow(_csv_row(one))
    return stream.getvalue()


def _csv_row(one: EstimatedElement) -> Sequence[str]:
    found = one.estimate
    numbers = (one.designed, found.value, found.stderr, *found.ci95, one.deviation, one.informed)
    return [one.name, one.unit, *("" if n is None else repr(float(n)) for n in numbers), "yes" if one.held else "no"]
