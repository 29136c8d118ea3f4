"""Bench noise as four numbers, estimated by maximum likelihood from one sweep.

The estimate looks at local scatter only: second differences along the sweep of the loop-equation residual
(T − M)/(1 + T). Whatever is smooth cancels there, so a model M that is wrong cannot hide its fault in the noise.
"""

from __future__ import annotations

import math
from typing import TypeVar

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.tall import product

__all__ = ["FLOOR", "estimate_noise", "simulate_bench", "variance_components"]

# Second difference with unit variance for white noise.
CONTRAST = np.array([1.0, -2.0, 1.0]) / np.sqrt(6.0)
# A sweep without any scatter (a simulator's export) still gets a floor: the digits of a double and a little more.
FLOOR = 1e-13
# A second difference of exactly 0 (repeated digits) has no logarithm; it counts as this share of the mean.
TINY = 1e-12
# The regression ends when no mean moves by more than this share, relatively; about a start that is not near the truth
# its own curvature is in the scatter, and a rough answer is as good.
SETTLED, ROUGHLY_SETTLED = 1e-7, 1e-3
# Steps by expected information suit any start and converge well where the law holds; after so many of them, by the
# observed one, which converges anywhere near the end.
EXPECTED_STEPS, MOST_STEPS, HALVINGS = 2, 100, 12
# Share of its diagonal added to an information matrix, which two levels that look alike leave singular.
RIDGE = 1e-12
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
    observed = np.abs(_contrast(scaled, CONTRAST)) ** 2
    apart = size / np.abs(1 + model_gain) ** 2
    design = _contrast(np.stack([size, model * size, model * apart, apart], axis=1), CONTRAST**2)
    if set_aside:
        variances = variance_components(observed, design)
    else:
        variances = _gamma_regression(observed, design, tolerance=ROUGHLY_SETTLED)
    n_return, n_error, relative, ratio = np.sqrt(variances)
    return NoiseLevels(
        error_channel=float(n_error),
        return_channel=float(n_return),
        relative=float(np.hypot(relative, FLOOR)),
        ratio=float(ratio),
        source="estimated from the sweep",
    )


Values = TypeVar("Values", FloatArray, ComplexArray)


def _contrast(values: Values, weights: FloatArray) -> Values:
    """Weighted sums of three neighbours along the first axis, shape (n − 2, …)."""
    return np.asarray(values[:-2] * weights[0] + values[1:-1] * weights[1] + values[2:] * weights[2])


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
        variances = _gamma_regression(observed[keep], design[keep], start=variances)
    return variances


def _gamma_regression(
    observed: FloatArray, design: FloatArray, *, start: FloatArray | None = None, tolerance: float = SETTLED
) -> FloatArray:
    """Coefficients θ ≥ 0 by maximum likelihood for exponential values with means `design` @ θ.

    Iteratively reweighted least squares, each within θ ≥ 0, and Newton's method near the end; a step that would lower
    the likelihood is halved.
    """
    scale = design.max(axis=0)
    level = float(observed.mean())
    if not level > 0:
        return np.zeros(design.shape[1])
    columns, target = np.ascontiguousarray((design / scale).T), np.maximum(observed / level, TINY)
    if start is None:
        # Each component explains what is largest in its own stretch of the band, to begin with.
        weights = (columns / columns.max(axis=0)) ** 2
        now = product(weights.T, target) / weights.sum(axis=1)
    else:
        now = start * scale / level
    means = now @ columns
    worth = _log_likelihood(target, means)
    for step in range(MOST_STEPS):
        found = None
        if step >= EXPECTED_STEPS:
            found = _upwards(
                target, columns, now, worth, towards=_towards_by_newton(target, columns, means, now), most=1
            )
        if found is None:
            towards = _towards_by_scoring(target, columns, means, now)
            found = _upwards(target, columns, now, worth, towards=towards, most=HALVINGS)
        if found is None:
            break
        before = means
        now, means, worth = found
        if np.abs(means / before - 1).max() <= tolerance:
            break
    return np.asarray(now * level / scale, dtype=float)


def _log_likelihood(target: FloatArray, means: FloatArray) -> float:
    """But for a constant."""
    return -float((target / means + np.log(means)).sum()) if means.min() > 0 else -math.inf


def _upwards(
    target: FloatArray, columns: FloatArray, now: FloatArray, worth: float, *, towards: FloatArray | None, most: int
) -> tuple[FloatArray, FloatArray, float] | None:
    """A point on the way that is at least as likely, with its means and likelihood; None after `most` trials."""
    if towards is None:
        return None
    for halvings in range(most):
        better = now + (towards - now) * 0.5**halvings if halvings else towards
        means = better @ columns
        likelihood = _log_likelihood(target, means)
        if likelihood >= worth:
            return better, means, likelihood
    return None


def _towards_by_scoring(
    target: FloatArray, columns: FloatArray, means: FloatArray, now: FloatArray
) -> FloatArray | None:
    """Fisher's scoring: least squares weighted by the present means, within θ ≥ 0."""
    weighted = columns / means
    information = product(weighted.T, weighted.T)
    score = product(weighted.T, target / means)
    if not np.isfinite(information).all():
        return None
    information.flat[:: len(now) + 1] *= 1 + RIDGE
    free = np.ones(len(now), dtype=bool)
    answer = np.linalg.solve(information, score)
    while free.any() and (answer[free] < 0).any():
        free &= answer >= 0
        answer = np.zeros(len(now))
        answer[free] = np.linalg.solve(information[free][:, free], score[free])
    # A component that was dropped too early would be wanted back.
    if (score - information @ answer)[~free].max(initial=0.0) > 0:
        from scipy.optimize import nnls

        triangle = np.linalg.cholesky(information)
        answer = nnls(triangle.T, np.linalg.solve(triangle, score))[0]
    return np.asarray(answer, dtype=float)


def _towards_by_newton(
    target: FloatArray, columns: FloatArray, means: FloatArray, now: FloatArray
) -> FloatArray | None:
    """Newton's method for the components that are not held at 0."""
    ratio = target / means
    weighted = columns / means
    gradient = product(weighted.T, 1 - ratio)
    free = (now > 0) | (gradient < 0)
    curvature = product((weighted * (2 * ratio - 1)).T, weighted.T)
    try:
        step = np.linalg.solve(curvature[free][:, free], gradient[free])
    except np.linalg.LinAlgError:
        return None
    better = now.copy()
    better[free] -= step
    return np.maximum(better, 0.0)


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
