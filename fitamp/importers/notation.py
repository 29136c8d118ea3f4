"""How the numbers of a file are written: decimal mark, and the mark between groups of thousands.

A file is taken to write all its numbers one way. Where only one way reads all of them, that is the one; where two
ways give different numbers, the file is refused, never guessed.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from fitamp.importers.cells import GROUP_MARKS, grouped, is_complex_like, is_number_like
from fitamp.importers.fault import LineError, at_cell
from fitamp.sweep import Decision

__all__ = ["Notation", "find_notation", "may_tell"]

_COMMA_PAIR = re.compile(r"\([^;ij]*,[^;ij]*\)")
_GROUP_CHARACTERS = "".join(GROUP_MARKS.values())
_MARKED = re.compile(rf"[.,{_GROUP_CHARACTERS}]")
_GROUPED = re.compile(rf"[{_GROUP_CHARACTERS}]")
_TELLING = re.compile(rf"[,{_GROUP_CHARACTERS}]|\.[^.\n]*\.")
_TWO_GROUPS = re.compile(r"[^.]*\.[^.]*\..*")
_WORDS = {",": "comma", ".": "point", "'": "apostrophe", " ": "space"}
_MARKS = ("", ",", ".", *GROUP_MARKS)


@dataclass(frozen=True, slots=True, kw_only=True)
class Notation:
    """Decimal mark, "." or ",", and the mark between groups of thousands, "" for none."""

    decimal: str = "."
    thousands: str = ""


_WAYS = tuple(Notation(decimal=d, thousands=t) for t in _MARKS for d in ".," if d != t)


def may_tell(text: str) -> bool:
    """Whether a column, its cells apart by line ends, has anything beside single points to tell how it is written."""
    return bool(_TELLING.search(text))


def find_notation(file: str, cells: Sequence[tuple[int, str]]) -> tuple[Notation, tuple[Decision, ...]]:
    """How the cells are written, and why.

    Parameters
    ----------
    cells
        Line number and text of every cell that should be a number; others among them are passed over.

    Raises
    ------
    SweepError
        When commas may be decimal marks as well as thousands separators, or no one way reads all the numbers.
    """
    marked = [(line, text.strip()) for line, text in cells if _MARKED.search(text) and is_number_like(text)]
    commas = [(line, text) for line, text in marked if "," in text and not _COMMA_PAIR.fullmatch(text)]
    plain = [(line, text) for line, text in marked if not is_complex_like(text)]
    if not commas and not any(_TWO_GROUPS.fullmatch(text) or _in_groups(text) for _, text in plain):
        return Notation(), (_decimal_decision(".", "no number has a decimal comma"),)
    ways = [way for way in _WAYS if _reads(way, marked)]
    if len(ways) != 1:
        raise _refusal(file, marked, commas or plain, ambiguous=len(ways) > 1)
    (way,) = ways
    return way, _decisions(way, marked, commas)


def _in_groups(text: str) -> bool:
    return bool(_GROUPED.search(text)) and any(grouped(d, mark).fullmatch(text) for mark in GROUP_MARKS for d in ".,")


def _reads(way: Notation, marked: Sequence[tuple[int, str]]) -> bool:
    """Whether a way reads all cells, and each of its marks is in use."""
    seen_groups = seen_decimal = False
    for _, text in marked:
        if is_complex_like(text):
            pair = bool(_COMMA_PAIR.fullmatch(text))
            if ("." in text and way.decimal == ",") or ("," in text and not pair and way.decimal == "."):
                return False
            if text.count(",") > 2:
                return False
            seen_decimal |= way.decimal in text
            continue
        in_groups = bool(way.thousands and grouped(way.decimal, way.thousands).fullmatch(text))
        if not in_groups and not _ungrouped(text, way.decimal):
            return False
        seen_groups |= in_groups
        seen_decimal |= way.decimal in text
    if way.thousands and not seen_groups:
        return False
    # A decimal comma that no number has is no comma; a point between groups leaves it as the only decimal mark.
    return way.decimal == "." or seen_decimal or way.thousands == "."


def _ungrouped(text: str, decimal: str) -> bool:
    other = "," if decimal == "." else "."
    return text.count(decimal) <= 1 and other not in text and not _in_groups(text)


def _decimal_decision(decimal: str, reason: str) -> Decision:
    return Decision(topic="decimal mark", choice=_WORDS[decimal], reason=reason)


def _decisions(
    way: Notation, marked: Sequence[tuple[int, str]], commas: Sequence[tuple[int, str]]
) -> tuple[Decision, ...]:
    if not way.thousands:
        line, text = commas[0]
        return (
            _decimal_decision(way.decimal, f"numbers such as {text!r} on line {line} have one comma each and no point"),
        )
    line, text = next(
        (line, text)
        for line, text in marked
        if not is_complex_like(text) and grouped(way.decimal, way.thousands).fullmatch(text)
    )
    reason = f"no other way of writing reads all numbers, such as {text!r} on line {line}"
    thousands = Decision(topic="thousands separator", choice=_WORDS[way.thousands], reason=reason)
    return (_decimal_decision(way.decimal, reason), thousands)


def _refusal(
    file: str, marked: Sequence[tuple[int, str]], suspects: Sequence[tuple[int, str]], *, ambiguous: bool
) -> LineError:
    line, text = suspects[0]
    if ambiguous:
        return at_cell(
            file,
            line,
            text,
            "may have a decimal comma or a thousands separator; export with a decimal point and without thousands "
            "separators",
        )
    for at, cell in suspects:
        if cell.count(",") > 1 + is_complex_like(cell) or ("." in cell and "," in cell) or _in_groups(cell):
            return at_cell(file, at, cell, "has thousands separators; export the numbers without them")
    if "," in text and any("." in cell for _, cell in marked):
        return at_cell(
            file,
            line,
            text,
            "has a comma where other cells have a decimal point; export with one decimal mark and without thousands "
            "separators",
        )
    at, cell = next(((at, cell) for at, cell in suspects if _TWO_GROUPS.fullmatch(cell)), (line, text))
    return at_cell(file, at, cell, "is not a number; measure the point again or remove the row")
