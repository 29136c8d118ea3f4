"""How a text table is laid out: separator, comments, and where its rows of numbers are.

Everything here is told from the rows of numbers themselves, because headers and preambles follow no rule.
"""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from enum import Enum

from fitamp.errors import SweepError
from fitamp.importers.cells import is_number_like
from fitamp.importers.text import Line

__all__ = ["Block", "Separator", "find_block", "is_comment", "is_rule", "split_cells", "uncommented"]

# A drawn line under a header.
_RULE = re.compile(r"[\s|+]*(?:[-=_*#]{3,}[\s|+]*)+")
_COMMENT = re.compile(r"\s*(?:#|!|%|//)+")
# A pair in parentheses is one cell also where its comma is the separator.
_BARE_PAIR = re.compile(r"(^|[,;\s])\s*(\([^()\"]*[,;][^()\"]*\))")
# A no-break space stands inside a number, not between two.
_SPACED = re.compile(r"[^ \t\v\f]+")
_SPACED_OR_QUOTED = re.compile(r'"[^"]*"|[^ \t\v\f"]+')
# Separator and first row are told from this many lines, of so many characters; no preamble is longer.
_SAMPLE = 5000
_SAMPLE_LENGTH = 500_000


class Separator(Enum):
    """What stands between two cells, in the order in which a tie is settled."""

    TAB = "\t"
    SEMICOLON = ";"
    COMMA = ","
    SPACE = " "

    @property
    def label(self) -> str:
        """The separator in words."""
        return "runs of spaces" if self is Separator.SPACE else self.name.lower()


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """The rows of numbers of a text table.

    separator : how their cells are apart
    rows : the lines, blank and comment lines left aside, a separator at the end of every row taken off
    width : how many cells most of them have
    above : the lines before them
    comments : how many comment lines stand between them
    trailing : whether every row ended with a separator
    """

    separator: Separator
    rows: tuple[Line, ...]
    width: int
    above: tuple[Line, ...]
    comments: int
    trailing: bool


def is_rule(text: str) -> bool:
    """Whether a line is one that is drawn, under a header or round a title."""
    return bool(_RULE.fullmatch(uncommented(text) if is_comment(text) else text))


def is_comment(text: str) -> bool:
    """Whether a line is a comment: it starts with #, !, % or //."""
    return bool(_COMMENT.match(text))


def uncommented(text: str) -> str:
    """The text of a comment line without its mark."""
    return _COMMENT.sub("", text, count=1).strip()


def _protected(text: str, separator: Separator) -> str:
    """The line as a reader of quoted cells takes it: without outer blanks, bare ``(1.2,3.4)`` in quotes."""
    if separator is Separator.TAB:
        return text.strip(" ")
    return _BARE_PAIR.sub(r'\1"\2"', text.strip())


def split_cells(text: str, separator: Separator) -> tuple[str, ...]:
    """Split one line into stripped cells; quotes keep a separator inside a cell.

    Raises
    ------
    ValueError
        When a quote is not closed on the line.
    """
    if text.count('"') % 2:
        raise ValueError("a quote is not closed on this line; close it or remove it")
    if not ('"' in text or "(" in text):  # nothing to protect: most rows of most files
        cells = _SPACED.findall(text) if separator is Separator.SPACE else text.strip(" ").split(separator.value)
        return tuple(map(str.strip, cells))
    guarded = _protected(text, separator)
    if separator is Separator.SPACE:
        return tuple(cell.strip('"').strip() for cell in _SPACED_OR_QUOTED.findall(guarded))
    row = next(csv.reader([guarded], delimiter=separator.value, skipinitialspace=True), [])
    return tuple(cell.strip() for cell in row)


def find_block(file: str, lines: Sequence[Line]) -> Block:
    """Find separator and rows of numbers: all lines from the first row of numbers to the end of the file.

    Raises
    ------
    SweepError
        When there are no rows of numbers.
    """
    used = [line for line in lines if line.text.strip() and not is_comment(line.text)]
    sample = _sample(used)
    separator = _find_separator(file, sample)
    start = _find_start(sample, separator)
    trailing = _all_end_with(used[start:], separator)
    rows = tuple(
        Line(number=line.number, text=line.text.rstrip(" ")[:-1] if trailing else line.text) for line in used[start:]
    )
    first = rows[0].number
    return Block(
        separator=separator,
        rows=rows,
        width=_usual_width(_sample(rows), separator),
        above=tuple(line for line in lines if line.number < first),
        comments=sum(is_comment(line.text) for line in lines if line.number > first),
        trailing=trailing,
    )


def _sample(lines: Sequence[Line]) -> Sequence[Line]:
    """The first lines, as many as layout is told from."""
    length = 0
    for index, line in enumerate(lines[:_SAMPLE]):
        length += len(line.text)
        if length > _SAMPLE_LENGTH:
            return lines[: max(index, 1)]
    return lines[:_SAMPLE]


def _find_separator(file: str, lines: Sequence[Line]) -> Separator:
    """The separator under which the most cells of rows are numbers."""
    scores = {separator: _score(lines, separator) for separator in Separator}
    best = max(scores, key=lambda separator: scores[separator])  # the first of equals
    if scores[best] == 0:
        raise SweepError(
            f"{file}: no row with two or more numbers found; expected columns of numbers for frequency and loop gain, "
            "apart by comma, semicolon, tab or spaces"
        )
    return best


def _score(lines: Sequence[Line], separator: Separator) -> float:
    total = 0.0
    for line in lines:
        cells = _lenient_cells(line, separator)
        numbers = _count_numbers(cells)
        if numbers >= 2:
            total += numbers / max(len(cells), 1)
    return total


def _find_start(lines: Sequence[Line], separator: Separator) -> int:
    """Index of the first row of numbers."""
    rows = [_lenient_cells(line, separator) for line in lines]
    like = [_count_numbers(row) >= 2 for row in rows]
    width = Counter(len(row) for row, is_row in zip(rows, like, strict=True) if is_row).most_common(1)[0][0]
    fits = [is_row and len(row) == width for row, is_row in zip(rows, like, strict=True)]
    start = next((i for i, fit in enumerate(fits) if fit and all(fits[i : i + 2])), fits.index(True))
    while start > 0 and len(rows[start - 1]) == width and _is_faulty_row(lines, rows, start - 1):
        start -= 1
    return start


def _is_faulty_row(lines: Sequence[Line], rows: Sequence[Sequence[str]], index: int) -> bool:
    """Whether the line above the first good row is a row with words where numbers should be, and not a preamble."""
    adjoining = lines[index].number == lines[index + 1].number - 1
    return is_number_like(rows[index][0]) or (adjoining and _count_numbers(rows[index]) > 0)


def _lenient_cells(line: Line, separator: Separator) -> tuple[str, ...]:
    try:
        return split_cells(line.text, separator)
    except ValueError:
        return ()


def _count_numbers(cells: Iterable[str]) -> int:
    return sum(is_number_like(cell) for cell in cells)


def _all_end_with(rows: Sequence[Line], separator: Separator) -> bool:
    if separator is Separator.SPACE:
        return False
    return all(row.text.rstrip(" ").endswith(separator.value) for row in rows)


def _usual_width(rows: Sequence[Line], separator: Separator) -> int:
    widths = Counter(len(_lenient_cells(row, separator)) for row in rows)
    del widths[0]  # an open quote
    return widths.most_common(1)[0][0]
