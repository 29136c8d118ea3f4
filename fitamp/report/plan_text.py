"""A plan as text: what the sweeps will fix, element by element after each sweep, the verdict, what to know."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from typing import TYPE_CHECKING

from fitamp.planning import Expected, Plan, Stage
from fitamp.report.console import new_console, print_table, printable, say, text_of_console
from fitamp.report.plan_words import (
    adding_sentences,
    label_of,
    limit_sentences,
    name_of,
    notes,
    precision,
    shift,
    summary,
    verdict_sentence,
    way_sentence,
)
from fitamp.units import si

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["plan_table", "plan_text", "steps_table"]


def plan_text(plan: Plan) -> str:
    """A plan: the answer in a sentence, then the numbers."""
    console = new_console()
    say(console, _capital(summary(plan)))
    for sentence in adding_sentences(plan):
        say(console, f"  {sentence}")
    say(console, f"verdict: {verdict_sentence(plan)}")
    for sentence in limit_sentences(plan):
        say(console, f"  {sentence}")
    _elements(console, plan)
    _quantities(console, plan)
    say(console, f"how: {way_sentence(plan)}")
    noise = plan.noise
    levels = f"error channel {noise.error_channel:.2g}, return channel {noise.return_channel:.2g}"
    ratio = f", ratio {noise.ratio:.2g}" if noise.ratio else ""
    say(console, f"noise of one sweep: {levels}, relative {noise.relative:.2g}{ratio} ({noise.source})")
    for note in notes(plan):
        say(console, f"note: {note}")
    return text_of_console(console)


def _elements(console: Console, plan: Plan) -> None:
    """A row a stage, a column an element."""
    first = plan.stages[0]
    names = [name_of(one) for one in first.elements]
    rows = [
        ("so far" if plan.taken else "by the design alone", *(precision(one, one.before) for one in first.elements)),
        *(
            _row(f"{number}  {label_of(plan, stage.sweeps[-1])}", stage)
            for number, stage in enumerate(plan.stages[1:], start=1)
        ),
    ]
    if plan.parts_drawn:
        rows.append((f"over {plan.parts_drawn} parts", *(precision(one, one.over_parts) for one in plan.last.elements)))
        rows.append(("worst of them", *(precision(one, one.worst) for one in plan.last.elements)))
    rows += _wrong(plan)
    if plan.further is not None:
        rows.append(_row(f"next: {label_of(plan, plan.further.sweeps[-1])}", plan.further))
    title = f"standard deviation to be expected after each sweep, {printable(plan.design.file)}"
    print_table(console, title, ("sweep", *(f" {name}" for name in names)), rows, numbers=True)


def _wrong(plan: Plan) -> list[tuple[str, ...]]:
    """What wrong loads and resistances do, where some are added."""
    elements = plan.last.elements
    rows = []
    if any(one.by_loads for one in elements):
        rows.append(("if loads are +1 %", *(shift(one, one.by_loads) for one in elements)))
    if any(one.by_resistances for one in elements):
        rows.append(("if resistances are +1 %", *(shift(one, one.by_resistances) for one in elements)))
    return rows


def _row(label: str, stage: Stage) -> tuple[str, ...]:
    return (label, *(precision(one, one.sd) for one in stage.elements))


def _quantities(console: Console, plan: Plan) -> None:
    """A row a quantity; over the parts that the plan is for, and after the first and the last sweep."""
    numbers = sorted({1, len(plan.sweeps)})
    after = [plan.stages[number] for number in numbers]
    rows = []
    for index, one in enumerate(plan.last.quantities):
        cells = [_absolute(stage.quantities[index], stage.quantities[index].sd) for stage in after]
        drawn = [_absolute(one, one.over_parts), _absolute(one, one.worst)] if plan.parts_drawn else []
        rows.append((name_of(one), si(one.value, _unit(one)), _absolute(one, one.before), *cells, *drawn))
    headings = ["quantity", "  of the part", "  ± so far" if plan.taken else "  ± over such parts"]
    headings += [f"  ± after {number}" for number in numbers]
    headings += [f"  over {plan.parts_drawn} parts", "  worst of them"] if plan.parts_drawn else []
    print_table(console, "what the verdict is made of", headings, rows, numbers=True)


def _absolute(one: Expected, sd: float | None) -> str:
    return si(sd, _unit(one), digits=2)


def _unit(one: Expected) -> str:
    return "°" if one.unit == "deg" else one.unit


def plan_table(plan: Plan) -> str:
    """Standard deviations in SI units as CSV, a row a stage; an unknown cell is empty."""
    stages = [*plan.stages, *([] if plan.further is None else [plan.further])]
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    names = [one.name for one in _all(stages[0])]
    writer.writerow(["sweeps", "load_added_F", "rz_added_ohm", *(f"{name}_sd" for name in names)])
    for stage in stages:
        last = stage.sweeps[-1].condition if stage.sweeps else None
        added = ("", "") if last is None else (f"{last.load_added_f:g}", f"{last.rz_added_ohm:g}")
        sds = ("" if one.sd is None else f"{one.sd:.6g}" for one in _all(stage))
        writer.writerow([len(stage.sweeps), *added, *sds])
    return stream.getvalue()


def _all(stage: Stage) -> Sequence[Expected]:
    return (*stage.elements, *stage.bench, *stage.quantities)


def steps_table(plan: Plan) -> str:
    """A steps file for the sweeps of the plan, with names of files to be taken."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(["file", "load_added_F", "rz_added_ohm", "note"])
    for number, sweep in enumerate(plan.sweeps, start=plan.taken + 1):
        load_f, rz_ohm = sweep.condition.load_added_f, sweep.condition.rz_added_ohm
        times = f", {sweep.averages} averages" if sweep.averages > 1 else ""
        writer.writerow(
            [
                f"step{number}.csv",
                si(load_f, "F") if load_f else 0,
                _plain(si(rz_ohm, "Ohm")) if rz_ohm else 0,
                f"{sweep.band} in {sweep.points} points{times}",
            ]
        )
    return stream.getvalue()


def _plain(text: str) -> str:
    return text.replace("\N{MINUS SIGN}", "-")


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
