"""Where along the band residuals are not what noise makes them: stretches of neighbours that hold most of a misfit."""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.units import si

__all__ = ["place_in_words", "stretches_of"]

# Each point must bring this share of what it would bring if all brought alike; less ends a stretch.
FAIR_SHARE = 0.8
# Stretches are named until together they hold so much of the misfit; one that holds little is not.
MOST_OF_IT, WORTH_NAMING = 0.7, 0.15
MOST_STRETCHES = 2
# Together they must hold this much of it, and this many times what as many points hold on average; else the misfit is
# spread over the band.
LEAST_HELD, DENSER = 0.5, 1.5
# Two with so small a share of the points from the first to the last of both are apart; more is one that waves.
APART = 0.25
# Stretches no wider than this factor are one place.
ONE_PLACE = 1.1


def stretches_of(misfit: FloatArray) -> tuple[tuple[int, int], ...]:
    """The fewest stretches that hold most of a misfit, as (first, last) index, rising; empty where it is spread evenly.

    Parameters
    ----------
    misfit : shape (n,)
        What each point adds to a statistic of the residuals, 0 on average for noise; its sum is above 0.

    Notes
    -----
    A stretch has the largest sum of misfit less `FAIR_SHARE` of its mean over the band (J. Bentley, Communications of
    the ACM 27, 1984, on the maximum-sum segment).
    """
    if len(misfit) == 0 or not misfit.sum() > 0:
        return ()
    found = _richest(misfit)
    if len(found) == 1:
        # Two places with nothing between them are one segment against the whole band, and two against each other.
        first, last = found[0]
        inner = [(first + start, first + end) for start, end in _richest(misfit[first : last + 1])]
        if len(inner) > 1 and _points(inner) < APART * _points(found) and _share(misfit, inner) > MOST_OF_IT:
            found = inner
    if _share(misfit, found) < max(LEAST_HELD, DENSER * _points(found) / len(misfit)):
        return ()
    return tuple(sorted(found))


def _share(misfit: FloatArray, stretches: list[tuple[int, int]]) -> float:
    return sum(float(misfit[first : last + 1].sum()) for first, last in stretches) / float(misfit.sum())


def _points(stretches: list[tuple[int, int]]) -> int:
    return sum(last - first + 1 for first, last in stretches)


def _richest(misfit: FloatArray) -> list[tuple[int, int]]:
    """Stretches with the largest surplus until they hold most, the richest first."""
    surplus = misfit - FAIR_SHARE * misfit.mean()
    found: list[tuple[int, int]] = []
    while len(found) < MOST_STRETCHES and _share(misfit, found) < MOST_OF_IT:
        stretch = _largest(surplus)
        if _share(misfit, [stretch]) < WORTH_NAMING:
            break
        found.append(stretch)
        surplus[stretch[0] : stretch[1] + 1] = -np.inf
    return found


def _largest(surplus: FloatArray) -> tuple[int, int]:
    """First and last index of the segment with the largest sum; of −inf none is taken in."""
    best, best_sum = (int(np.argmax(surplus)),) * 2, float(surplus.max())
    start, running = 0, 0.0
    for index, value in enumerate(surplus):
        running += float(value)
        if running > best_sum:
            best, best_sum = (start, index), running
        if running <= 0:
            start, running = index + 1, 0.0
    return best


def place_in_words(where_hz: tuple[tuple[float, float], ...]) -> str:
    """Stretches in words: "mostly between 12 MHz and 60 MHz", "mostly around 3 MHz"; "throughout the band" for none."""
    if not where_hz:
        return "throughout the band"
    return "mostly " + " and ".join(_stretch(low, high) for low, high in where_hz)


def _stretch(low_hz: float, high_hz: float) -> str:
    low, high = (si(edge, "Hz", digits=2) for edge in (low_hz, high_hz))
    if high_hz <= ONE_PLACE * low_hz or low == high:
        return f"around {si(float(np.sqrt(low_hz * high_hz)), 'Hz', digits=2)}"
    return f"between {low} and {high}"
