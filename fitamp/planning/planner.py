"""The door to plans: `plan`, from a design and a list of sweeps to the best ones and what they will tell."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from fitamp.design import Design
from fitamp.elements import ElementEstimate
from fitamp.errors import UsageError
from fitamp.planning.campaign import designed_die, measured_die
from fitamp.planning.choice import Choice, Worth, best_set, in_order
from fitamp.planning.outcomes import Outcomes
from fitamp.planning.precision import MAY_BE_ZERO, Measure
from fitamp.planning.result import Criterion, Plan, Stage, Wanted, is_met
from fitamp.planning.sweeps import DEFAULT_NOISE, PlannedSweep, affordable_sweeps
from fitamp.sweep import NoiseLevels

__all__ = ["expected_precision", "plan"]

# Where neither a number of sweeps is asked for nor a precision that can be reached.
USUAL_COUNT = 3


def plan(
    design: Design,
    candidates: Sequence[PlannedSweep] | None = None,
    *,
    count: int | None = None,
    wanted: Iterable[Wanted] = (),
    criterion: Criterion | None = None,
    noise: NoiseLevels | None = None,
    have: ElementEstimate | None = None,
    under_test: Iterable[str] = (),
    plain_first: bool = True,
    parts_drawn: int = 30,
    seed: int = 1,
) -> Plan:
    """Choose the best sweeps from a list, before they are taken, and say what they will tell.

    Parameters
    ----------
    design
        With elements. Its spreads are what is known beforehand; what is under test has none.
    candidates
        What can be taken, each once; `fitamp.planning.affordable_sweeps` makes such a list, and where None its usual
        one is taken.
    count
        How many to choose. Where None as few as meet what is wanted; three where nothing is, or not all of it can be.
    wanted
        Standard deviations of elements or quantities that shall be met.
    criterion
        Where None, WANTED where something is wanted, else DETERMINANT.
    noise
        Levels of one sweep that is not averaged. Where None those of the sweeps taken, else usual ones, which the
        result says.
    have
        Elements estimated from sweeps taken already: the plan is then for this part where they put it.
    under_test
        Elements without prior, in addition to the design's; not together with `have`, which has its own.
    plain_first
        Whether the first one is a sweep with nothing added, where there is such a candidate and no sweep was taken
        yet: it shows the part as it is, and a comparison takes it.
    parts_drawn, seed
        Precision depends on where the part lies. So many parts are drawn from the design's spreads (with `have`, from
        what is known of the part); root mean square and largest of the standard deviations at each of them are given
        beside those of the centre.

    Returns
    -------
    Plan
        Standard deviations hold as far as the loop gain is linear in them: those of a single sweep, of which the priors
        tell most, to some 15 %, those of a set that tells all elements far better. They are those of an estimate that
        is told the noise; to find it costs some 5 % more.

    Raises
    ------
    UsageError
        When the arguments do not belong together, or the design gives roots.

    Notes
    -----
    Sweeps add up in Fisher's information matrix, and so do priors; nuisances (bench load, delay) are in it and so
    marginalised. The set is the best of all of that size, or where there are too many the best that exchanges find; see
    `fitamp.planning.choice`.
    """
    _check(design, have, under_test)
    wishes = tuple(wanted)
    levels = noise or (DEFAULT_NOISE if have is None else _noise_of(have))
    die = designed_die(design, levels, under_test=tuple(under_test)) if have is None else measured_die(have, levels)
    sweeps = tuple(dict.fromkeys(affordable_sweeps(design) if candidates is None else candidates))
    if not sweeps:
        raise UsageError("there is no sweep to choose from; list at least one")
    outcomes = Outcomes(die, design, sweeps, parts_drawn=parts_drawn, seed=seed)
    in_si = _in_si(wishes, outcomes.rows)
    by = criterion or (Criterion.WANTED if wishes else Criterion.DETERMINANT)
    if by is Criterion.WANTED and not wishes:
        raise UsageError("nothing is wanted; say which element shall be known how well, or choose another criterion")
    worth = outcomes.worth(by, in_si)
    everything = outcomes.stage(tuple(range(len(sweeps))), over_parts=False)
    can_be_met = all(is_met(everything.of(name).sd, sd) for name, sd in in_si.items())
    plain = _plain(sweeps) if plain_first and have is None else ()
    choice = _chosen(worth, len(sweeps), count, as_few_as_meet=bool(wishes) and can_be_met, one_of=plain)
    ordered = in_order(worth, choice.indices, one_of=plain)
    left = [index for index in range(len(sweeps)) if index not in ordered]
    further = min(left, key=lambda index: worth((*ordered, index)), default=None)
    return Plan(
        design=design,
        noise=levels,
        candidates=sweeps,
        taken=0 if have is None else len(have.solution.sweeps),
        cautions=() if have is None or have.is_trustworthy else tuple(note.message for note in have.notes),
        stages=tuple(outcomes.stage(ordered[:number]) for number in range(len(ordered) + 1)),
        further=None if further is None else outcomes.stage((*ordered, further)),
        everything=everything,
        criterion=by,
        is_exhaustive=choice.is_exhaustive,
        wanted=tuple(in_si.items()),
        parts_drawn=parts_drawn,
    )


def expected_precision(
    design: Design, sweeps: Sequence[PlannedSweep], *, noise: NoiseLevels | None = None, under_test: Iterable[str] = ()
) -> Stage:
    """What is to be expected after these very sweeps, for the part at the design's centre; see `plan`.

    Raises
    ------
    UsageError
        When the design gives roots, or a sweep cannot be taken.
    """
    die = designed_die(design, noise or DEFAULT_NOISE, under_test=tuple(under_test))
    return Outcomes(die, design, tuple(sweeps)).stage(tuple(range(len(sweeps))))


def _check(design: Design, have: ElementEstimate | None, under_test: Iterable[str]) -> None:
    if not isinstance(design, Design):
        raise UsageError("a plan takes a design: read it with read_design")
    if have is not None and tuple(under_test):
        raise UsageError("what is under test is settled by the estimate that there is; state it there")


def _noise_of(have: ElementEstimate) -> NoiseLevels:
    """Mean levels of the sweeps taken, as root of the mean square."""
    levels = [one.noise for one in have.solution.sweeps]

    def mean(name: str) -> float:
        return float(np.sqrt(np.mean([getattr(one, name) ** 2 for one in levels])))

    return NoiseLevels(
        error_channel=mean("error_channel"),
        return_channel=mean("return_channel"),
        relative=mean("relative"),
        ratio=mean("ratio"),
        source="as in the sweeps taken",
    )


def _in_si(wishes: Sequence[Wanted], rows: Sequence[Measure]) -> dict[str, float]:
    """Wanted standard deviations in SI units by name."""
    by_name = {row.name: row for row in rows}
    found: dict[str, float] = {}
    for wish in wishes:
        row = by_name.get(wish.name)
        if row is None:
            raise UsageError(f"{wish.name} is not among what a plan knows: {', '.join(by_name)}")
        if wish.name in found:
            raise UsageError(f"{wish.name} is wanted twice; give it once")
        if wish.absolute is not None:
            found[wish.name] = wish.absolute
            continue
        assert wish.relative is not None
        if not row.value or wish.name in MAY_BE_ZERO:
            unit = f"in {row.unit}" if row.unit else "as a number"
            raise UsageError(f"{wish.name} may be 0, of which there is no share; state how well it is wanted {unit}")
        found[wish.name] = wish.relative * abs(row.value)
    return found


def _plain(sweeps: Sequence[PlannedSweep]) -> tuple[int, ...]:
    return tuple(
        index
        for index, sweep in enumerate(sweeps)
        if not (sweep.condition.load_added_f or sweep.condition.rz_added_ohm)
    )


def _chosen(
    worth: Worth, candidates: int, count: int | None, *, as_few_as_meet: bool, one_of: tuple[int, ...]
) -> Choice:
    if count is not None:
        if not 1 <= count <= candidates:
            raise UsageError(f"{count} sweeps cannot be chosen from {candidates}; choose 1 to {candidates}")
        return best_set(worth, candidates, count, one_of=one_of)
    if not as_few_as_meet:
        return best_set(worth, candidates, min(USUAL_COUNT, candidates), one_of=one_of)
    for number in range(1, candidates):
        choice = best_set(worth, candidates, number, one_of=one_of)
        if worth(choice.indices)[0] <= 1:
            return choice
    return Choice(indices=tuple(range(candidates)), is_exhaustive=True)
