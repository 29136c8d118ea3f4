"""The true loop gain and the Cramér–Rao bound, computed by differences and independently of the package's own model.

Truth is a mapping of names to SI values; `CORE` is always there, the rest are nuisances of some scenarios:

    dc_gain, pole1_hz, pole2_hz (distances), zero_time_s (> 0: left half plane)
    delay_s      path delay
    far_pole_s   a3/a2 of the denominator 1 + a1 s + a2 s² + a3 s³ whose two other poles are pole 1 and pole 2
    pair_pole_hz, pair_pole_q, pair_zero_hz, pair_zero_q   a complex pole pair and a complex zero pair
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

import fitamp

__all__ = ["CORE", "GaussianPrior", "Quantity", "cramer_rao", "loop_gain"]

CORE = ("dc_gain", "pole1_hz", "pole2_hz", "zero_time_s")
Truth = Mapping[str, float]
Quantity = Callable[[Truth], float]

# Steps of the differences: relative, or in seconds for the times, which may be 0.
RELATIVE_STEP = 1e-6
TIME_STEP_S = 1e-15
# An eigenvalue of the scaled information below this is none; a quantity that needs it has no bound.
NO_INFORMATION = 1e-13
NEEDED_SHARE = 1e-4


@dataclass(frozen=True, slots=True, kw_only=True)
class GaussianPrior:
    """A weighted sum of true values known beforehand to ± `sd`."""

    weights: Mapping[str, float]
    sd: float


def loop_gain(freq_hz: np.ndarray, truth: Truth) -> np.ndarray:
    """Loop gain of shape (n,), complex."""
    jf = 1j * freq_hz
    s = 2 * np.pi * jf
    gain = truth["dc_gain"] * (1 + s * truth["zero_time_s"])
    gain = gain / ((1 + jf / truth["pole1_hz"]) * (1 + jf / truth["pole2_hz"]))
    if truth.get("far_pole_s"):
        # a2/a3 is the sum of the three poles.
        sum_hz = 1 / (2 * np.pi * truth["far_pole_s"])
        gain = gain / (1 + jf / (sum_hz - truth["pole1_hz"] - truth["pole2_hz"]))
    if "pair_pole_hz" in truth:
        for name, power in (("pair_zero", 1), ("pair_pole", -1)):
            ratio = jf / truth[f"{name}_hz"]
            gain = gain * (1 + ratio / truth[f"{name}_q"] + ratio**2) ** power
    return gain * np.exp(-s * truth.get("delay_s", 0.0))


def cramer_rao(
    freq_hz: np.ndarray,
    truth: Truth,
    noise: fitamp.NoiseLevels,
    quantities: Sequence[Quantity],
    *,
    free: Sequence[str] = CORE,
    priors: Sequence[GaussianPrior] = (),
) -> np.ndarray:
    """Least standard deviation of each quantity, shape (k,); infinite where the sweep does not determine it.

    Parameters
    ----------
    freq_hz : shape (n,)
    truth, noise
        Where the information is taken. The receivers see 1/(1+T) and T/(1+T), each with a floor that does not depend
        on T, so only the mean of the sweep informs, and the noise levels need not be known (their information is not
        mixed with the response's).
    quantities
        Functions of the truth.
    free
        Names that an estimator does not know; the rest of `truth` is taken as known.
    priors
        What is known of free names beforehand (hybrid bound: the true values scatter as the priors say; H. L. Van Trees
        and K. L. Bell, Bayesian Bounds, from memory).
    """
    information = _information(freq_hz, truth, noise, free) + _prior_information(free, priors)
    scale = np.sqrt(np.diag(information))
    eigenvalues, vectors = np.linalg.eigh(information / np.outer(scale, scale))
    seen = eigenvalues > NO_INFORMATION
    bounds = []
    for quantity in quantities:
        slopes = vectors.T @ (np.array([_slope(quantity, truth, name) for name in free]) / scale)
        if np.linalg.norm(slopes[~seen]) > NEEDED_SHARE * np.linalg.norm(slopes):
            bounds.append(np.inf)
        else:
            bounds.append(np.sqrt((slopes[seen] ** 2 / eigenvalues[seen]).sum()))
    return np.array(bounds)


def _information(freq_hz: np.ndarray, truth: Truth, noise: fitamp.NoiseLevels, free: Sequence[str]) -> np.ndarray:
    """Fisher information of the free names, shape (p, p), from the loop equation (T_meas − T)/(1 + T)."""
    loop = loop_gain(freq_hz, truth)
    variance = noise.return_channel**2 + np.abs(loop * noise.error_channel) ** 2
    variance = variance + noise.relative**2 * np.abs(loop / (1 + loop)) ** 2
    slopes = np.array([_slope(lambda values: loop_gain(freq_hz, values), truth, name) for name in free])
    weighted = slopes / (1 + loop) / np.sqrt(variance / 2)
    return (weighted @ weighted.conj().T).real


def _prior_information(free: Sequence[str], priors: Sequence[GaussianPrior]) -> np.ndarray:
    rows = [np.array([prior.weights.get(name, 0.0) for name in free]) / prior.sd for prior in priors]
    return sum((np.outer(row, row) for row in rows), np.zeros((len(free), len(free))))


def _slope(function: Callable[[Truth], np.ndarray | float], truth: Truth, name: str) -> np.ndarray | float:
    """Central difference by one name."""
    step = TIME_STEP_S if name.endswith("_s") else RELATIVE_STEP * truth[name]
    above, below = ({**truth, name: truth[name] + sign * step} for sign in (1, -1))
    return (function(above) - function(below)) / (2 * step)
