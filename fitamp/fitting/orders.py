"""More than two poles and a zero: factors added one by one as long as the sweep asks for them.

Candidates come from vector fitting of the closed-loop pair with rising order, from the residuals' peak, and from jumps
of a receiver's range. Each is polished by the same likelihood as everything else, and the order is chosen by the
Bayesian information criterion (G. Schwarz, Annals of Statistics 6, 1978): a parameter must lower chi-square by the
logarithm of the number of data. A factor that stops paying once others are there, as a pole and a zero that cancel, is
dropped.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.steps import step_at
from fitamp.fitting.adequacy import judge
from fitamp.fitting.factors import Doublet, Factor, FurtherPole, RangeStep, Resonance
from fitamp.fitting.naming import named
from fitamp.fitting.scan import scanned_starts
from fitamp.fitting.search import (
    FREE_DELAY,
    FREE_FAR_POLE,
    NO_DELAY,
    NO_FAR_POLE,
    RACE_STEPS,
    RACE_TOLERANCE,
    Search,
    is_lag,
    lifted,
)
from fitamp.fitting.start import vector_fit_roots
from fitamp.fitting.two_pole import Solution, solution_at, solve

__all__ = ["needs_more", "with_factors"]

# More is no feature of a chip or bench but a model that is wrong everywhere.
MOST_FACTORS = 3
# Kinds of factor that are tried as the first.
MOST_TRIALS = 2
# So many points that gain most by a factor do not count for it.
WORST = 2
# Residuals over so many neighbours stand out where chance does so in one of 50 sweeps.
NEIGHBOURS, STANDS_OUT = 5, 0.02
# Beyond what the criterion asks for: odds of e^5 and better.
CLEARLY_BETTER = 10.0
# Orders of the pair fits from which starts are taken: real poles and complex pole pairs.
PAIR_FITS = ((2, 1), (4, 0))

# What is found as a doublet may turn out to be pole 2 and zero, which may lie above the band.
BEYOND = 4.0

# Share of the misfit that may be left by factors that do not make the model adequate.
WORTH_SHOWING = 0.1
# Of a resonance, as a share of the distance from point to point.
LEAST_WIDTH = 0.1
# Points beside the place of a step over which chi-square may rise before it falls.
FARTHEST_BESIDE = 3
# A step that the whole sweep asks for must also be seen by the points around it: two components exceed this in 1 of 90.
STEP_SIGMA = 3.0

LN_B = 2

Start = tuple[Factor, FloatArray]


def needs_more(solution: Solution) -> bool:
    """Whether the residuals are inadequate, or stand out over a few neighbours, as of a resonance taken for noise."""
    from scipy.special import gammainccinv

    adequacy = judge(solution)
    if not adequacy.adequate and not adequacy.noise_too_large:
        return True
    # Half the squared residuals of NEIGHBOURS points add up to a Gamma variable of that order.
    energy = np.convolve(np.abs(solution.residuals) ** 2 / 2, np.ones(NEIGHBOURS), mode="valid")
    return bool(energy.max(initial=0.0) > gammainccinv(NEIGHBOURS, STANDS_OUT / solution.points))


def with_factors(search: Search, solution: Solution, any_lag: Solution | None) -> tuple[Solution, Solution | None]:
    """An inadequate solution with the factors that it needs, and what then holds for any lag.

    Without priors (`any_lag` given) the lag may be needed as well.
    """
    if any_lag is None and _contradicts_the_delay(search, solution):
        # No factor is to make up for a wrong statement: the misfit is left, and said.
        return solution, None
    best = _risen(search, solution)
    if any_lag is None:
        return best, None
    if len(best.model.factors) > 1 or not judge(best).adequate:
        # What passes for one factor may be a lag.
        lagging = _risen(search, any_lag)
        if judge(lagging).adequate and is_lag(lagging):
            best = min((best, lagging), key=_criterion) if judge(best).adequate else lagging
    if not best.model.factors:
        return best, any_lag
    freed = []
    for far_pole, delay in ((NO_FAR_POLE, FREE_DELAY), (FREE_FAR_POLE, NO_DELAY), (FREE_FAR_POLE, FREE_DELAY)):
        model = replace(best.model, far_pole=far_pole, delay=delay)
        freed.append(search.settled(solve(model, search.sweep, best.noise, lifted(best, model))))
    if is_free(best) or not judge(best).adequate:
        # The simplest lag that will do.
        good = (end for end in freed if judge(end).adequate and is_lag(end))
        best = min((best, *good), key=_criterion) if judge(best).adequate else next(good, best)
    return best, freed[-1]


def _contradicts_the_delay(search: Search, solution: Solution) -> bool:
    """Whether another path delay than stated is all that the sweep asks for."""
    model = solution.model
    if model.delay.sd_s == np.inf:
        return False
    freed = replace(model, delay=FREE_DELAY)
    other = search.settled(solve(freed, search.sweep, solution.noise, lifted(solution, freed)))
    return judge(other).adequate and is_lag(other)


def is_free(solution: Solution) -> bool:
    """Whether a lag was fitted."""
    return bool(solution.model.far_pole.sd_s or solution.model.delay.sd_s)


def _risen(search: Search, solution: Solution) -> Solution:
    """The solution with the factors that pay; where the likeliest first one needs company, also with another first."""
    ends: list[Solution] = []
    for first in _one_more(search, solution)[:MOST_TRIALS]:
        if not _pays(search, solution, first):
            continue
        ends.append(_climbed(search, first))
        if judge(ends[-1]).adequate and len(ends[-1].model.factors) == 1:
            break
    good = [end for end in ends if judge(end).adequate]
    # Factors that explain little of a misfit and leave the rest only hide where it is.
    better = [end for end in ends if end.reduced_chi_square < WORTH_SHOWING * solution.reduced_chi_square]
    return min(good or better, key=_criterion, default=solution)


def _climbed(search: Search, solution: Solution) -> Solution:
    """One factor after the other, as long as each pays."""
    while len(solution.model.factors) < MOST_FACTORS and needs_more(solution):
        richer = next(iter(_one_more(search, solution)), None)
        if richer is None or not _pays(search, solution, richer):
            break
        solution = richer
    return _without_idle(search, solution) if len(solution.model.factors) > 1 else solution


def _criterion(solution: Solution) -> float:
    """The Bayesian criterion; each solution under its own noise, which no model swells."""
    return solution.optimum.chi_square + len(solution.values) * float(np.log(2 * solution.points))


def _pays(search: Search, solution: Solution, richer: Solution) -> bool:
    """Whether chi-square falls by more than the criterion asks, under the noise of the richer, which nothing swells.

    The points that gain most are left out of both: a pair of roots can always be bent through a bad point or two.
    """
    before = solve(solution.model, search.sweep, richer.noise, solution.values)
    gains = np.abs(before.residuals) ** 2 - np.abs(richer.residuals) ** 2
    keep = np.ones(len(gains), dtype=bool)
    keep[np.argsort(gains)[-WORST:]] = False
    rest = search.sweep.without(keep, "")
    without = solve(solution.model, rest, richer.noise, solution.values)
    gain = without.optimum.chi_square - float((np.abs(richer.residuals[keep]) ** 2).sum())
    return gain > _price(search, richer.model.factors[-1]) + CLEARLY_BETTER


def _price(search: Search, factor: Factor) -> float:
    """What the criterion asks of a factor; the place of a step is one more choice, of as many as there are points."""
    price = len(factor.parts) * np.log(2 * len(search.sweep))
    return float(price + (2 * np.log(len(search.sweep)) if isinstance(factor, RangeStep) else 0.0))


def _without_idle(search: Search, solution: Solution) -> Solution:
    """The solution without factors whose loss costs less than their parameters."""
    for index in reversed(range(len(solution.model.factors))):
        factors = solution.model.factors
        own = solution.model.factor_values(solution.values)
        kept = [value for i, value in enumerate(own) if i != index]
        first = len(solution.values) - sum(len(value) for value in own)
        model = replace(solution.model, factors=factors[:index] + factors[index + 1 :])
        start = np.concatenate([solution.values[:first], *kept])
        poorer = solve(model, search.sweep, solution.noise, start)
        if poorer.optimum.chi_square - solution.optimum.chi_square < _price(search, factors[index]):
            solution = search.settled(poorer)
    return solution


def _one_more(search: Search, solution: Solution) -> list[Solution]:
    """Solutions with one factor more, the best of each kind of factor, the likeliest first."""
    ends = _raced_from(search, solution)
    if not any(judge(end).adequate for end in ends):
        # What was fitted without the factor may be far off because of it.
        for other in _elsewhere(search, solution):
            ends += _raced_from(search, other)
            if any(judge(end).adequate for end in ends):
                break
    best: dict[type, Solution] = {}
    for end in sorted(ends, key=lambda end: end.optimum.chi_square + _price(search, end.model.factors[-1])):
        best.setdefault(type(end.model.factors[-1]), end)
    settled = (named(search.settled(_stepped(search, end)), search.sweep) for end in best.values())
    return [
        end for end in settled if _is_likely(search, end) and _shows_its_step(search, end) and _leaves_pole2_alone(end)
    ]


def _raced_from(search: Search, solution: Solution) -> list[Solution]:
    """Rough fits with one factor more that start from a solution."""
    raced = (
        _raced(search, solution, (*solution.model.factors, factor), np.concatenate([solution.values, values]))
        for factor, values in _starts(search, solution)
    )
    return [end for end in raced if end is not None]


def _elsewhere(search: Search, solution: Solution) -> Iterator[Solution]:
    """The same factors on the first starts, and with pole 2 where the design has it; under the same noise."""
    model = solution.model
    own = np.concatenate([[], *model.factor_values(solution.values)])
    bases = search.vectors(model)
    if model.pole2 is not None:
        g, q, *_ = model.physical(solution.values)
        if g and q:
            bases.insert(0, model.vector(g=g, q=q, b=model.pole2.time_s, zero_time_s=0.0))
    for base in bases:
        values = np.concatenate([base, own])
        if search.is_sane(model, values):
            yield solution_at(model, search.sweep, solution.noise, values)


def _raced(search: Search, solution: Solution, factors: tuple[Factor, ...], start: FloatArray) -> Solution | None:
    """The solution with these factors, fitted roughly; None where one of them ends as something else."""
    model = replace(solution.model, factors=factors)
    end = solve(model, search.sweep, solution.noise, start, tolerance=RACE_TOLERANCE, max_steps=RACE_STEPS)
    return end if _is_likely(search, end, BEYOND) else None


def _stepped(search: Search, solution: Solution) -> Solution:
    """A range step that was found roughly, moved from point to point while chi-square falls."""
    step = solution.model.factors[-1]
    if not isinstance(step, RangeStep):
        return solution
    edges_hz = np.sqrt(search.sweep.freq_hz[1:] * search.sweep.freq_hz[:-1])
    at = int(np.argmin(np.abs(np.log(edges_hz / step.f_hz))))
    best = solution
    for way in (1, -1):
        for index in range(at + way, len(edges_hz) if way > 0 else -1, way):
            other = RangeStep(f_hz=float(edges_hz[index]))
            moved = _raced(search, best, (*best.model.factors[:-1], other), best.values)
            if moved is not None and moved.optimum.chi_square < best.optimum.chi_square:
                best = moved
            elif abs(index - at) > FARTHEST_BESIDE:
                break
    return best


def _leaves_pole2_alone(solution: Solution) -> bool:
    """Whether no added pole lies nearer to where the design expects pole 2 than pole 2 itself.

    Then the names would be wrong, and so would be what is said of the zero.
    """
    model = solution.model
    if model.pole2 is None:
        return True
    own = abs(solution.values[LN_B] - np.log(model.pole2.time_s))
    for factor, values in zip(model.factors, model.factor_values(solution.values), strict=True):
        if isinstance(factor, Doublet | FurtherPole):
            time_s = abs(values[-1]) * factor.time_s
            if not time_s or abs(np.log(time_s / model.pole2.time_s)) < own:
                return False
    return True


def _shows_its_step(search: Search, solution: Solution) -> bool:
    """Whether a range step fitted last is also seen where it is, by a jump that nothing smooth can make."""
    step = solution.model.factors[-1]
    if not isinstance(step, RangeStep):
        return True
    sweep, model = search.sweep, solution.model
    s = np.asarray(2j * np.pi * sweep.freq_hz)
    size = step.factor_and_derivatives(model.factor_values(solution.values)[-1], s)[0]
    smooth = model.gain(solution.values, sweep.freq_hz) / size
    seen = step_at(step.f_hz, sweep.freq_hz, sweep.gain, smooth, solution.noise)
    return seen is None or seen.significance > STEP_SIGMA


def _starts(search: Search, solution: Solution) -> Iterator[Start]:
    """Starts for one factor more: where the residuals ask for it, and what a pair fit of higher order finds."""
    yield from scanned_starts(solution, search.sweep)
    if not solution.model.factors:
        for real, pairs in PAIR_FITS:
            roots = vector_fit_roots(search.bare, real, pairs)
            if roots is not None:
                yield from _closest(*roots, search.sweep.f_min_hz, search.sweep.f_max_hz)


def _closest(poles: ComplexArray, zeros: ComplexArray, low_hz: float, high_hz: float) -> Iterator[Start]:
    """The pole with the zero that is nearest to it among those in the band: of complex ones, and of real ones."""
    for is_complex in (True, False):
        chosen_poles, chosen_zeros = (
            np.array([root for root in roots if _is_candidate(root, is_complex, low_hz, high_hz)])
            for roots in (poles, zeros)
        )
        if not (len(chosen_poles) and len(chosen_zeros)):
            continue
        apart = np.abs(np.log(chosen_poles[:, np.newaxis] / chosen_zeros[np.newaxis, :]))
        at = np.unravel_index(int(np.argmin(apart)), apart.shape)
        pole, zero = chosen_poles[at[0]], chosen_zeros[at[1]]
        omega = float(np.sqrt(abs(pole * zero)))
        if is_complex:
            halves = [(-2 * root.real * omega / abs(root) ** 2, (omega / abs(root)) ** 2) for root in (zero, pole)]
            yield Resonance(omega=omega), np.array(halves).ravel()
        else:
            yield Doublet(time_s=1 / omega), np.array([-omega / zero.real, -omega / pole.real])


def _is_candidate(root: complex, is_complex: bool, low_hz: float, high_hz: float) -> bool:
    inside = low_hz < abs(root) / (2 * np.pi) < high_hz
    return bool(inside and (root.imag > 0 if is_complex else root.imag == 0 and root.real < 0))


def _is_likely(search: Search, solution: Solution, beyond: float = 1.0) -> bool:
    """Whether every factor is what it stands for, inside a band widened by `beyond`."""
    model = solution.model
    return (
        bool(np.isfinite(solution.optimum.chi_square))
        and search.is_sane(model, solution.values)
        and all(
            factor.is_likely(own, search.sweep.f_min_hz / beyond, search.sweep.f_max_hz * beyond)
            and not _is_between_points(search, factor, own)
            for factor, own in zip(model.factors, model.factor_values(solution.values), strict=True)
        )
    )


def _is_between_points(search: Search, factor: Factor, values: FloatArray) -> bool:
    """Whether a resonance is so narrow that it passes through a single point: that is a bad point, not a resonance."""
    if not isinstance(factor, Resonance):
        return False
    freq_hz = search.sweep.freq_hz
    for root in (root for roots in factor.roots_hz(values) for root in roots):
        at = int(np.clip(np.searchsorted(freq_hz, abs(root)), 1, len(freq_hz) - 1))
        spacing = np.log(freq_hz[at] / freq_hz[at - 1])
        if 2 * abs(root.real) / abs(root) < LEAST_WIDTH * spacing:
            return True
    return False
