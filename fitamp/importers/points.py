"""The points of a file to a checked sweep: order, duplicates, points at 0 Hz."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.errors import SweepError
from fitamp.importers.fault import at_line
from fitamp.sweep import Decision, LeftOut, Origin, Sweep

__all__ = ["Points", "finish"]

_AT_ZERO = "0 Hz has no place on a logarithmic frequency axis"


@dataclass(frozen=True, slots=True, kw_only=True)
class Points:
    """The points of a file in its order, each with the line it came from."""

    lines: Sequence[int]
    freq_hz: FloatArray
    gain: ComplexArray


def finish(
    points: Points,
    *,
    origin: Origin,
    decisions: tuple[Decision, ...],
    may_fall: bool,
    left_out: tuple[LeftOut, ...] = (),
) -> Sweep:
    """Build the sweep: falling order is turned round where `may_fall`, a point at 0 Hz is left out with a reason.

    Parameters
    ----------
    left_out
        Points that are not among `points` for another reason.

    Raises
    ------
    SweepError
        For a negative or repeated frequency, or frequencies in no order; the message has the line.
    """
    file, lines, freq_hz, gain = origin.file, points.lines, points.freq_hz, points.gain
    if len(freq_hz) and freq_hz.min() < 0:
        row = int(np.argmax(freq_hz < 0))
        text = f"frequency {freq_hz[row]:g} Hz is negative; remove the row or check the columns"
        raise at_line(file, lines[row], text)
    if may_fall and _mostly_falls(freq_hz):
        freq_hz, gain, lines = freq_hz[::-1], gain[::-1], lines[::-1]
        reason = f"the file starts at {freq_hz[-1]:g} Hz and falls to {freq_hz[0]:g} Hz"
        decisions = (*decisions, Decision(topic="order", choice="reversed", reason=reason))
    _refuse_disorder(file, lines, freq_hz)
    keep = freq_hz > 0
    if not keep.all():
        left_out = (*(LeftOut(f_hz=0.0, gain=complex(t), reason=_AT_ZERO) for t in gain[~keep]), *left_out)
        decisions = (*decisions, Decision(topic="point at 0 Hz", choice="left out", reason=_AT_ZERO))
        freq_hz, gain = freq_hz[keep], gain[keep]
    if not len(freq_hz):
        raise SweepError(f"{file}: no point above 0 Hz; a sweep needs at least one")
    return Sweep(freq_hz=freq_hz, gain=gain, origin=origin, decisions=decisions, left_out=left_out)


def _rises(freq_hz: FloatArray) -> bool:
    return bool((freq_hz[1:] > freq_hz[:-1]).all())


def _mostly_falls(freq_hz: FloatArray) -> bool:
    if _rises(freq_hz):
        return False
    step = np.diff(freq_hz)
    return bool((step < 0).sum() > (step > 0).sum())


def _refuse_disorder(file: str, lines: Sequence[int], freq_hz: FloatArray) -> None:
    if _rises(freq_hz):
        return
    same = np.unique(freq_hz, return_counts=True)
    repeated = same[0][same[1] > 1]
    if len(repeated):
        first, second, *_ = sorted(lines[row] for row in np.flatnonzero(freq_hz == repeated[0]).tolist())
        text = f"frequency {repeated[0]:g} Hz is there already on line {first}"
        raise at_line(file, second, f"{text}; keep one of the rows, or one sweep per file")
    falls = np.diff(freq_hz) < 0
    if falls.any():
        row = int(np.argmax(falls)) + 1
        text = (
            f"frequency must rise or fall throughout, but {freq_hz[row]:g} Hz stands next to {freq_hz[row - 1]:g} Hz "
            f"of line {lines[row - 1]}; sort the rows or export one sweep per file"
        )
        raise at_line(file, lines[row], text)
