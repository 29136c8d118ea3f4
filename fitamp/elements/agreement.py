"""Do all sweeps show one part? Each is held against its own noise, and against the others; what stands apart goes.

A sweep that no circuit describes counts for as much less. A sweep that a circuit describes, but not the others' one,
shows a part that changed, or something other than stated was added: if it is plain which sweep it is, that one is left
out; if it is not, all stay, and the errors are as large as the contradiction.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.residual import Measured
from fitamp.elements.result import SweepCheck
from fitamp.elements.scoring import Score, score_of
from fitamp.elements.solving import CircuitSolution, residuals_at, solve
from fitamp.estimate import Estimate
from fitamp.fitting.adequacy import judge

__all__ = ["Agreement", "agreed"]

# Chance, over all sweeps of an estimate together, that one of an unchanged part is called changed.
FALSE_ALARM = 1e-4
# A sweep is named alone where giving it elements of its own lowers chi-square by so much more than giving them to any
# other: odds of a thousand to one.
PLAINLY = 2 * np.log(1000.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Agreement:
    """The solution of the sweeps that agree, and a check for each that was given, in their order.

    contradiction : covariance of the vector, shape (p, p), over what is found where either of the sweeps that may
        stand apart is left out; None where all that were kept agree
    """

    solution: CircuitSolution
    checks: tuple[SweepCheck, ...]
    contradiction: FloatArray | None


def agreed(solution: CircuitSolution, *, quantile: float, keep_all: bool = False) -> Agreement:
    """Weigh sweeps that no circuit describes, and set apart those that do not show the same part.

    Parameters
    ----------
    solution
        Of all sweeps, each weighted with its own noise.
    keep_all
        Leave no sweep out.
    """
    given = solution = _weighed(solution)
    count = len(given.sweeps)
    chances = {which: score.chance for which, score in enumerate(_scores(given))}
    places = list(range(count))
    flagged: dict[int, Score] = {}
    contradiction = None
    while _disagree(_scores(solution)):
        apart = _standing_apart(solution)
        flagged |= {places[which]: _against_others(solution, which) for which in apart}
        if len(apart) > 1 or keep_all or count - len(places) == (count - 1) // 2:
            contradiction = _contradiction(given, places, [places[which] for which in apart])
            places, solution = list(range(count)), given
            break
        del places[apart[0]]
        solution = _solved(solution, [one for which, one in enumerate(solution.sweeps) if which != apart[0]])
    solution = _as_wide_as_misfit(solution)
    checks = tuple(
        _check(given, solution, place, chances.get(place), flagged, left_out=place not in places, quantile=quantile)
        for place in range(count)
    )
    return Agreement(solution=solution, checks=checks, contradiction=contradiction)


def _solved(solution: CircuitSolution, sweeps: Sequence[Measured]) -> CircuitSolution:
    return solve(solution.circuit, sweeps, solution.values)


def _scores(solution: CircuitSolution) -> list[Score]:
    count = len(solution.sweeps)
    return [score_of(solution, which) for which in range(count)] if count > 1 else []


def _disagree(scores: Sequence[Score]) -> bool:
    return any(score.chance < FALSE_ALARM / len(scores) for score in scores)


def _standing_apart(solution: CircuitSolution) -> list[int]:
    """The sweep that needs elements of its own; several where it cannot be told which of them does."""
    drops = []
    for which, one in enumerate(solution.sweeps):
        others = [other for number, other in enumerate(solution.sweeps) if number != which]
        apart = _solved(solution, [one]).optimum.chi_square + _solved(solution, others).optimum.chi_square
        drops.append(solution.optimum.chi_square - apart)
    return [which for which, drop in enumerate(drops) if drop > max(drops) - PLAINLY]


def _against_others(solution: CircuitSolution, which: int) -> Score:
    """Score of a sweep at the elements of the others alone."""
    others = _solved(solution, [one for number, one in enumerate(solution.sweeps) if number != which])
    return score_of(replace(solution, optimum=others.optimum), which)


def _contradiction(given: CircuitSolution, places: Sequence[int], apart: Sequence[int]) -> FloatArray:
    """Mean square of how far the vector moves where one of the sweeps that may stand apart is left out."""
    moves = []
    for gone in apart:
        rest = _solved(given, [given.sweeps[place] for place in places if place != gone])
        moves.append(rest.values - given.values)
    return np.asarray(np.mean([np.outer(move, move) for move in moves], axis=0))


def _weighed(solution: CircuitSolution) -> CircuitSolution:
    """Let a sweep count for less that even a circuit of its own does not describe."""
    inflations = [judge(solution.residuals_of(which)).inflation for which in range(len(solution.sweeps))]
    if len(inflations) > 1:
        inflations = [
            judge(_solved(solution, [one]).residuals_of(0)).inflation if inflation > 1 else 1.0
            for one, inflation in zip(solution.sweeps, inflations, strict=True)
        ]
    return _with_inflations(solution, inflations)


def _as_wide_as_misfit(solution: CircuitSolution) -> CircuitSolution:
    """Let a sweep count for less that the shared elements do not describe, for whatever reason."""
    inflations = [
        max(judge(solution.residuals_of(which)).inflation, one.inflation) for which, one in enumerate(solution.sweeps)
    ]
    return _with_inflations(solution, inflations)


def _with_inflations(solution: CircuitSolution, inflations: Sequence[float]) -> CircuitSolution:
    if all(f == one.inflation for one, f in zip(solution.sweeps, inflations, strict=True)):
        return solution
    return _solved(solution, [replace(one, inflation=f) for one, f in zip(solution.sweeps, inflations, strict=True)])


def _check(
    given: CircuitSolution,
    solution: CircuitSolution,
    place: int,
    chance: float | None,
    flagged: Mapping[int, Score],
    *,
    left_out: bool,
    quantile: float,
) -> SweepCheck:
    one = given.sweeps[place]
    suspect, change = None, None
    if place in flagged:
        score = flagged[place]
        parameter = given.circuit.parameters[score.index]
        slope = parameter.slope(float(solution.values[score.index]))
        suspect = parameter.name
        change = Estimate.gaussian(slope * score.change, slope * score.stderr, quantile=quantile)
    return SweepCheck(
        file=one.sweep.origin.file,
        condition=one.condition,
        points=len(one.sweep),
        adequacy=judge(residuals_at(solution.circuit, solution.values, one)),
        change_chance=chance,
        changed=place in flagged,
        left_out=left_out,
        suspect=suspect,
        suspect_change=change,
    )
