"""Sweeps to fitamp's own plain CSV, which `read_sweep` reads back to the last bit."""

from __future__ import annotations

import os
from pathlib import Path

from fitamp.errors import UsageError
from fitamp.sweep import Sign, Sweep

__all__ = ["write_sweep"]


def write_sweep(sweep: Sweep, path: str | os.PathLike[str], *, overwrite: bool = False) -> None:
    """Write a sweep as CSV: comment lines, header ``freq_hz,real,imag``, one row per point.

    Numbers have the digits that give the same double back. The rows hold T, whatever the sign of the file it
    came from. Points left out are not written. UTF-8, lines end with LF.

    Raises
    ------
    UsageError
        When the file exists and `overwrite` is not set, or cannot be written.
    """
    rows = (f"{f!r},{t.real!r},{t.imag!r}" for f, t in zip(sweep.freq_hz.tolist(), sweep.gain.tolist(), strict=True))
    content = "\n".join([*_preamble(sweep), "freq_hz,real,imag", *rows, ""])
    target = Path(path)
    try:
        with target.open("w" if overwrite else "x", encoding="utf-8", newline="\n") as stream:
            stream.write(content)
    except FileExistsError:
        raise UsageError(f"{target}: the file exists; choose another name or allow overwriting") from None
    except OSError as error:
        raise UsageError(f"{target}: cannot be written ({error.strerror}); choose another place") from error


def _preamble(sweep: Sweep) -> list[str]:
    source = " ".join(sweep.origin.file.split())
    state = {
        Sign.AS_READ: "loop gain T in V/V, its sign as read",
        Sign.INVERTED: "loop gain T in V/V, the source held -T",
        Sign.UNKNOWN: "loop gain in V/V, its sign not looked at",
    }
    return ["# fitamp sweep", f"# source: {source}", f"# {state[sweep.sign]}"]
