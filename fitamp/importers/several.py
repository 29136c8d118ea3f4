"""Several sweeps in one table: told by a column that numbers them, or by the frequency that starts anew."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import FloatArray
from fitamp.importers.cells import show

__all__ = ["MAX_SWEEPS", "by_label", "by_restart"]

# Repeats cover the same band, within this part of it at either end.
_SAME_BAND = 0.01
_LEAST_POINTS = 3
# More are no sweeps of a bench, but something else that repeats.
MAX_SWEEPS = 1000

_Rows = NDArray[np.intp]


def by_label(labels: Sequence[str]) -> list[tuple[str, _Rows]]:
    """Rows of each sweep in the order of their first rows, with its label; empty where the labels number no sweeps."""
    rows: dict[str, list[int]] = {}
    for row, label in enumerate(labels):
        rows.setdefault(label, []).append(row)
    if not 2 <= len(rows) <= MAX_SWEEPS or min(map(len, rows.values())) < _LEAST_POINTS:
        return []
    return [(show(label), np.array(own, dtype=np.intp)) for label, own in rows.items()]


def by_restart(freq_hz: FloatArray) -> list[_Rows]:
    """Rows of each run of the same band, rising or falling; one run where the frequency does anything else."""
    whole = [np.arange(len(freq_hz))]
    step = np.sign(np.diff(freq_hz))
    if len(step) < 2 * _LEAST_POINTS - 1 or abs(step.sum()) == len(step):
        return whole
    starts = _starts(step)
    if len(starts) >= MAX_SWEEPS:
        return whole
    runs = np.split(whole[0], starts)
    ends = np.array([sorted((freq_hz[run[0]], freq_hz[run[-1]])) for run in runs])
    same = np.abs(ends - ends[0]) <= _SAME_BAND * np.abs(ends[0])
    if min(map(len, runs)) < _LEAST_POINTS or not same.all():
        return whole
    return runs


def _starts(step: FloatArray) -> list[int]:
    """First row of every run after the first; each run goes one way, without a repeated frequency."""
    starts = []
    way = 0.0
    for index, sign in enumerate(step.tolist(), start=1):
        if sign == 0 or (way and sign != way):
            starts.append(index)
            way = 0.0
        elif not way:
            way = sign
    return starts
