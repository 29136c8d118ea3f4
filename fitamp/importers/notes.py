"""What a file says beside its numbers: the lines of its preamble that are no header."""

from __future__ import annotations

from collections.abc import Collection, Iterable

from fitamp.importers.dialect import is_comment, is_rule, uncommented
from fitamp.importers.text import Line

__all__ = ["notes_among"]

# More is no preamble of a person or an instrument.
_MOST_LINES = 100
_LONGEST = 200


def notes_among(lines: Iterable[Line], without: Collection[int] = ()) -> tuple[str, ...]:
    """The text of lines, marks of comments taken off; drawn lines, blank ones and those of a header left aside.

    Parameters
    ----------
    without
        Numbers of lines that are understood already.
    """
    notes: list[str] = []
    for line in lines:
        text = uncommented(line.text) if is_comment(line.text) else line.text.strip()
        if not text or line.number in without or is_rule(line.text):
            continue
        if len(notes) == _MOST_LINES:
            notes.append("…")
            break
        notes.append(text if len(text) <= _LONGEST else text[: _LONGEST - 1] + "…")
    return tuple(notes)
