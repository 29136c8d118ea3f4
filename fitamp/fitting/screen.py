"""Leaving out bad points: found in the residuals of a solution, with noise and solution renewed until none is left."""

from __future__ import annotations

import numpy as np

from fitamp.conditioning.spurs import MOST_SHARE, without_spurs
from fitamp.fitting.search import RACE_TOLERANCE
from fitamp.fitting.two_pole import Solution, solution_at, solve
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["screened"]

ROUNDS = 8
# A sweep with less noise than this was computed; what stands apart there is arithmetic.
COMPUTED = 1e-9


def screened(sweep: Sweep, solution: Solution, noise: NoiseLevels | None, *, whole: Sweep, fewest: int) -> Sweep:
    """The sweep without its bad points; the same object where there are none.

    Parameters
    ----------
    solution
        Of this sweep; any smooth model near it will do.
    noise
        None where it is estimated from the sweep.
    whole
        The sweep before anything was left out. It is returned where more than `MOST_SHARE` of its points would go, or
        fewer than `fewest` remain: then it is not single points that are wrong.
    """
    least = max(len(whole) - int(MOST_SHARE * len(whole)), fewest)
    levels = solution.noise
    if max(levels.error_channel, levels.return_channel, levels.relative, levels.ratio) < COMPUTED:
        return sweep
    for _ in range(ROUNDS):
        fewer = without_spurs(sweep, solution.residuals)
        if fewer is sweep:
            break
        if len(fewer) < least:
            return whole
        sweep = fewer
        levels = noise or estimate_noise(sweep, solution.model.gain(solution.values, sweep.freq_hz))
        again = solve(solution.model, sweep, levels, solution.values, tolerance=RACE_TOLERANCE)
        if not np.isfinite(again.optimum.chi_square):
            again = solution_at(solution.model, sweep, levels, solution.values)
        solution = again
    return sweep
