"""Touchstone files, versions 1.x and 2.x, to sweeps.

The file is checked line by line first (`touchstone_scan`); the checked lines are then read by scikit-rf's
Touchstone class. scikit-rf's Network is never given a file name, because it tries to unpickle the file first.
"""

from __future__ import annotations

import io
import re

import numpy as np

from fitamp.errors import SweepError, UsageError
from fitamp.importers.notes import notes_among
from fitamp.importers.points import Points, finish
from fitamp.importers.source import CALLED, Source
from fitamp.importers.text import Text, decode
from fitamp.importers.touchstone_file import Scan
from fitamp.importers.touchstone_scan import scan
from fitamp.sweep import Decision, Origin, Sweep

__all__ = ["read_touchstone"]

_TRACE = re.compile(r"[sS](?:([1-9])([1-9])|([1-9][0-9]*),([1-9][0-9]*)|\(([1-9][0-9]*),([1-9][0-9]*)\))")
# The numbers of larger ones would take a gigabyte.
MAX_TOUCHSTONE_BYTES = 50_000_000
_FORM_WORDS = {"ri": "real and imaginary", "ma": "linear magnitude and degrees", "db": "dB and degrees"}


def read_touchstone(source: Source, *, trace: str | None = None) -> Sweep:
    """Read one S-parameter of a Touchstone file as loop gain, its sign not yet looked at.

    Parameters
    ----------
    trace
        Such as ``"S21"`` (``"S10,2"`` from ten ports on). None: S11 of one port, S21 of two.

    Raises
    ------
    SweepError
        On the first fault of the file, with its line.
    UsageError
        When the trace is malformed or not in the file, or is needed and not given.
    """
    if len(source.data) > MAX_TOUCHSTONE_BYTES:
        raise SweepError(
            f"{source.file}: {len(source.data) / 1e6:.0f} MB is more than the {MAX_TOUCHSTONE_BYTES / 1e6:.0f} MB that "
            "a Touchstone file may have; export fewer ports or points"
        )
    text = decode(source)
    if text.encoding.startswith("UTF-16"):
        raise SweepError(f"{source.file}: the file is {text.encoding}; Touchstone is plain text, save it as UTF-8")
    suffix = re.fullmatch(r"\.s([0-9]{1,3})p", source.suffix)
    if suffix and int(suffix[1]) == 0:
        raise SweepError(f"{source.file}: the file name says 0 ports; name it .s1p or .s2p")
    ports = int(suffix[1]) if suffix else _ports_by_rows(source, text)
    found = scan(source.file, text.lines, ports)
    row, column, reason = _pick_trace(source.file, trace, found.ports)
    name = f"S{row}{column}" if found.ports < 10 else f"S{row},{column}"
    freq_hz, gain = _parse(found, row - 1, column - 1)
    decisions = [*text.decisions, *_decisions(found), Decision(topic="trace", choice=name, reason=reason)]
    notes = notes_among(line for line in text.lines[: found.row_lines[0]] if line.text.lstrip().startswith("!"))
    points = Points(lines=tuple(found.row_lines), freq_hz=freq_hz, gain=gain)
    origin = Origin(file=source.file, form="touchstone", trace=name, sha256=source.sha256, notes=notes)
    return finish(points, origin=origin, decisions=tuple(decisions), may_fall=False)


def _ports_by_rows(source: Source, text: Text) -> int | None:
    """Ports of a file that has no name: rows of one and of two ports stand on one line each, by the specification."""
    if source.file != CALLED:
        return None
    rows = (line.text.split("!", 1)[0].split() for line in text.lines)
    first = next((row for row in rows if row and row[0][0] not in "#["), [])
    return {3: 1, 9: 2}.get(len(first))


def _parse(found: Scan, row: int, column: int) -> tuple[np.ndarray, np.ndarray]:
    """Frequency in hertz and one S-parameter, shapes (n,), by scikit-rf."""
    from skrf.io.touchstone import Touchstone

    content = io.StringIO("\n".join(found.kept) + "\n")
    content.name = f"checked.s{found.ports}p"  # scikit-rf takes the number of ports from the name
    with np.errstate(over="ignore", invalid="ignore"):
        parsed = Touchstone(content)
    freq_hz, gain = np.asarray(parsed.f, dtype=float), np.asarray(parsed.s[:, row, column], dtype=complex)
    if len(freq_hz) != len(found.row_lines):
        raise SweepError(
            f"{found.file}: {len(found.row_lines)} frequencies in the file, {len(freq_hz)} after parsing; "
            "export the file in another number format (RI, MA, DB)"
        )
    fault = ~(np.isfinite(gain) & np.isfinite(freq_hz))
    if fault.any():
        line = found.row_lines[int(np.argmax(fault))]
        raise SweepError(
            f"{found.file}, line {line}: a level far beyond any loop gain; check the format in the option line"
        )
    return freq_hz, gain


def _pick_trace(file: str, trace: str | None, ports: int) -> tuple[int, int, str]:
    """Output port, input port, and why."""
    if trace is None:
        if ports > 2:
            raise UsageError(
                f"{file}: which of {ports}x{ports} S-parameters is the loop gain? give --trace, as in --trace S21"
            )
        return (
            (1, 1, "the only one of a one-port")
            if ports == 1
            else (2, 1, "forward transmission, the default of a two-port")
        )
    match = _TRACE.fullmatch(trace.strip())
    if match is None:
        raise UsageError(f"{file}: trace {trace!r} is not an S-parameter; expected one such as S21")
    row, column = (int(digits) for digits in match.groups() if digits)
    if max(row, column) > ports:
        has = "S11 only" if ports == 1 else f"S11 to S{ports}{ports}" if ports < 10 else f"S1,1 to S{ports},{ports}"
        raise UsageError(f"{file}: trace {trace} is not there; the file has {has}")
    return row, column, "as given by --trace"


def _decisions(found: Scan) -> list[Decision]:
    place = f"option line on line {found.option_line}"
    if found.defaults:
        place += f"; {', '.join(found.defaults)} by the specification's default"
    decisions = [
        Decision(
            topic="version",
            choice=f"Touchstone {found.version}",
            reason="as the file says" if found.version != "1.x" else "no [Version] line",
        ),
        Decision(topic="numbers", choice=f"frequency in {found.unit}, {_FORM_WORDS[found.form]}", reason=place),
    ]
    if found.order:
        decisions.append(Decision(topic="two-port order", choice=found.order, reason="[Two-Port Data Order]"))
    if found.matrix != "full":
        decisions.append(Decision(topic="matrix", choice=found.matrix, reason="[Matrix Format]; the rest by symmetry"))
    if found.noise_rows:
        reason = "noise parameters of a two-port are no part of a sweep"
        decisions.append(Decision(topic="noise data", choice=f"{found.noise_rows} rows left aside", reason=reason))
    return decisions
