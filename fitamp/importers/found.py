"""One table of a text file to the sweeps in it: columns, notation, numbers, points without a reading."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.importers.blocks import Table
from fitamp.importers.cells import show
from fitamp.importers.columns import Column
from fitamp.importers.gain import AGREEMENT, differing, frequency_hz, gain_fault, loop_gain
from fitamp.importers.notation import Notation
from fitamp.importers.points import Points
from fitamp.importers.readings import MOST_WITHOUT
from fitamp.importers.several import by_label, by_restart
from fitamp.importers.understanding import Understood
from fitamp.importers.values import Values, column_values
from fitamp.sweep import Decision, LeftOut

__all__ = ["AGREED", "Found", "found_in"]

_SHOWN = 5

AGREED = Decision(
    topic="magnitude and phase",
    choice="left aside",
    reason=f"they agree with real and imaginary part within {AGREEMENT:g} of the magnitude",
)

# Rows without a reading: the column at fault, and what is said of it.
_Faults = dict[int, tuple[Column, str]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """One sweep of a file, its points in the order of the file.

    trace : names of its columns
    notes : what stands above its table and is no header
    told : how it is told from the others of its file; empty where it is alone
    """

    points: Points
    trace: str
    notes: tuple[str, ...]
    decisions: tuple[Decision, ...]
    left_out: tuple[LeftOut, ...] = ()
    told: str = ""


def found_in(file: str, table: Table, understood: Understood) -> list[Found]:
    """The sweeps of a table: one, unless a column numbers several, or the frequency starts anew.

    Raises
    ------
    SweepError
        When the table cannot be read without guessing; the message has line and column.
    """
    used, notation = understood.used, understood.notation
    freq = _frequency(file, table, used.frequency, notation)
    gain, faults = _gain(file, table, used.gain, notation)
    decisions = understood.decisions
    if used.check:
        other, unsure = _gain(file, table, used.check, notation)
        _refuse_disagreement(file, table, differing(gain, other), {*faults, *unsure})
        decisions = (*decisions, AGREED)
    _refuse_many_without(file, table, faults)
    whole = Found(
        points=Points(lines=[], freq_hz=freq, gain=gain), trace=used.trace, notes=understood.notes, decisions=decisions
    )
    parts = _parts(table, understood.labels, freq)
    return [replace(_part(whole, table, rows, faults), told=told) for rows, told in parts]


def _frequency(file: str, table: Table, column: Column, notation: Notation) -> FloatArray:
    values = column_values(file, table, column, notation)
    for row, reason in values.faults.items():
        raise table.fault(file, row, reason, index=column.index, label=column.label)
    return frequency_hz(column, np.asarray(values.numbers, dtype=float))


def _gain(file: str, table: Table, columns: Sequence[Column], notation: Notation) -> tuple[ComplexArray, _Faults]:
    """Complex loop gain, shape (n,), and by row the column and reason of those without a reading."""
    values = [column_values(file, table, column, notation) for column in columns]
    faults: _Faults = {}
    for column, own in zip(columns, values, strict=True):
        for row, reason in own.faults.items():
            faults.setdefault(row, (column, reason))
    numbers = [_blanked(own, faults) for own in values]
    fault, what = gain_fault(columns, numbers)
    if fault.any():
        row = int(np.argmax(fault))
        first = columns[0]
        text = f"{table.cells[row][first.index]!r} is {what}; check the unit of the column"
        raise table.fault(file, row, text, index=first.index, label=first.label)
    return loop_gain(columns, numbers), faults


def _blanked(values: Values, rows: _Faults) -> FloatArray | ComplexArray:
    """The numbers, 0 in the rows without a reading."""
    if not rows:
        return values.numbers
    numbers = values.numbers.copy()
    numbers[list(rows)] = 0
    return numbers


def _refuse_many_without(file: str, table: Table, faults: _Faults) -> None:
    """A sweep with few readings is no sweep; the first fault is what to look at."""
    if len(faults) <= MOST_WITHOUT * len(table.rows):
        return
    row = min(faults)
    column, reason = faults[row]
    others = f" ({len(faults)} of {len(table.rows)} points are without; up to a tenth are left out)"
    raise table.fault(file, row, f"{reason}{others}", index=column.index, label=column.label)


def _refuse_disagreement(file: str, table: Table, differs: NDArray[np.bool_], unsure: set[int]) -> None:
    """Real and imaginary part are used only where magnitude and phase say the same."""
    differs[list(unsure)] = False
    if differs.any():
        raise table.fault(
            file,
            int(np.argmax(differs)),
            "real and imaginary part do not agree with magnitude and phase; say with --columns which of them to use",
        )


def _parts(table: Table, labels: int | None, freq_hz: FloatArray) -> list[tuple[NDArray[np.intp], str]]:
    """Rows of each sweep, and how it is told from the others."""
    if labels is not None:
        named = by_label(table.texts(labels))
        if named:
            return [(rows, f"column {labels + 1} is {label} in its rows") for label, rows in named]
    runs = by_restart(freq_hz)
    told = "the frequency starts anew here" if len(runs) > 1 else ""
    return [(rows, told) for rows in runs]


def _part(whole: Found, table: Table, rows: NDArray[np.intp], faults: _Faults) -> Found:
    """The points of one sweep, those without a reading left out."""
    own = [row for row in rows.tolist() if row in faults] if faults else []
    kept = np.setdiff1d(rows, own) if own else rows
    all_of_it = len(kept) == len(table.rows)
    points = Points(
        lines=[line.number for line in (table.rows if all_of_it else [table.rows[row] for row in kept])],
        freq_hz=whole.points.freq_hz if all_of_it else whole.points.freq_hz[kept],
        gain=whole.points.gain if all_of_it else whole.points.gain[kept],
    )
    if not own:
        return replace(whole, points=points)
    left_out = []
    for row in own:
        cell = table.cells[row][faults[row][0].index]
        reason = f"no reading ({show(cell) if cell else 'an empty cell'} on line {table.rows[row].number})"
        left_out.append(LeftOut(f_hz=float(whole.points.freq_hz[row]), gain=None, reason=reason))
    lines = ", ".join(str(table.rows[row].number) for row in own[:_SHOWN]) + (" …" if len(own) > _SHOWN else "")
    choice = f"{len(own)} of {len(rows)} points left out"
    decision = Decision(topic="no reading", choice=choice, reason=f"the cells say so on line {lines}")
    return replace(whole, points=points, decisions=(*whole.decisions, decision), left_out=tuple(left_out))
