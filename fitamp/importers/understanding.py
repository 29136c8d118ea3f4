"""What a table's columns hold and how its numbers are written, with every decision on the way."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from fitamp.importers.blocks import Table
from fitamp.importers.cells import MINUS_MARKS, is_complex_like, show
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.columns import Column, Columns, chosen_columns, told_columns
from fitamp.importers.header import Header, find_header
from fitamp.importers.notation import Notation, find_notation, may_tell
from fitamp.importers.notes import notes_among
from fitamp.importers.quantity import Unit, names_sweeps
from fitamp.importers.tails import unit_in_cells
from fitamp.importers.text import Text
from fitamp.sweep import Decision

__all__ = ["Understood", "understand"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Understood:
    """The columns in use, how their numbers are written, and what else is there.

    labels : the column that numbers the sweeps; None without one
    notes : what stands above the table and is no header
    """

    used: Columns
    notation: Notation
    labels: int | None
    notes: tuple[str, ...]
    decisions: tuple[Decision, ...]


def understand(file: str, text: Text, table: Table, choice: ColumnChoice | None) -> Understood:
    """Tell columns and notation of a table.

    Raises
    ------
    SweepError
        When header, options and cells leave a doubt.
    """
    header = find_header(file, table.block)
    units = _units_in_cells(table, header)
    if choice is not None:
        used = chosen_columns(file, choice, header, units_in_cells=units)
    else:
        used = told_columns(file, header, _complex_columns(table), units_in_cells=units)
    columns = (used.frequency, *used.gain, *used.check)
    notation, why = find_notation(file, _telling_cells(table, columns))
    labels = _label_column(header, {column.index for column in columns})
    block = table.block
    separator = Decision(topic="separator", choice=block.separator.label, reason=_separator_reason(table))
    aside = _aside(text, table, columns, labels)
    notes = notes_among(block.above, header.lines)
    decisions = (*text.decisions, separator, *why, *header.decisions, *used.decisions, *aside)
    return Understood(used=used, notation=notation, labels=labels, notes=notes, decisions=decisions)


def _complex_columns(table: Table) -> list[int]:
    first = table.cells[:3]
    return [index for index in range(table.block.width) if any(is_complex_like(row[index]) for row in first)]


def _units_in_cells(table: Table, header: Header) -> dict[int, Unit]:
    """Units behind the digits, for columns of which the header does not say the unit."""
    units = {}
    for index, meaning in enumerate(header.meanings):
        if meaning.unit is None and unit_in_cells([row[index] for row in table.cells[:3]]) is not None:
            unit = unit_in_cells(table.texts(index))
            if unit is not None:
                units[index] = unit
    return units


def _telling_cells(table: Table, columns: Sequence[Column]) -> list[tuple[int, str]]:
    """Line and text of the cells that may tell how numbers are written; none where all have at most a point."""
    texts = {column.index: table.texts(column.index) for column in columns}
    if not any(may_tell("\n".join(column)) for column in texts.values()):
        return []
    return [(row.number, text) for column in texts.values() for row, text in zip(table.rows, column, strict=True)]


def _label_column(header: Header, taken: set[int]) -> int | None:
    named = [i for i, meaning in enumerate(header.meanings) if i not in taken and names_sweeps(meaning.text)]
    return named[0] if len(named) == 1 else None


def _separator_reason(table: Table) -> str:
    trailing = "; the one at the end of every row is taken off" if table.block.trailing else ""
    return f"with it the rows from line {table.rows[0].number} are {table.block.width} columns of numbers{trailing}"


def _aside(text: Text, table: Table, columns: Sequence[Column], labels: int | None) -> list[Decision]:
    """What is in the file and not in the sweep."""
    decisions = []
    block = table.block
    if block.comments:
        reason = "comment lines among the rows are not read"
        decisions.append(Decision(topic="comments", choice=f"{block.comments} left aside", reason=reason))
    taken = {column.index for column in columns}
    others = [str(index + 1) for index in range(block.width) if index not in taken and index != labels]
    if others:
        reason = "not part of the loop gain in use"
        decisions.append(Decision(topic="other columns", choice=f"{', '.join(others)} left aside", reason=reason))
    used = "".join(cell for index in taken for cell in table.texts(index))
    for mark, code in MINUS_MARKS.items():
        if mark in used:
            reason = f"the file writes {code} for the minus sign"
            decisions.append(Decision(topic="minus sign", choice=f"{code} read as minus", reason=reason))
    if table.closing:
        lines = ", ".join(str(line.number) for line in table.closing)
        reason = f"{show(table.closing[0].text.strip())} only says that the table ends"
        decisions.append(Decision(topic="last line", choice=f"line {lines} left aside", reason=reason))
    above = sum(bool(line.text.strip()) for line in block.above)
    if above:
        reason = f"{above} of {text.line_count} lines stand above the numbers"
        decisions.append(Decision(topic="first row", choice=f"line {table.rows[0].number}", reason=reason))
    return decisions
