"""A fault on one line of a file: the error, and the line as it may be shown, with a mark under the fault."""

from __future__ import annotations

import unicodedata
from collections.abc import Sequence

from fitamp.errors import SweepError

__all__ = ["LineError", "Span", "at_cell", "at_line", "attach_excerpt", "excerpt", "quote_span", "span_of"]

# Start and end of a part of a line, in characters from 0.
Span = tuple[int, int]

# Columns of a terminal that an excerpt takes at most, line number and bar not counted.
_WIDTH = 90
_MORE = "…"


class LineError(SweepError):
    """A file that is refused for what stands on one of its lines; `at_line` makes one.

    line : counted from 1
    span : the part of the line that is at fault; None for all of it
    cell : the text at fault, where only that is known
    """

    line: int = 0
    span: Span | None = None
    cell: str = ""


def at_line(file: str, line: int, text: str, *, where: str = "", span: Span | None = None) -> LineError:
    """The error for a fault on a line.

    Parameters
    ----------
    where
        Which part of the line, in words, as in "column 2 ('re')".
    """
    error = LineError(f"{file}, line {line}{', ' if where else ''}{where}: {text}")
    error.line, error.span = line, span
    return error


def at_cell(file: str, line: int, cell: str, text: str, *, quoted: bool = True) -> LineError:
    """The error for a cell or character, wherever it stands on its line; the message begins with it where `quoted`."""
    error = at_line(file, line, f"{cell!r} {text}" if quoted else text)
    error.cell = cell
    return error


def span_of(text: str, cells: Sequence[str], index: int) -> Span | None:
    """Where one of the cells of a line stands in it; None where it cannot be told (quotes within quotes)."""
    start, end = 0, -1
    for cell in cells[: index + 1]:
        start = text.find(cell, end + 1)  # one further for the separator
        if start < 0:
            return None
        end = start + len(cell)
    return start, max(end, start + 1)


def quote_span(text: str) -> Span:
    """Where the last quote of a line stands."""
    start = max(text.rfind('"'), 0)
    return (start, start + 1)


def attach_excerpt(error: LineError, text: str) -> None:
    """Give an error the line that it is about, as `excerpt` shows it."""
    span, start = error.span, text.find(error.cell) if error.cell else -1
    if span is None and start >= 0:
        span = (start, start + len(error.cell))
    error.excerpt = excerpt(error.line, text, span)


def excerpt(number: int, text: str, span: Span | None) -> tuple[str, str]:
    """A line with its number, and the marks under it; control characters as escapes, long lines cut round the fault."""
    start, end = span if span is not None else (len(text) - len(text.lstrip()), len(text.rstrip()))
    fault = _cut(_escaped(text[start : min(end, start + _WIDTH)]), _WIDTH // 2)
    room = _WIDTH - _width(fault)
    # Enough of what is before for orientation; escapes are cut from their front end, which does not matter here.
    before = _cut(_escaped(text[max(start - room, 0) : start])[::-1], room // 2)[::-1]
    after = _cut(_escaped(text[end : end + room]), room - _width(before))
    label = f"{number:>5} | "
    marks = "^" * max(_width(fault), 1)
    return f"{label}{before}{fault}{after}".rstrip(), f"{' ' * (len(label) - 2)}| {' ' * _width(before)}{marks}"


def _escaped(text: str) -> str:
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def _width(text: str) -> int:
    """Columns of a terminal: wide characters take two, those that combine none."""
    return sum(0 if unicodedata.combining(c) else 1 + (unicodedata.east_asian_width(c) in {"W", "F"}) for c in text)


def _cut(text: str, width: int) -> str:
    """The start of a text that is too wide, with a sign that there is more."""
    if _width(text) <= width:
        return text
    end = 0
    while _width(text[: end + 1]) < width:
        end += 1
    return text[:end] + _MORE
