"""One search after the other: bad points left out, a lag or further factors where the sweep needs them."""

from __future__ import annotations

from dataclasses import dataclass, replace

from fitamp.fitting.adequacy import judge
from fitamp.fitting.orders import needs_more, with_factors
from fitamp.fitting.screen import screened
from fitamp.fitting.search import FREE_DELAY, FREE_FAR_POLE, Search
from fitamp.fitting.two_pole import DelayPrior, FarPoleCurve, FarPolePrior, Solution, solve
from fitamp.sweep import Sweep

__all__ = ["HOPELESS_SCATTER", "Found", "found_by"]

# A search without bad points may show more of them; so often at most.
SCREENINGS = 3
# Relative scatter beyond which a sweep is too coarse or too noisy to hold a shape.
HOPELESS_SCATTER = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """What a search ended with.

    sweep : without its bad points
    any_lag : the solution with third pole and delay free; None where priors say what they are, or where there is none
    """

    sweep: Sweep
    solution: Solution
    any_lag: Solution | None


def found_by(
    search: Search,
    far_pole: FarPolePrior | FarPoleCurve | None,
    delay: DelayPrior | None,
    *,
    keep_all: bool,
    fewest: int,
) -> Found:
    """Search, leave out what stands apart, search again; then what two poles and a zero do not explain.

    Parameters
    ----------
    search
        On the whole sweep.
    far_pole, delay
        As for `fit_sweep`.
    keep_all
        Leave nothing out.
    fewest
        Points that have to remain.
    """
    lag_is_known = far_pole is not None or delay is not None
    whole, screens = search.sweep, not keep_all
    for screening in range(SCREENINGS + 1):
        if lag_is_known:
            solution = search.with_far_pole(far_pole or FREE_FAR_POLE, delay or FREE_DELAY)
        else:
            solution = search.plain()
        if not screens or screening == SCREENINGS:
            break
        rest = screened(search.sweep, solution, search.noise, whole=whole, fewest=fewest)
        if rest is search.sweep:
            break
        # If too many would go, all stay.
        screens = rest is not whole
        search = replace(search, sweep=rest)
    any_lag = None
    if not lag_is_known:
        solution, any_lag = search.plain_or_with_lag(solution)
        if screens and any_lag is not None and not judge(solution).adequate:
            # Where a lag was missing, its misfit hid bad points.
            rest = screened(search.sweep, any_lag, search.noise, whole=whole, fewest=fewest)
            if rest is not search.sweep and rest is not whole:
                other = replace(search, sweep=rest)
                cleaned = other.plain_or_with_lag(other.plain())
                # If not all of it: a step, say, makes its neighbours look bad.
                if judge(cleaned[0]).adequate:
                    search, (solution, any_lag) = other, cleaned
    if solution.noise.relative <= HOPELESS_SCATTER and needs_more(solution):
        solution, any_lag = with_factors(search, solution, any_lag)
    found = Found(sweep=search.sweep, solution=solution, any_lag=any_lag)
    if solution.model.factors and len(search.sweep) < len(whole):
        return _with_points_back(replace(search, sweep=whole), found, fewest)
    return found


def _with_points_back(search: Search, found: Found, fewest: int) -> Found:
    """Screened again, now that the model has the resonance on whose flank points stood apart."""
    whole = search.sweep
    solution = search.settled(solve(found.solution.model, whole, found.solution.noise, found.solution.values))
    rest = screened(whole, solution, search.noise, whole=whole, fewest=fewest)
    if len(rest) <= len(found.sweep):
        return found
    search = replace(search, sweep=rest)

    def again(old: Solution) -> Solution:
        return search.settled(solve(old.model, rest, old.noise, old.values))

    any_lag = None if found.any_lag is None else again(found.any_lag)
    return Found(sweep=rest, solution=again(found.solution), any_lag=any_lag)
