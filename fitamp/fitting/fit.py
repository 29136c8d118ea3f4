"""The fit of one sweep: start, noise, solution, intervals, and what has to be said about them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.errors import FitError
from fitamp.estimate import NOT_KNOWN, Estimate, two_sided_95
from fitamp.fitting.adequacy import judge
from fitamp.fitting.derive import (
    ZERO,
    fitted_factor_roots,
    fitted_margins,
    fitted_parameters,
    fitted_range_steps,
    fitted_roots,
)
from fitamp.fitting.factors import Doublet, FurtherPole, Resonance
from fitamp.fitting.finding import HOPELESS_SCATTER, found_by
from fitamp.fitting.intervals import RISE_95, estimate_by_curvature, hull, is_excluded
from fitamp.fitting.result import LoopFit
from fitamp.fitting.search import Search, lifted
from fitamp.fitting.statements import place_of_zero, small_zero_time_s, warnings_of
from fitamp.fitting.two_pole import DelayPrior, FarPoleCurve, FarPolePrior, Pole2Prior, Solution, solution_at
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = ["MIN_POINTS", "fit_sweep"]

# Four parameters and three noise levels out of two numbers a point, with something left to judge the fit by.
MIN_POINTS = 12
# A fit whose residuals are this large against the response does not describe the sweep at all.
UNLIKE_LOOP = 0.3
# A loop gain whose largest magnitude is so many times that at DC (a resonance is allowed) has no two poles and a zero.
RISES = 1 / 30
# So many standard errors from 0 the misfit at 0 is large too, though a quartic valley makes it a quarter of what the
# curvature promises.
CURVED_SIGMA = 10.0
# An interval that is not known to end before a small zero time reaches at least so much farther.
BEYOND_SMALL = 1.01


def fit_sweep(
    sweep: Sweep,
    *,
    noise: NoiseLevels | None = None,
    far_pole: FarPolePrior | FarPoleCurve | None = None,
    delay: DelayPrior | None = None,
    pole2: Pole2Prior | None = None,
    known: Transfer | None = None,
    keep_all: bool = False,
) -> LoopFit:
    """Fit two poles and one zero to a loop-gain sweep.

    Parameters
    ----------
    sweep
        At least 12 points; loop gain positive real at DC.
    noise
        Noise levels; estimated from the sweep's own scatter where neither this nor ``sweep.noise`` is given.
    far_pole, delay
        What is known of a third pole's time and of the path delay. Where one is given, the other is unknown, and so
        free, unless it is given, too (`FarPolePrior()` and `DelayPrior()` stand for none). Without either both are
        taken as 0 unless the sweep cannot be described so and can with one of them free; the half plane of the zero is
        stated only as far as it holds whatever they are.
    pole2
        Rough knowledge of pole 2. It chooses between a pole 2 and a doublet that only looks like one; what comes from
        it alone is not called measured.
    known
        A factor of the chip's loop gain known beforehand (a mirror pole-zero pair, say); its DC gain must be 1. Margins
        include it, poles and zeros do not.
    keep_all
        Keep points that stand apart from their neighbours (glitches, mains lines). Otherwise they are left out and
        listed in the ``left_out`` of the result's sweep.

    Returns
    -------
    LoopFit

    Raises
    ------
    FitError
        When there are too few points, no start converges, or the sweep is nothing like a two-pole loop.
    """
    if len(sweep) < MIN_POINTS:
        raise FitError(
            f"{sweep.origin.file}: {len(sweep)} usable points, a fit needs {MIN_POINTS}; take a denser or wider sweep"
        )
    _check_points(sweep)
    noise = noise or sweep.noise
    lag_is_known = far_pole is not None or delay is not None
    search = Search(sweep=sweep, noise=noise, known=known, delay_s=delay.mean_s if delay else 0.0, pole2=pole2)
    # A start that overflows loses by its chi-square; that is no news.
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        found = found_by(search, far_pole, delay, keep_all=keep_all, fewest=MIN_POINTS)
    sweep, solution, any_lag = found.sweep, found.solution, found.any_lag
    _check_likeness(sweep, solution)
    adequacy = judge(solution, sweep.freq_hz)
    # The noise comes from about as many second differences as there are points.
    quantile = two_sided_95(_degrees_of_freedom(sweep, noise))
    parameters = fitted_parameters(solution, sweep, adequacy, quantile)
    if not parameters.gain_bandwidth_hz.is_measured:
        raise FitError(
            f"{sweep.origin.file}: the sweep does not show where the loop gain falls, not even a gain-bandwidth "
            "product; check that the columns hold loop gain, or sweep higher"
        )
    covariance = solution.covariance * adequacy.inflation
    poles, zeros = fitted_roots(solution, covariance)
    resonant_poles, resonant_zeros = fitted_factor_roots(solution, covariance, Resonance)
    doublet_poles, doublet_zeros = fitted_factor_roots(solution, covariance, Doublet)
    margins = fitted_margins(solution, covariance, quantile, known)
    # With priors the lag is in the estimate already; without, what may be said must hold for any.
    strict = parameters.zero_time_s
    if not lag_is_known:
        strict = _whatever_the_lag(
            any_lag,
            solution,
            parameters.zero_time_s,
            sweep,
            quantile=quantile,
            small_s=small_zero_time_s(parameters, margins),
        )
    fit = LoopFit(
        sweep=sweep,
        response=solution.model.whole_response(solution.values),
        parameters=parameters,
        zero=place_of_zero(parameters, margins, strict, adequacy),
        poles=poles,
        zeros=zeros,
        resonant_poles=resonant_poles,
        resonant_zeros=resonant_zeros,
        doublet_poles=doublet_poles,
        doublet_zeros=doublet_zeros,
        further_poles=fitted_factor_roots(solution, covariance, FurtherPole)[0],
        range_steps=fitted_range_steps(solution, covariance, quantile),
        margins=margins,
        adequacy=adequacy,
        warnings=(),
        solution=solution,
        quantile=quantile,
    )
    return replace(fit, warnings=warnings_of(fit, None if lag_is_known else strict))


def _degrees_of_freedom(sweep: Sweep, noise: NoiseLevels | None) -> float:
    """How well the noise is known: from second differences, from the differences of repeats, or stated."""
    if noise is None:
        return len(sweep) - 5
    return 2 * len(sweep) * (noise.repeats - 1) - 4 if noise.repeats > 1 else 1e9


def _whatever_the_lag(
    any_lag: Solution | None, solution: Solution, zero_time: Estimate, sweep: Sweep, *, quantile: float, small_s: float
) -> Estimate:
    """Zero time with third pole and delay free; undetermined where that has no solution or an inadequate one.

    A zero far out and a delay act alike to first order: near there the curvature says nothing, and refits have to.
    That valley has branches; the one in which `solution` lies belongs to the interval if it is as good.
    """
    if any_lag is None or not (any_lag.optimum.converged and judge(any_lag).adequate):
        return NOT_KNOWN
    model = any_lag.model

    def quantity(values: FloatArray) -> float:
        return model.physical(values)[3]

    strict = estimate_by_curvature(quantity, any_lag.values, any_lag.covariance, quantile=quantile, positive=False)
    if strict.value is None or strict.stderr is None or abs(strict.value) < CURVED_SIGMA * strict.stderr:
        strict = _as_far_as_asked(strict, any_lag, sweep, small_s)
    without = solution_at(model, sweep, any_lag.noise, lifted(solution, model))
    as_good = without.optimum.chi_square < any_lag.optimum.chi_square + RISE_95
    return hull(strict, zero_time) if as_good else strict


def _as_far_as_asked(curved: Estimate, any_lag: Solution, sweep: Sweep, small_s: float) -> Estimate:
    """Zero time with an interval that is right about 0 and about ±`small_s`, which are all that is asked of it.

    In a valley that bends, a whole profile takes hundreds of steps for every point, most of them where nothing depends
    on it.
    """
    if curved.value is None or curved.stderr is None:
        return NOT_KNOWN
    scale_s, value_s = any_lag.model.time_s, curved.value
    low_s, high_s = curved.ci95
    assert low_s is not None
    assert high_s is not None
    if is_excluded(any_lag, sweep, ZERO, 0.0):
        low_s, high_s = (max(low_s, 0.0), high_s) if value_s > 0 else (low_s, min(high_s, 0.0))
        return Estimate(value=value_s, stderr=curved.stderr, ci95=(low_s, high_s))
    ends_s = []
    for side, own_s in ((-1, low_s), (1, high_s)):
        inside = abs(value_s) < small_s and is_excluded(any_lag, sweep, ZERO, side * small_s / scale_s)
        ends_s.append(side * (small_s if inside else max(side * own_s, BEYOND_SMALL * small_s)))
    stderr = (ends_s[1] - ends_s[0]) / (2 * np.sqrt(RISE_95))
    return Estimate(value=value_s, stderr=float(stderr), ci95=(ends_s[0], ends_s[1]))


def _check_points(sweep: Sweep) -> None:
    """Refuse a loop gain that is nothing, or exactly −1 somewhere, for which no closed loop exists."""
    if not sweep.gain.any():
        raise FitError(f"{sweep.origin.file}: the loop gain is 0 throughout; check that the columns hold loop gain")
    singular = sweep.gain == -1
    if singular.any():
        raise FitError(
            f"{sweep.origin.file}: loop gain is exactly -1 at {sweep.freq_hz[np.argmax(singular)]:g} Hz, where the "
            "closed loop has no value; leave the point out"
        )


def _check_likeness(sweep: Sweep, solution: Solution) -> None:
    """Refuse where even the closed loop is missed by a large part of its size."""
    fitted = solution.model.gain(solution.values, sweep.freq_hz)
    closed, closed_fit = sweep.gain / (1 + sweep.gain), fitted / (1 + fitted)
    miss = float(np.median(np.abs(closed - closed_fit) / np.maximum(np.abs(closed), 1e-12)))
    g, q, *_ = solution.model.physical(solution.values)
    # Of the fit, not of the data: where the error receiver drowns, single readings may be as large as they like.
    if g < RISES * q * float(np.abs(fitted).max()):
        raise FitError(
            f"{sweep.origin.file}: the magnitude rises from DC, as no loop gain of this kind does; check that the "
            "columns hold loop gain"
        )
    if solution.noise.relative > HOPELESS_SCATTER:
        raise FitError(
            f"{sweep.origin.file}: from point to point the loop gain scatters by {solution.noise.relative:.0%}, "
            "which is no noise to fit through; take a denser or quieter sweep, and check the columns"
        )
    if miss < UNLIKE_LOOP and not solution.optimum.converged:
        raise FitError(
            f"{sweep.origin.file}: the fit comes near but does not settle, because the band leaves too much open; "
            "state what is known (a design file, the delay), or sweep wider"
        )
    if not miss < UNLIKE_LOOP:
        raise FitError(
            f"{sweep.origin.file}: two poles and a zero do not describe this sweep (typical miss {miss:.0%} of the "
            "closed-loop response); check that the columns hold loop gain, and the band"
        )
