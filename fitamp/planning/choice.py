"""The best of many sets: all of them looked at where they are few, else one sweep after another with exchanges.

Criteria are those of optimum experimental design (A. C. Atkinson, A. N. Donev and R. D. Tobias, Optimum Experimental
Designs, with SAS, 2007, ch. 10 and 12, from memory), with priors as in K. Chaloner and I. Verdinelli, Bayesian
Experimental Design: A Review, Statistical Science 10, 1995.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass
from itertools import combinations

__all__ = ["Choice", "Worth", "best_set", "exchanged", "in_order"]

# Of a set of candidates, by their indices: what is smaller is better, numbers in the order of their weight.
Worth = Callable[[tuple[int, ...]], tuple[float, ...]]
# So many sets take about a second.
MOST_SETS = 5000
# Exchanges start from so many sweeps.
STARTS = 8
# A set has to be better by more than rounding.
LEAST_GAIN = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """The best set found, its indices rising, and whether every set was looked at."""

    indices: tuple[int, ...]
    is_exhaustive: bool


def best_set(worth: Worth, candidates: int, count: int, *, one_of: Collection[int] = ()) -> Choice:
    """The best `count` of so many candidates; the earlier ones where sets are alike.

    one_of : of which one has to be in the set; empty for no such demand
    """
    if math.comb(candidates, count) > MOST_SETS:
        return Choice(indices=exchanged(worth, candidates, count, one_of=one_of), is_exhaustive=False)
    sets = [indices for indices in combinations(range(candidates), count) if _has(indices, one_of)]
    return Choice(indices=_best_of(worth, sets), is_exhaustive=True)


def exchanged(worth: Worth, candidates: int, count: int, *, one_of: Collection[int] = ()) -> tuple[int, ...]:
    """A set that no exchange of one sweep betters, the best such from several starts.

    To each of the best single sweeps (beside the best of `one_of`) the others are added one after another, each time
    the one that adds most; then the exchange of one member that gains most is made, until none gains (V. V. Fedorov,
    Theory of Optimal Experiments, 1972).
    """
    base = in_order(worth, range(candidates), count=1, one_of=one_of) if one_of else ()
    starts = [(*base, other) for other in range(candidates) if other not in base] if len(base) < count else [base]
    starts = sorted(starts, key=worth)[:STARTS]
    return _best_of(worth, [_exchanged_from(worth, candidates, count, start, one_of) for start in starts])


def _exchanged_from(
    worth: Worth, candidates: int, count: int, start: tuple[int, ...], one_of: Collection[int]
) -> tuple[int, ...]:
    chosen = in_order(worth, range(candidates), count=count, start=start)
    value = worth(chosen)
    while True:
        swaps = [
            swap
            for member in chosen
            for other in range(candidates)
            if other not in chosen and _has(swap := tuple(sorted({*chosen, other} - {member})), one_of)
        ]
        better = _best_of(worth, swaps) if swaps else chosen
        better_value = worth(better)
        if not _is_better(better_value, value):
            return tuple(sorted(chosen))
        chosen, value = better, better_value


def in_order(
    worth: Worth,
    indices: Sequence[int],
    *,
    count: int | None = None,
    one_of: Collection[int] = (),
    start: tuple[int, ...] = (),
) -> tuple[int, ...]:
    """Members of a set, all or the first `count`, in the order in which each adds most to those before it.

    start : those that come first; else the first one is of `one_of`, where that is not empty
    """
    ordered = start
    while len(ordered) < (len(indices) if count is None else count):
        sets = [(*ordered, other) for other in indices if other not in ordered]
        ordered = _best_of(worth, sets if ordered else [one for one in sets if _has(one, one_of)])
    return ordered


def _has(indices: tuple[int, ...], one_of: Collection[int]) -> bool:
    return not one_of or any(index in one_of for index in indices)


def _best_of(worth: Worth, sets: Sequence[tuple[int, ...]]) -> tuple[int, ...]:
    best, best_value = sets[0], worth(sets[0])
    for other in sets[1:]:
        value = worth(other)
        if _is_better(value, best_value):
            best, best_value = other, value
    return best


def _is_better(value: tuple[float, ...], other: tuple[float, ...]) -> bool:
    """Whether the first number that differs by more than rounding is smaller."""
    for mine, theirs in zip(value, other, strict=True):
        if not math.isclose(mine, theirs, rel_tol=LEAST_GAIN, abs_tol=LEAST_GAIN):
            return mine < theirs
    return False
