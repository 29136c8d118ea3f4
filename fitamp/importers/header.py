"""The header of a text table: the line that names its columns, and a row of units under it."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace

from fitamp.importers.cells import is_number_like, show
from fitamp.importers.dialect import Block, Separator, is_comment, is_rule, split_cells, uncommented
from fitamp.importers.fault import at_line, quote_span
from fitamp.importers.quantity import UNITS_OF, Meaning, Quantity, Unit, as_german, doubt_of, meaning_of, unit_of
from fitamp.importers.text import Line
from fitamp.importers.words import language_of
from fitamp.sweep import Decision

__all__ = ["Header", "find_header", "is_header_row"]

# Cells of a units row that say "no unit".
_NO_UNIT = frozenset({"", "-", "–", "[-]", "[1]", "(-)", "[]", "()", "v/v", "[v/v]", "(v/v)"})

# A header stands within so many lines above the rows.
_NEAR = 300


@dataclass(frozen=True, slots=True, kw_only=True)
class Header:
    """What the columns hold, one meaning for each; `line` is None where the file has no header.

    `lines` are those of header and units; `others` are lines that may be headers as well, where none of them names the
    columns.
    """

    line: int | None
    meanings: tuple[Meaning, ...]
    decisions: tuple[Decision, ...]
    lines: tuple[int, ...] = ()
    others: tuple[int, ...] = ()


def find_header(file: str, block: Block) -> Header:
    """Find the header just above the rows of numbers, with its row of units where it has one.

    Raises
    ------
    SweepError
        When the line above the rows is neither header nor units, or a row of units contradicts the header.
    """
    above = [line for line in block.above if line.text.strip()]
    plain = [line for line in above if not is_comment(line.text) and not is_rule(line.text)]
    comments = [line for line in above if is_comment(line.text)]
    for line in plain:
        _refuse_numbers(file, line, block, nearest=line is plain[-1])
    plain, comments = plain[-_NEAR:], comments[-_NEAR:]
    names, units = _plain_header(plain, block)
    others: tuple[int, ...] = ()
    reason = "the line above the numbers"
    if names is not None and not _speaks(names):
        better, others = _header_farther_up(file, plain, block)
        if better is not None:
            reason = f"the one line that names the columns; line {names[0]} under it names none"
            names, units = better
    in_comment, comment_units = _commented_header(comments, block)
    if names and in_comment and units is None and in_comment[0] > names[0] and _is_units_row(in_comment[1]):
        units = in_comment
    elif in_comment is not None and (names is None or in_comment[0] > names[0]):
        names, units, reason = in_comment, comment_units, "a comment line whose cells name the columns"
    if names is None:
        _refuse_uneven_header(file, plain, block)
        blank = tuple(Meaning(text="") for _ in range(block.width))
        return Header(line=None, meanings=blank, decisions=())
    decisions = [Decision(topic="header", choice=f"line {names[0]}", reason=reason)]
    meanings = tuple(meaning_of(cell) for cell in names[1])
    if units is not None:
        meanings = _with_units(file, meanings, units)
        under = "the line under the header has only units"
        decisions.append(Decision(topic="units row", choice=f"line {units[0]}", reason=under))
    if any(meaning.doubt for meaning in meanings) and language_of(names[1]) == "German":
        settled = tuple(map(as_german, meanings))
        if settled != meanings:
            reason = "in a German header it is no gradian"
            decisions.append(Decision(topic="Grad", choice="degrees", reason=reason))
            meanings = settled
    lines = (names[0],) if units is None else (names[0], units[0])
    return Header(line=names[0], meanings=meanings, decisions=tuple(decisions), lines=lines, others=others)


def is_header_row(row: Line, block: Block) -> bool:
    """Whether a line among the rows of numbers is a header: words only, one of which names a frequency."""
    try:
        cells = split_cells(row.text, block.separator)
    except ValueError:
        return False
    return _is_header(cells) and Quantity.FREQUENCY in {meaning_of(cell).quantity for cell in cells}


_Cells = tuple[int, tuple[str, ...]]


def _plain_header(plain: Sequence[Line], block: Block) -> tuple[_Cells | None, _Cells | None]:
    """Header and units row among the lines that are no comments."""
    last = _cells_of(plain[-1].text, block) if plain else None
    if last is None:
        return None, None
    if _is_units_row(last) and len(plain) > 1:
        over = _cells_of(plain[-2].text, block)
        if over is not None and _is_header(over):
            return (plain[-2].number, over), (plain[-1].number, last)
    return ((plain[-1].number, last), None) if _is_header(last) else (None, None)


def _speaks(names: _Cells) -> bool:
    """Whether any cell of a header names what its column holds."""
    return any(meaning_of(cell).quantity is not None for cell in names[1])


def _header_farther_up(
    file: str, plain: Sequence[Line], block: Block
) -> tuple[tuple[_Cells, _Cells | None] | None, tuple[int, ...]]:
    """The one header with units above a line that names nothing, and, without such, the lines that may be headers.

    Only one that names frequency and gain and their units without doubt is taken, because it might be a preamble.
    """
    complete, others = [], []
    for end in range(1, len(plain)):
        cells = _cells_of(plain[end - 1].text, block)
        if cells is None or not _is_header(cells):
            continue
        others.append(plain[end - 1].number)
        names, units = _plain_header(plain[:end], block)
        if names is not None and _is_complete(file, names, units):
            complete.append((names, units))
    if len(complete) == 1:
        return complete[0], ()
    return None, tuple(others)


def _is_complete(file: str, names: _Cells, units: _Cells | None) -> bool:
    meanings = tuple(map(meaning_of, names[1]))
    if units is not None:
        meanings = _with_units(file, meanings, units)
    known = {m.quantity for m in meanings if m.quantity and not m.weak and (m.unit or not UNITS_OF[m.quantity])}
    pairs = ({Quantity.REAL, Quantity.IMAGINARY}, {Quantity.MAGNITUDE, Quantity.PHASE})
    return Quantity.FREQUENCY in known and any(pair <= known for pair in pairs)


def _refuse_numbers(file: str, line: Line, block: Block, *, nearest: bool) -> None:
    """Refuse a line of numbers above the rows of numbers: it would be lost in silence."""
    cells = re.split(r"[\s,;]+", line.text.strip(" \t,;"))
    if all(is_number_like(cell) for cell in cells) and (nearest or len(cells) == block.width):
        raise at_line(
            file,
            line.number,
            f"a row of numbers apart from the {block.width} columns below it; complete the row or remove it",
        )


def _refuse_uneven_header(file: str, plain: Sequence[Line], block: Block) -> None:
    """Refuse a line above the numbers that is a header but for its number of cells."""
    if not plain:
        return
    line = plain[-1]
    if line.text.count('"') % 2:
        text = "a quote is not closed on this line; close it or remove it"
        raise at_line(file, line.number, text, span=quote_span(line.text))
    cells = [cell for cell in split_cells(line.text, block.separator) if cell]
    if len(cells) < 2 or Quantity.FREQUENCY not in {meaning_of(cell).quantity for cell in cells}:
        return
    remedy = "give each column one name"
    if block.separator is Separator.COMMA and block.width == 2 * len(cells):
        remedy = "the comma seems to be decimal mark as well as separator: export with semicolons or decimal points"
    raise at_line(file, line.number, f"{len(cells)} names for the {block.width} columns below; {remedy}")


def _commented_header(comments: Sequence[Line], block: Block) -> tuple[_Cells | None, _Cells | None]:
    """Header among the comment lines: the last one that names a frequency column and one more."""
    units: _Cells | None = None
    for line in reversed(comments):
        cells = _cells_of(uncommented(line.text), block)
        if cells is None:
            continue
        found = {meaning.quantity for meaning in map(meaning_of, cells)} - {None}
        if units is None and _is_units_row(cells):
            units = (line.number, cells)
        elif Quantity.FREQUENCY in found and len(found) > 1:
            adjoining = units is not None and units[0] == line.number + 1
            return (line.number, cells), units if adjoining else None
    return units, None  # a lone line of units ("# Hz, dB, deg") names the columns as well as any header


def _is_header(cells: Sequence[str]) -> bool:
    return any(cells) and not any(is_number_like(cell) for cell in cells)


def _is_units_row(cells: Sequence[str]) -> bool:
    known = [unit_of(cell) for cell in cells]
    return any(known) and all(
        unit is not None or cell.strip().lower() in _NO_UNIT or doubt_of(cell)
        for unit, cell in zip(known, cells, strict=True)
    )


def _cells_of(text: str, block: Block) -> tuple[str, ...] | None:
    """The cells of a header line, as many as there are columns; None where no way of splitting gives that many."""
    if text.count('"') % 2:
        return None
    for separator in (block.separator, *(other for other in Separator if other is not block.separator)):
        candidates = [split_cells(text, separator)]
        if separator is Separator.SPACE:
            candidates = [_spaced(text, r"\t|\s{2,}"), _spaced(text, r"\s+(?![^(\[]*[)\]])"), *candidates]
        for cells in candidates:
            if len(cells) == block.width:
                return cells
            if block.trailing and len(cells) == block.width + 1:
                return cells[:-1]
    return None


def _spaced(text: str, gap: str) -> tuple[str, ...]:
    """Cells apart by a kind of gap, a unit in brackets kept with the name before it."""
    cells: list[str] = []
    for part in re.split(gap, text.strip()):
        if cells and re.fullmatch(r"[(\[].*[)\]]", part):
            cells[-1] = f"{cells[-1]} {part}"
        else:
            cells.append(part.strip('"'))
    return tuple(cells)


def _with_units(file: str, meanings: Sequence[Meaning], units: _Cells) -> tuple[Meaning, ...]:
    merged = []
    for column, (meaning, cell) in enumerate(zip(meanings, units[1], strict=True), start=1):
        unit: Unit | None = unit_of(cell)
        if unit is None:
            merged.append(replace(meaning, doubt=doubt_of(cell) or meaning.doubt))
            continue
        if meaning.unit is not None and meaning.unit is not unit:
            text = (
                f"unit {show(cell)} contradicts {meaning.unit} in the header {show(meaning.text)}; correct one of them"
            )
            raise at_line(file, units[0], text, where=f"column {column}")
        merged.append(replace(meaning.with_unit(unit), text=meaning.text))
    return tuple(merged)
