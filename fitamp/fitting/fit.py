"""The fit of one sweep: start, noise, solution, intervals, and what has to be said about them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from fitamp.errors import FitError
from fitamp.estimate import Estimate, two_sided_95
from fitamp.fitting.adequacy import Adequacy, judge
from fitamp.fitting.derive import fitted_margins, fitted_parameters, fitted_roots
from fitamp.fitting.result import LoopFit
from fitamp.fitting.start import Start, starts
from fitamp.fitting.statements import place_of_zero, warnings_of
from fitamp.fitting.two_pole import DelayPrior, FarPolePrior, Solution, TwoPole, solve
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = ["MIN_POINTS", "fit_sweep"]

# Four parameters and three noise levels out of two numbers a point, with something left to judge the fit by.
MIN_POINTS = 12
NOISE_ROUNDS = 3
# A fit whose residuals are this large against the response does not describe the sweep at all.
UNLIKE_LOOP = 0.3


def fit_sweep(
    sweep: Sweep,
    *,
    noise: NoiseLevels | None = None,
    far_pole: FarPolePrior | None = None,
    delay: DelayPrior | None = None,
    known: Transfer | None = None,
) -> LoopFit:
    """Fit two poles and one zero to a loop-gain sweep.

    Parameters
    ----------
    sweep
        At least 12 points; loop gain positive real at DC.
    noise
        Noise levels; estimated from the sweep's own scatter where neither this nor ``sweep.noise`` is given.
    far_pole, delay
        What is known of a third pole's time and of the path delay. Without them both are taken as 0 in the estimates,
        and the half plane of the zero is stated only as far as it holds whatever they are.
    known
        A factor of the chip's loop gain known beforehand (a mirror pole-zero pair, say); its DC gain must be 1. Margins
        include it, poles and zeros do not.

    Returns
    -------
    LoopFit

    Raises
    ------
    FitError
        When there are too few points, no start converges, or the sweep is nothing like a two-pole loop.
    """
    name = sweep.origin.file
    if len(sweep) < MIN_POINTS:
        raise FitError(f"{name}: {len(sweep)} usable points, a fit needs {MIN_POINTS}; take a denser or wider sweep")
    noise = noise or sweep.noise
    solution = _best_plain(sweep, noise, known, far_pole, delay)
    if far_pole is not None or delay is not None:
        model = replace(solution.model, far_pole=far_pole or FarPolePrior(), delay=delay or DelayPrior())
        solution = _converge(model, sweep, noise, _lifted(model, solution))
    _check_likeness(sweep, solution)
    adequacy = judge(solution)
    # The noise comes from about as many second differences as there are points.
    quantile = two_sided_95(1e9 if noise else len(sweep) - 5)
    parameters = fitted_parameters(solution, sweep, adequacy, quantile)
    covariance = solution.covariance * adequacy.inflation
    poles, zeros = fitted_roots(solution, covariance)
    free_of_lag = None
    if far_pole is None and delay is None:
        free_of_lag = _zero_time_with_any_lag(sweep, solution, adequacy, quantile)
    margins = fitted_margins(solution, covariance, quantile, known)
    return LoopFit(
        sweep=sweep,
        response=solution.model.response(solution.values),
        parameters=parameters,
        zero=place_of_zero(parameters, free_of_lag),
        poles=poles,
        zeros=zeros,
        margins=margins,
        adequacy=adequacy,
        warnings=warnings_of(sweep, parameters, margins, adequacy, free_of_lag),
        solution=solution,
        quantile=quantile,
    )


def _best_plain(
    sweep: Sweep,
    noise: NoiseLevels | None,
    known: Transfer | None,
    far_pole: FarPolePrior | None,
    delay: DelayPrior | None,
) -> Solution:
    """The best of all starts, third pole and delay held at what is expected of them."""
    ends: list[Solution] = []
    common = noise
    for start in starts(sweep):
        held_far_pole = FarPolePrior()
        if far_pole is not None:
            held_far_pole = FarPolePrior(
                intercept_s=max(far_pole.intercept_s + far_pole.slope * start.zero_time_s, 0.0)
            )
        model = TwoPole(
            time_s=_time_scale(start, sweep),
            known=known,
            far_pole=held_far_pole,
            delay=DelayPrior(mean_s=delay.mean_s if delay else 0.0),
        )
        values = model.vector(g=start.g, q=start.q, b=start.b, zero_time_s=start.zero_time_s)
        if common is None:
            common = estimate_noise(sweep, model.gain(values, sweep.freq_hz))
        end = solve(model, sweep, common, values)
        if end.optimum.converged and np.isfinite(end.values).all():
            ends.append(end)
    if not ends:
        raise FitError(
            f"{sweep.origin.file}: no start converged to two poles and a zero; look at the sweep with `fitamp read`"
        )
    best = min(ends, key=lambda end: end.optimum.chi_square)
    return _converge(best.model, sweep, noise, best.values)


def _converge(model: TwoPole, sweep: Sweep, noise: NoiseLevels | None, values: np.ndarray) -> Solution:
    """Alternate noise and fit, or fit once where the noise is given."""
    if noise is not None:
        return solve(model, sweep, noise, values)
    solution = None
    for _ in range(NOISE_ROUNDS):
        estimated = estimate_noise(sweep, model.gain(values, sweep.freq_hz))
        solution = solve(model, sweep, estimated, values)
        values = solution.values
    assert solution is not None
    return solution


def _lifted(model: TwoPole, solution: Solution) -> np.ndarray:
    """The plain solution as a start for a model with more free parameters."""
    g, q, b, zero_time_s, *_ = solution.model.physical(solution.values)
    return model.vector(g=g, q=q, b=b, zero_time_s=zero_time_s)


def _time_scale(start: Start, sweep: Sweep) -> float:
    """Time by which τz is scaled: 1/pole 2 of the start, kept within sight of the band."""
    top = 1 / (2 * np.pi * sweep.f_max_hz)
    return float(np.clip(start.b, 0.01 * top, 1 / (2 * np.pi * sweep.f_min_hz)))


def _zero_time_with_any_lag(sweep: Sweep, plain: Solution, adequacy: Adequacy, quantile: float) -> Estimate:
    """Zero time with the third pole and the delay free and nothing known of either."""
    model = replace(plain.model, far_pole=FarPolePrior(sd_s=np.inf), delay=DelayPrior(sd_s=np.inf))
    free = solve(model, sweep, plain.noise, _lifted(model, plain))
    spread = float(np.sqrt(free.covariance[3, 3] * adequacy.inflation)) * model.time_s
    return Estimate.gaussian(model.physical(free.values)[3], spread, quantile=quantile)


def _check_likeness(sweep: Sweep, solution: Solution) -> None:
    """Refuse where even the closed loop is missed by a large part of its size."""
    fitted = solution.model.gain(solution.values, sweep.freq_hz)
    closed, closed_fit = sweep.gain / (1 + sweep.gain), fitted / (1 + fitted)
    miss = float(np.median(np.abs(closed - closed_fit) / np.maximum(np.abs(closed), 1e-12)))
    if not (solution.optimum.converged and miss < UNLIKE_LOOP):
        raise FitError(
            f"{sweep.origin.file}: two poles and a zero do not describe this sweep (typical miss {miss:.0%} of the "
            "closed-loop response); check that the columns hold loop gain, and the band"
        )
