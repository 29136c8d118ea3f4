"""Bench noise as four numbers, estimated by maximum likelihood from one sweep.

The estimate looks at local scatter only: second differences along the sweep of the loop-equation residual
(T − M)/(1 + T). Whatever is smooth cancels there, so a model M that is wrong cannot hide its fault in the noise.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["FLOOR", "estimate_noise", "simulate_bench", "variance_components"]

# Second difference with unit variance for white noise.
CONTRAST = np.array([1.0, -2.0, 1.0]) / np.sqrt(6.0)
# A sweep without any scatter (a simulator's export) still gets a floor: the digits of a double and a little more.
FLOOR = 1e-13
# Variance components are sought within a factor exp(60) of the mean scatter, far beyond any receiver's range.
LOG_REACH = 60.0
# A second difference of exactly 0 (repeated digits) has no logarithm; it counts as this share of the mean.
TINY = 1e-12
# A second difference so many times its mean square is no noise: it comes once in 160 000 times, and without it the mean
# loses one part in 10 000, so nothing has to be made up for. Not more than this share can be set aside so.
GLITCH = 12.0
# Scatter below this is arithmetic, whose errors follow no such law.
ROUNDING = 1e-12
MOST_GLITCHES = 0.3
GLITCH_ROUNDS = 8


def estimate_noise(sweep: Sweep, model_gain: ComplexArray, *, set_aside: bool = True) -> NoiseLevels:
    """Estimate the receivers' floors and the relative gain error from the scatter of a sweep about a smooth model.

    Parameters
    ----------
    sweep
        At least 6 points, so that there are as many second differences as levels.
    model_gain : shape (n,)
        Loop gain of a current model; it need not be right, only smooth and near.
    set_aside
        Whether second differences far beyond their law count as bad points' and are set aside. About a model that is
        not near they may be its own curvature, and the noise would come out too small.

    Returns
    -------
    NoiseLevels
        Complex standard deviations for a drive of 1.

    Notes
    -----
    Each |second difference|² is exponential with mean Σ_j x_kj θ_j, θ = (n_r², n_e², rel², ratio²) ≥ 0: a Gamma
    generalised linear model with identity link (P. McCullagh and J. A. Nelder, Generalized Linear Models, ch. 8).
    """
    model = np.abs(model_gain) ** 2
    size = 1 / (1 + model)
    scaled = (sweep.gain - model_gain) / (1 + sweep.gain) * np.sqrt(size)
    observed = np.abs(np.convolve(scaled, CONTRAST, mode="valid")) ** 2
    through = np.abs(1 + model_gain) ** 2
    parts = np.stack([size, model * size, model / through * size, size / through], axis=1)
    design = np.stack([np.convolve(part, CONTRAST**2, mode="valid") for part in parts.T], axis=1)
    variances = (variance_components if set_aside else _gamma_regression)(observed, design)
    n_return, n_error, relative, ratio = np.sqrt(variances)
    return NoiseLevels(
        error_channel=float(n_error),
        return_channel=float(n_return),
        relative=float(np.hypot(relative, FLOOR)),
        ratio=float(ratio),
        source="estimated from the sweep",
    )


def variance_components(observed: FloatArray, design: FloatArray) -> FloatArray:
    """Variances θ ≥ 0, shape (c,), of which mean squares `observed`, shape (n,), have the means `design` @ θ.

    Each observed value is exponential, or the mean of several that are. What is far beyond its own law is set aside,
    once that has settled, but nothing if it were too much.
    """
    everything = variances = _gamma_regression(observed, design)
    keep = np.ones(len(observed), dtype=bool)
    for _ in range(GLITCH_ROUNDS):
        settled = keep
        keep = observed <= np.maximum(GLITCH * (design @ variances), ROUNDING**2)
        if not keep.any() or np.mean(~keep) > MOST_GLITCHES:
            return everything
        if np.array_equal(keep, settled):
            break
        variances = _gamma_regression(observed[keep], design[keep])
    return variances


def _gamma_regression(observed: FloatArray, design: FloatArray) -> FloatArray:
    """Coefficients ≥ 0 of exponential means `design` @ θ, by their logarithms: no step can leave the region.

    The sum of squared deviance residuals is the deviance, so least squares of them is maximum likelihood.
    """
    from scipy.optimize import leastsq

    scale = design.max(axis=0)
    level = float(observed.mean())
    if not level > 0:
        return np.zeros(design.shape[1])
    columns, target = design / scale, np.maximum(observed / level, TINY)

    def deviance_residuals(logs: FloatArray) -> FloatArray:
        ratio = target / (columns @ np.exp(np.clip(logs, -LOG_REACH, LOG_REACH)))
        # 2 (y/μ − 1 − ln y/μ) is 0 at y = μ; rounding may put it a hair below.
        return np.asarray(np.sign(ratio - 1) * np.sqrt(2 * np.maximum(ratio - 1 - np.log(ratio), 0.0)))

    # Each component explains what is largest in its own stretch of the band, to begin with.
    start = np.log([np.average(target, weights=column**2) for column in columns.T / columns.max(axis=1)])
    # With its full output it does not warn where it stops early: a valley without end is as good anywhere.
    logs = leastsq(deviance_residuals, start, ftol=1e-8, xtol=1e-6, full_output=True)[0]
    return np.asarray(np.exp(np.clip(logs, -LOG_REACH, LOG_REACH)) * level / scale, dtype=float)


def simulate_bench(gain: ComplexArray, noise: NoiseLevels, rng: np.random.Generator) -> ComplexArray:
    """What a bench with this noise reads for a loop gain of shape (n,): receiver floors, then relative gain error.

    error = 1/(1+T) + floor, return = T/(1+T) + floor, T_meas = return/error · (1 + relative error) + ratio's floor.
    """

    def scatter(sd: float) -> ComplexArray:
        draws = rng.standard_normal((2, len(gain)))
        return np.asarray(sd / np.sqrt(2) * (draws[0] + 1j * draws[1]))

    error = 1 / (1 + gain) + scatter(noise.error_channel)
    returned = gain / (1 + gain) + scatter(noise.return_channel)
    measured = returned / error * (1 + scatter(noise.relative))
    return np.asarray(measured + scatter(noise.ratio) if noise.ratio else measured)
