"""Two records of one sweep, point by point: the same frequencies, or a refusal; points that one of them lacks."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fitamp.errors import SweepError
from fitamp.sweep import LeftOut, Sweep
from fitamp.units import si

__all__ = ["SAME_FREQUENCY_RTOL", "paired"]

# Two files may round one frequency differently.
SAME_FREQUENCY_RTOL = 2e-6


def paired(first: Sweep, second: Sweep) -> tuple[Sweep, Sweep, tuple[LeftOut, ...]]:
    """Both records at the points that both have, and what was left out.

    A point may be missing from one of them only where that record left it out itself, as one without a reading.

    Raises
    ------
    SweepError
        When they are not on the same frequencies, or no point is left.
    """
    here, there = _matches(first, second), _matches(second, first)
    _refuse_strangers(first, second, here)
    _refuse_strangers(second, first, there)
    if not here.any():
        raise SweepError(f"{first.origin.file}: no point is also in {second.origin.file}; take both in one setting")
    left = {point.f_hz: point for point in (*second.left_out, *first.left_out)}
    for sweep, match, other in ((first, here, second), (second, there, first)):
        for f_hz in sweep.freq_hz[~match].tolist():
            left.setdefault(f_hz, LeftOut(f_hz=f_hz, gain=None, reason=f"left out of {other.origin.file}"))
    return _only(first, here), _only(second, there), tuple(left[f_hz] for f_hz in sorted(left))


def _matches(sweep: Sweep, other: Sweep) -> NDArray[np.bool_]:
    return _near(sweep, other.freq_hz)


def _near(sweep: Sweep, freq_hz: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Which frequencies of a sweep are among others, which rise."""
    if not len(freq_hz):
        return np.zeros(len(sweep), dtype=bool)
    above = np.searchsorted(freq_hz, sweep.freq_hz).clip(0, len(freq_hz) - 1)
    below = (above - 1).clip(0)
    gap = np.minimum(np.abs(freq_hz[above] - sweep.freq_hz), np.abs(freq_hz[below] - sweep.freq_hz))
    return np.asarray(gap <= SAME_FREQUENCY_RTOL * sweep.freq_hz)


def _refuse_strangers(sweep: Sweep, other: Sweep, match: NDArray[np.bool_]) -> None:
    known = _near(sweep, np.sort(np.array([point.f_hz for point in other.left_out])))
    strange = ~match & ~known
    if strange.any():
        index = int(np.argmax(strange))
        raise SweepError(
            f"{sweep.origin.file}, point {index + 1}: {si(float(sweep.freq_hz[index]), 'Hz', digits=7)} is not in "
            f"{other.origin.file}; both records must be on the same frequencies, take one of them again"
        )


def _only(sweep: Sweep, keep: NDArray[np.bool_]) -> Sweep:
    return sweep if keep.all() else sweep.without(keep, "")
