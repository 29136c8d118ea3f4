"""Bad points of a sweep: single glitches and mains lines, seen in the residuals of a fit.

A point is bad where it stands apart from its neighbours, not where it is far from the model: a model that is wrong but
smooth makes no point bad. What is wider than a few points is structure, a resonance say, and stays.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import LeftOut, Sweep

__all__ = ["MOST_SHARE", "Spur", "find_spurs", "without_spurs"]

# Beyond this share of a sweep it is not single points that are bad.
MOST_SHARE = 0.1
# Neighbours on each side that a point is held against.
SIDE = 3
# Variance of a standard normal value less the median of six or of three others, or less 5/3 of the median of the next
# three and −2/3 of that of the three behind: the line through both, continued to an end of the sweep.
LESS_SIX, LESS_THREE = 1.215, 1.449
LESS_LINE = 1 + (25 + 4) / 9 * 0.449
# Apart from either side by this share of what is asked for both together: no point is bad for standing at a step.
SIDE_SHARE = 1 / 3
# Half the neighbours, on each side, over which the local scatter of the deviations is taken.
SCATTER_SIDE = 6
# Below this, the ends have too few neighbours.
MIN_POINTS = SCATTER_SIDE + 3 * SIDE + 1
# False alarms in a clean sweep: over all points, and over those at mains lines, of which less is asked.
CHANCE, CHANCE_MAINS = 0.02, 0.015
# The noise levels come from the sweep itself, each from about this share of its points.
SHARE_PER_LEVEL = 0.15
# Neighbours of a bad point belong to it from here on, in the same measure: once in 50 by chance.
SHOULDER = 4.0
# and from this share of its squared deviation on: next to the peak of a resonance its flank is higher than that.
FLANK = 1e-4
LONGEST_RUN = 3
# At an end of the sweep, where a bend lifts all of the last three points.
LONGEST_RUN_AT_END = 2
MAINS_HZ = (50.0, 60.0)
# Harmonics that a bench picks up; even ones are weak, and higher ones lie closer than a sweep resolves.
HARMONICS = (1, 2, 3, 5, 7)
# A line can be told from its neighbours, and a run of points belongs to it, within this distance (receiver bandwidth).
LINE_WIDTH_HZ = 10.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Spur:
    """A bad point: its index in the sweep, and why it is left out."""

    index: int
    reason: str


def without_spurs(sweep: Sweep, residuals: ComplexArray) -> Sweep:
    """The sweep without the points that `find_spurs` finds, each with its reason; the same object if there are none."""
    spurs = find_spurs(sweep.freq_hz, residuals)
    if not spurs:
        return sweep
    out = tuple(
        LeftOut(f_hz=float(sweep.freq_hz[s.index]), gain=complex(sweep.gain[s.index]), reason=s.reason) for s in spurs
    )
    keep = np.ones(len(sweep), dtype=bool)
    keep[[spur.index for spur in spurs]] = False
    return replace(sweep, freq_hz=sweep.freq_hz[keep], gain=sweep.gain[keep], left_out=sweep.left_out + out)


def find_spurs(freq_hz: FloatArray, residuals: ComplexArray) -> tuple[Spur, ...]:
    """Points that stand apart from their neighbours by more than noise does.

    Parameters
    ----------
    freq_hz : shape (n,)
    residuals : shape (n,)
        Of a fit, complex, in standard deviations per component.

    Notes
    -----
    For Gaussian noise half the squared deviation, over its variance, is exponential. As the variance was estimated from
    few points its tail is that of a ratio, (1 + t/ν)^(−ν), and t is chosen so that all points together exceed it in
    `CHANCE` of clean sweeps.
    """
    count = len(residuals)
    if count < MIN_POINTS:
        return ()
    deviation, apart = _deviations(residuals)
    degrees = max(SHARE_PER_LEVEL * count, 3.0)
    lines = _mains_lines(freq_hz)
    threshold = np.full(count, _threshold(count, CHANCE, degrees))
    threshold[list(lines)] = _threshold(max(len(lines), 1), CHANCE_MAINS, degrees)
    bad = apart > threshold
    spurs = []
    square = np.abs(deviation) ** 2
    peak = sliding_window_view(np.pad(square, SIDE, mode="edge"), 2 * SIDE + 1).max(axis=1)
    for run in _runs(bad, (apart > SHOULDER) & (square > FLANK * peak)):
        line = _line_of_all(freq_hz[run])
        at_end = run[0] < SIDE or run[-1] >= count - SIDE
        if len(run) > (LONGEST_RUN_AT_END if at_end else LONGEST_RUN) and line is None:
            continue
        for index in run[bad[run]]:
            size = f"{abs(deviation[index]):.0f} σ off"
            own = line or lines.get(int(index))
            reason = f"{size} its neighbours" if own is None else f"mains line: {_line_name(*own)}, {size}"
            spurs.append(Spur(index=int(index), reason=reason))
    return tuple(spurs)


def _threshold(count: int, chance: float, degrees: float) -> float:
    return degrees * math.expm1(math.log(count / chance) / degrees)


def _deviations(residuals: ComplexArray) -> tuple[ComplexArray, FloatArray]:
    """Each point less what its neighbours say, and half its square over its variance.

    Where the deviations around are all large, as on a resonance, they are the measure instead of the noise.
    """
    windows = sliding_window_view(residuals, 2 * SIDE + 1)
    centre, left, right = windows[:, SIDE], windows[:, :SIDE], windows[:, SIDE + 1 :]
    deviation = np.empty_like(residuals)
    apart = np.empty(len(residuals))
    deviation[SIDE:-SIDE] = centre - _median(np.concatenate([left, right], axis=1))
    apart[SIDE:-SIDE] = np.abs(deviation[SIDE:-SIDE]) ** 2 / 2 / LESS_SIX
    for side in (left, right):
        from_side = np.abs(centre - _median(side)) ** 2 / 2 / LESS_THREE / SIDE_SHARE
        apart[SIDE:-SIDE] = np.minimum(apart[SIDE:-SIDE], from_side)
    # At the ends there is one side only: a slope must not count, nor a bend, which lifts the points further in as well.
    reach = SIDE + SCATTER_SIDE
    for end, forward in ((slice(0, SIDE), residuals), (slice(-1, -SIDE - 1, -1), residuals[::-1])):
        next_three, further = (
            _median(sliding_window_view(forward[first : first + reach + SIDE - 1], SIDE)) for first in (1, 1 + SIDE)
        )
        from_line = forward[:reach] - (5 * next_three - 2 * further) / 3
        size = np.abs(from_line) ** 2 / 2 / LESS_LINE
        deviation[end] = from_line[:SIDE]
        apart[end] = size[:SIDE] / max(float(np.median(size[SIDE:])) / math.log(2), 1.0)
    around = sliding_window_view(np.pad(apart, SCATTER_SIDE, mode="reflect"), 2 * SCATTER_SIDE + 1)
    scatter = np.median(np.delete(around, SCATTER_SIDE, axis=1), axis=1) / math.log(2)
    return deviation, apart / np.maximum(scatter, 1.0)


def _median(rows: ComplexArray) -> ComplexArray:
    return np.asarray(np.median(rows.real, axis=1) + 1j * np.median(rows.imag, axis=1))


def _runs(bad: np.ndarray, raised: np.ndarray) -> list[np.ndarray]:
    """Index runs around bad points, with raised ones beside them; one quiet point does not end a run."""
    members = np.flatnonzero(bad | raised)
    runs = np.split(members, np.flatnonzero(np.diff(members) > 2) + 1)
    return [run for run in runs if bad[run].any()]


def _mains_lines(freq_hz: FloatArray) -> dict[int, tuple[int, float]]:
    """Indices of points nearest to a mains line, with (harmonic, mains frequency); only where the sweep resolves it."""
    lines: dict[int, tuple[int, float]] = {}
    steps = np.gradient(freq_hz)
    for harmonic in HARMONICS:
        for mains_hz in MAINS_HZ:
            index = int(np.argmin(np.abs(freq_hz - harmonic * mains_hz)))
            off_hz = abs(freq_hz[index] - harmonic * mains_hz)
            if off_hz <= min(steps[index] / 2, LINE_WIDTH_HZ) and steps[index] <= mains_hz / 2:
                lines.setdefault(index, (harmonic, mains_hz))
    return lines


def _line_of_all(freq_hz: FloatArray) -> tuple[int, float] | None:
    """(harmonic, mains frequency) of the line that all these frequencies are within the receiver's width of."""
    for harmonic in HARMONICS:
        for mains_hz in MAINS_HZ:
            if np.abs(freq_hz - harmonic * mains_hz).max() <= LINE_WIDTH_HZ / 2:
                return harmonic, mains_hz
    return None


def _line_name(harmonic: int, mains_hz: float) -> str:
    if harmonic == 1:
        return f"{mains_hz:.0f} Hz"
    ordinal = {2: "nd", 3: "rd"}.get(harmonic, "th")
    return f"{harmonic}{ordinal} harmonic of {mains_hz:.0f} Hz"
