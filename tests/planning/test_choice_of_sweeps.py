"""Choosing the best set: exchanges against looking at all sets."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from planned_parts import DESIGN, OWN_SPREADS, added

from fitamp.design import Design
from fitamp.planning import DEFAULT_NOISE, Criterion
from fitamp.planning.campaign import designed_die
from fitamp.planning.choice import Worth, best_set, exchanged, in_order
from fitamp.planning.outcomes import Outcomes

LIST = [added(load, rz) for rz in (0.0, -400.0, 500.0) for load in (0.0, 5.0, 20.0)]


def _real(design: Design, criterion: Criterion) -> Worth:
    outcomes = Outcomes(designed_die(design, DEFAULT_NOISE), design, tuple(LIST))
    return outcomes.worth(criterion, {"gm2": 1e-6, "Cc": 1e-15})


def _best_by_hand(worth: Worth, candidates: int, count: int, one_of: tuple[int, ...] = ()) -> tuple[int, ...]:
    sets = [one for one in combinations(range(candidates), count) if not one_of or set(one) & set(one_of)]
    return min(sets, key=worth)


@pytest.mark.parametrize("criterion", list(Criterion))
@pytest.mark.parametrize("design", [DESIGN, OWN_SPREADS])
def test_exchanges_find_the_best_of_all_sets(design: Design, criterion: Criterion) -> None:
    worth = _real(design, criterion)
    for count in (1, 2, 3, 4):
        for one_of in ((), (0,)):
            best = _best_by_hand(worth, len(LIST), count, one_of)
            assert worth(exchanged(worth, len(LIST), count, one_of=one_of)) == pytest.approx(worth(best), rel=1e-8)
            assert worth(best_set(worth, len(LIST), count, one_of=one_of).indices) == pytest.approx(
                worth(best), rel=1e-8
            )


def test_exchanges_mend_what_came_first() -> None:
    # Alone 0 is best, but 1 and 2 together are better than any set with it.
    values = {(0,): 3.0, (1,): 4.0, (2,): 5.0, (0, 1): 2.5, (0, 2): 2.6, (1, 2): 0.0}
    assert exchanged(lambda indices: (values[tuple(sorted(indices))],), 3, 2) == (1, 2)


def test_many_sets_are_left_to_exchanges() -> None:
    rng = np.random.default_rng(3)
    vectors = rng.standard_normal((60, 4))

    def worth(indices: tuple[int, ...]) -> tuple[float, ...]:
        chosen = vectors[list(indices)]
        return (-float(np.linalg.slogdet(chosen.T @ chosen + np.eye(4))[1]),)

    few, many = best_set(worth, 10, 4), best_set(worth, 60, 6)
    assert few.is_exhaustive
    assert not many.is_exhaustive
    # No exchange of one betters it.
    own = worth(many.indices)
    for member in many.indices:
        for other in set(range(60)) - set(many.indices):
            assert worth(tuple(sorted({*many.indices, other} - {member}))) >= own


def test_a_demanded_member_comes_first() -> None:
    worth = _real(OWN_SPREADS, Criterion.DETERMINANT)
    free, tied = best_set(worth, len(LIST), 2), best_set(worth, len(LIST), 2, one_of=(0,))
    assert 0 in tied.indices
    assert worth(free.indices) <= worth(tied.indices)
    assert in_order(worth, tied.indices, one_of=(0,))[0] == 0


def test_the_order_is_that_of_what_each_adds() -> None:
    worth = _real(DESIGN, Criterion.DETERMINANT)
    ordered = in_order(worth, (0, 2, 3, 8))
    assert sorted(ordered) == [0, 2, 3, 8]
    for number in range(4):
        rest = set(ordered[number:])
        assert min(rest, key=lambda index: worth((*ordered[:number], index))) == ordered[number]


def test_what_is_alike_leaves_the_earlier_one() -> None:
    assert best_set(lambda indices: (0.0 * len(indices),), 5, 2).indices == (0, 1)
    assert best_set(lambda indices: (np.inf, float(-sum(indices))), 5, 2).indices == (3, 4)
    assert best_set(lambda indices: (1.0 if 4 in indices else np.inf,), 5, 1).indices == (4,)
