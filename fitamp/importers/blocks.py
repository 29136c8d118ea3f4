"""The tables of a text file: one, or several where headers stand again among the rows of numbers."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from fitamp.errors import SweepError
from fitamp.importers.cells import is_number_like, show
from fitamp.importers.dialect import Block, is_comment, split_cells
from fitamp.importers.fault import LineError, at_line, quote_span, span_of
from fitamp.importers.header import is_header_row
from fitamp.importers.readings import is_no_reading
from fitamp.importers.several import MAX_SWEEPS
from fitamp.importers.text import Line

__all__ = ["MAX_CELLS", "Table", "find_tables"]

# A row of numbers shows by its first character; anything else needs a closer look.
_STARTS_AS_NUMBER = re.compile(r"\s*[-+(]?[0-9.]")
# What instruments write under a table.
_CLOSING = re.compile(r"(?:end|ende|fin|eof)\b[^0-9]*", re.IGNORECASE)

# More are no sweep of a bench.
MAX_CELLS = 10_000_000

_Row = tuple[Line, tuple[str, ...]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """One table: its rows of numbers as a block, and their cells, each row as many.

    closing : lines under the last row that only say that the table ends
    """

    block: Block
    cells: tuple[tuple[str, ...], ...]
    closing: tuple[Line, ...] = ()

    def fault(self, file: str, row: int, text: str, *, index: int | None = None, label: str = "") -> LineError:
        """The error for a fault in a row, or in one of its cells under its column's label."""
        line = self.rows[row]
        span = None if index is None else span_of(line.text, self.cells[row], index)
        return at_line(file, line.number, text, where=label, span=span)

    def texts(self, index: int) -> list[str]:
        """The cells of one column."""
        return [row[index] for row in self.cells]

    @property
    def rows(self) -> tuple[Line, ...]:
        """The lines of the table."""
        return self.block.rows


def find_tables(file: str, block: Block, lines: Sequence[Line]) -> tuple[Table, ...]:
    """Split the rows of a file where a header stands among them, and check that rows have the same number of cells.

    Parameters
    ----------
    lines
        All lines of the file; those between two tables go above the second.

    Raises
    ------
    SweepError
        For words among the rows that are no header, for a row with another number of cells, and for more rows or
        tables than a file may have.
    """
    if len(block.rows) * block.width > MAX_CELLS:
        raise SweepError(
            f"{file}: {len(block.rows)} rows of {block.width} columns are more than the {MAX_CELLS} cells that a table "
            "may have; export the columns of the sweep alone"
        )
    titles = {line.text.strip() for line in block.above}
    tables: list[list[_Row]] = [[]]
    words: list[_Row] = []
    for row in _split(file, block):
        if _is_words(row, block.width):
            words.append(row)
            continue
        if words and any(_is_header(line, cells, block, titles) for line, cells in words) and tables[-1]:
            tables.append([])
            if len(tables) > MAX_SWEEPS:
                raise SweepError(f"{file}: more than the {MAX_SWEEPS} sweeps that a file may hold; split it")
        elif words:
            tables[-1] += _as_rows(file, words, block)
        words = []
        _refuse_other_width(file, row, block)
        tables[-1].append(row)
    closing = tuple(line for line, _ in words if _CLOSING.fullmatch(line.text.strip()))
    if len(closing) != len(words):
        tables[-1] += _as_rows(file, words, block)
        closing = ()
    *first, last = (
        _table(block, rows, lines, before) for before, rows in zip([None, *tables[:-1]], tables, strict=True)
    )
    return (*first, replace(last, closing=closing))


def _split(file: str, block: Block) -> Iterator[_Row]:
    for line in block.rows:
        try:
            yield line, split_cells(line.text, block.separator)
        except ValueError as error:
            raise at_line(file, line.number, str(error), span=quote_span(line.text)) from error


def _is_words(row: _Row, width: int) -> bool:
    """Whether a row has no number in it, and more than the word that there is none."""
    line, cells = row
    if len(cells) == width and _STARTS_AS_NUMBER.match(line.text):
        return False
    return not any(is_number_like(cell) for cell in cells) and not all(is_no_reading(cell) for cell in cells)


def _is_header(line: Line, cells: tuple[str, ...], block: Block, titles: set[str]) -> bool:
    width = len(cells) - (block.trailing and len(cells) == block.width + 1)
    return width == block.width and (line.text.strip() in titles or is_header_row(line, block))


def _as_rows(file: str, words: Sequence[_Row], block: Block) -> list[_Row]:
    """Rows of words that are no header: as wide as the table they are rows whose cells are at fault."""
    for line, cells in words:
        if len(cells) != block.width:
            raise at_line(
                file,
                line.number,
                f"{show(line.text.strip())} stands among the rows of numbers; remove the line, and keep one sweep per "
                "file",
            )
    return list(words)


def _refuse_other_width(file: str, row: _Row, block: Block) -> None:
    line, cells = row
    if len(cells) != block.width:
        raise at_line(
            file,
            line.number,
            f"{len(cells)} cell{'s' if len(cells) > 1 else ''} where other rows have {block.width} (separator: "
            f"{block.separator.label}); complete the row or remove it",
        )


def _table(block: Block, rows: Sequence[_Row], lines: Sequence[Line], before: Sequence[_Row] | None) -> Table:
    """One table with the lines above it: those of the file, or those since the table before."""
    first, last = rows[0][0].number, rows[-1][0].number
    above = block.above
    if before is not None:
        above = tuple(lines[before[-1][0].number : first - 1])  # lines count from 1
    comments = sum(is_comment(line.text) for line in lines[first:last])
    own = replace(block, rows=tuple(line for line, _ in rows), above=above, comments=comments)
    return Table(block=own, cells=tuple(cells for _, cells in rows))
