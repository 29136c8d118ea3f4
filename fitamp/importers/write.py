"""Sweeps to fitamp's own plain CSV, which `read_sweep` reads back to the last bit, and with its sign."""

from __future__ import annotations

import os
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from fitamp.errors import UsageError
from fitamp.sweep import Sign, Sweep

__all__ = ["sweep_csv", "with_own_sign", "write_sweep"]

_MARK = "fitamp sweep"
_SETTLED = "loop gain T in V/V"


def write_sweep(sweep: Sweep, path: str | os.PathLike[str], *, overwrite: bool = False) -> None:
    """Write a sweep as CSV: comment lines, header ``freq_hz,real,imag``, one row per point.

    Numbers have the digits that give the same double back. The rows hold T, whatever the sign of the file it
    came from. Points left out are not written. UTF-8, lines end with LF.

    Raises
    ------
    UsageError
        When the file exists and `overwrite` is not set, or cannot be written.
    """
    content = sweep_csv(sweep)
    target = Path(path)
    try:
        with target.open("w" if overwrite else "x", encoding="utf-8", newline="\n") as stream:
            stream.write(content)
    except FileExistsError:
        raise UsageError(f"{target}: the file exists; choose another name or allow overwriting") from None
    except OSError as error:
        raise UsageError(f"{target}: cannot be written ({error.strerror}); choose another place") from error


def sweep_csv(sweep: Sweep, comments: Iterable[str] = ()) -> str:
    """The content of such a file; `comments` become comment lines of their own below the first ones."""
    rows = (f"{f!r},{t.real!r},{t.imag!r}" for f, t in zip(sweep.freq_hz.tolist(), sweep.gain.tolist(), strict=True))
    more = (f"# {_one_line(comment)}" for comment in comments)
    return "\n".join([*_preamble(sweep), *more, "freq_hz,real,imag", *rows, ""])


def _one_line(text: str) -> str:
    """Blanks and control characters of any kind as single blanks, so that a comment stays one."""
    return " ".join("".join(c if c.isprintable() else " " for c in text).split())


def with_own_sign(sweep: Sweep) -> Sweep:
    """A sweep as read, its sign settled where the file was written here with T in it."""
    notes = sweep.origin.notes[: len(_preamble(sweep))]
    if notes[:1] != (_MARK,) or not any(note.startswith(f"{_SETTLED}, ") for note in notes):
        return sweep
    return replace(sweep, sign=Sign.AS_READ).with_decision("sign", "as read", "the comments say that it is T")


def _preamble(sweep: Sweep) -> list[str]:
    source = _one_line(sweep.origin.file)
    state = {
        Sign.AS_READ: f"{_SETTLED}, its sign as read",
        Sign.INVERTED: f"{_SETTLED}, the source held -T",
        Sign.UNKNOWN: "loop gain in V/V, its sign not looked at",
    }
    return [f"# {_MARK}", f"# source: {source}", f"# {state[sweep.sign]}"]
