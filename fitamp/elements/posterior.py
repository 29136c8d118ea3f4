"""How much of what is known of the vector came from the sweeps, and what is left without one prior."""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.circuit import NOTHING_KNOWN, Circuit
from fitamp.elements.residual import stacked
from fitamp.elements.solving import CircuitSolution
from fitamp.fitting.leastsq import covariance_of

__all__ = ["informed_shares", "without_prior"]


def informed_shares(circuit: Circuit, covariance: FloatArray) -> FloatArray:
    """For each number of the vector, the share of what is known that came from data, shape (p,), 0 to 1.

    One minus posterior variance over prior variance; without a prior 1 where the posterior knows it to a factor of e,
    else 0.
    """
    variances = np.diag(covariance)
    shares = [
        float(variance < 1.0) if one.prior_sd is None else 1 - variance / one.prior_sd**2
        for one, variance in zip(circuit.parameters, variances, strict=True)
    ]
    return np.asarray(np.clip(shares, 0.0, 1.0), dtype=float)


def without_prior(solution: CircuitSolution, index: int) -> tuple[FloatArray, FloatArray]:
    """The vector and its covariance if one number had no prior: one step of Newton's method from the optimum."""
    residuals, slopes = stacked(solution.circuit, solution.values, solution.sweeps)
    prior_sd = solution.circuit.parameters[index].prior_sd
    if prior_sd is not None:
        row = 2 * solution.points + index
        slopes[row] *= prior_sd / NOTHING_KNOWN
        residuals[row] = 0.0
    covariance = covariance_of(slopes)
    return solution.values - covariance @ (slopes.T @ residuals), covariance
