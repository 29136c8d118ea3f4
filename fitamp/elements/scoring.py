"""Does one sweep show the same elements as the others? A score test.

The elements of one sweep may differ from those of the others by δ. With the sweep's own information I and the
covariance C of what the others say, the sweep's residuals at the others' best vector have the score s = −J'r, and
u = (1 + I·C)⁻¹·s has the variance V = (1 + I·C)⁻¹·I, so that u'V⁻¹u is chi-square where δ is 0 (C. R. Rao, Proc.
Cambridge Phil. Soc. 44, 1948), with a degree of freedom for each direction in which a change would show.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.circuit import BENCH_LOAD
from fitamp.elements.residual import stacked
from fitamp.elements.solving import CircuitSolution
from fitamp.fitting.leastsq import covariance_of

__all__ = ["Score", "score_of"]

# A direction counts where so large a change, as a logarithm, would be no more than its own standard error.
VISIBLE_CHANGE = 0.5


@dataclass(frozen=True, slots=True, kw_only=True)
class Score:
    """How far a sweep is from the others.

    chance : of so large a statistic if the part is the same
    index : number of the vector whose deviation alone takes most off the statistic; change, stderr : that deviation,
        in units of the vector
    """

    chance: float
    statistic: float
    index: int
    change: float
    stderr: float


def score_of(solution: CircuitSolution, which: int) -> Score:
    """Score of one of the solution's sweeps, at the best vector of all, or at that of the others."""
    from scipy.special import chdtrc

    residuals, slopes = stacked(solution.circuit, solution.values, solution.sweeps)
    mine = np.zeros(len(residuals), dtype=bool)
    mine[solution.rows_of(which)] = True
    covariance = covariance_of(slopes[~mine])
    # From where the solution stands to the others' own optimum, by one step of Newton's method.
    shift = -covariance @ (slopes[~mine].T @ residuals[~mine])
    own = slopes[mine]
    information = own.T @ own
    reduction = np.eye(len(shift)) + information @ covariance
    score = np.linalg.solve(reduction, -own.T @ (residuals[mine] + own @ shift))
    variance = np.linalg.solve(reduction, information)
    variance = (variance + variance.T) / 2
    eigenvalues, directions = np.linalg.eigh(variance)
    visible = eigenvalues > VISIBLE_CHANGE**-2
    if not visible.any():
        return Score(chance=1.0, statistic=0.0, index=0, change=0.0, stderr=np.inf)
    statistic = float(((directions.T @ score)[visible] ** 2 / eigenvalues[visible]).sum())
    index = _suspect(solution, np.asarray(score), np.asarray(np.diag(variance)))
    return Score(
        chance=float(chdtrc(int(visible.sum()), statistic)),
        statistic=statistic,
        index=index,
        change=float(score[index] / variance[index, index]),
        stderr=float(variance[index, index] ** -0.5),
    )


def _suspect(solution: CircuitSolution, score: FloatArray, variances: FloatArray) -> int:
    """The number whose deviation alone takes most off the statistic; the bench's load acts as CL does."""
    candidates = [index for index, name in enumerate(solution.circuit.names) if name != BENCH_LOAD]
    return max(candidates, key=lambda index: score[index] ** 2 / max(float(variances[index]), 1e-300))
