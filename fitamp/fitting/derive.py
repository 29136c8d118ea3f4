"""From a solution to estimates: gain, poles, zero time, roots with their covariance, margins."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray, frozen_float
from fitamp.estimate import Estimate, Known
from fitamp.fitting.adequacy import Adequacy
from fitamp.fitting.factors import Factor, RangeStep
from fitamp.fitting.intervals import (
    Profile,
    estimate_by_profile,
    estimates_by_curvature,
    estimates_by_slopes,
    gradient,
    profile,
)
from fitamp.fitting.result import FittedMargins, FittedParameters, FittedStep, Root
from fitamp.fitting.root_slopes import pole_slopes, quantity_slopes, zero_slopes
from fitamp.fitting.two_pole import Solution, TwoPole
from fitamp.sweep import Sweep
from fitamp.transfer import Transfer
from fitamp.vicinity import Vicinity

__all__ = ["fitted_factor_roots", "fitted_margins", "fitted_parameters", "fitted_range_steps", "fitted_roots"]

# Above this standard deviation of a logarithm the likelihood is no longer near-quadratic and is profiled.
QUADRATIC_LN = 0.15
DB_PER_NEPER = 20 / math.log(10)
LN_Q, LN_B, ZERO = 1, 2, 3
DC_GAIN, POLE1, POLE2, ZERO_TIME = 0, 2, 3, 4  # among `_quantities`
# An error no smaller than this share of the prior's is the prior, not a measurement.
HANDED_BACK = 0.5

RootFinder = Callable[[TwoPole, FloatArray], tuple[complex, ...]]


def fitted_parameters(solution: Solution, sweep: Sweep, adequacy: Adequacy, quantile: float) -> FittedParameters:
    """Estimate every quantity of the model; bounds where the band cannot tell."""
    model = solution.model
    covariance = solution.covariance * adequacy.inflation
    deviations = np.sqrt(np.diag(covariance))

    def profiled(index: int) -> Profile:
        return profile(solution, sweep, index, inflation=adequacy.inflation)

    def extra(name: str, held_s: float) -> Estimate:
        return _extra(name, held_s, solution=solution, deviations=deviations, quantile=quantile, profiled=profiled)

    def quantity(index: int) -> Callable[[FloatArray], float | None]:
        return lambda values: _quantities(model, values)[index]

    found = _quantities(model, solution.values)
    gain, gain_bandwidth, first, second, zero, split = estimates_by_slopes(
        found,
        quantity_slopes(
            model, solution.values, dc_gain=found[DC_GAIN] or 0.0, poles_hz=_sorted_poles(model, solution.values)
        ),
        covariance,
        quantile=quantile,
        positive=(True, True, True, True, False, False),
    )
    if deviations[LN_Q] > QUADRATIC_LN:
        edges = profiled(LN_Q)
        gain = estimate_by_profile(quantity(DC_GAIN), solution, edges, rising=False)
        first = estimate_by_profile(quantity(POLE1), solution, edges, rising=True)
    if deviations[LN_B] > QUADRATIC_LN:
        second = estimate_by_profile(quantity(POLE2), solution, profiled(LN_B), rising=False)
    if model.pole2 is not None and deviations[LN_B] > HANDED_BACK * model.pole2.ln_sd:
        second = Estimate(value=None, stderr=None, ci95=second.ci95, known=Known.UNDETERMINED)
    # A delay and a far-out zero act alike to first order: with a lag that nothing else holds, curvature is no guide.
    unbounded_lag = math.inf in {model.delay.sd_s, model.far_pole.sd_s}
    if deviations[LN_B] > QUADRATIC_LN or unbounded_lag:
        zero = estimate_by_profile(quantity(ZERO_TIME), solution, profiled(ZERO), rising=True)
    return FittedParameters(
        dc_gain=gain,
        gain_bandwidth_hz=gain_bandwidth,
        pole1_hz=first,
        pole2_hz=second,
        zero_time_s=zero,
        delay_s=extra("delay", model.delay.mean_s),
        far_pole_s=extra("far_pole", model.far_pole.intercept_s),
        zero_pole2_split_s=split,
    )


def fitted_roots(solution: Solution, covariance: FloatArray) -> tuple[tuple[Root, ...], tuple[Root, ...]]:
    """Poles and zeros of the fitted response, each with the covariance of (re, im) where its error is not larger."""
    model, values = solution.model, solution.values
    poles, zeros = _sorted_poles(model, values), model.response(values).zeros_hz
    return (
        _with_errors(poles, pole_slopes(model, values, poles), covariance),
        _with_errors(zeros, zero_slopes(model, values, zeros), covariance),
    )


def fitted_factor_roots(
    solution: Solution, covariance: FloatArray, kind: type[Factor]
) -> tuple[tuple[Root, ...], tuple[Root, ...]]:
    """Poles and zeros of the further factors of one kind, the upper half of a pair first, with their covariances."""

    def roots_of(which: int, side: int) -> RootFinder:
        def roots(model: TwoPole, values: FloatArray) -> tuple[complex, ...]:
            found = model.factors[which].roots_hz(model.factor_values(values)[which])[side]
            return tuple(sorted(found, key=lambda root: -root.imag))

        return roots

    model, values = solution.model, solution.values
    chosen = [index for index, factor in enumerate(model.factors) if isinstance(factor, kind)]
    poles, zeros = (
        tuple(root for which in chosen for root in _roots(model, values, covariance, roots_of(which, side)))
        for side in range(2)
    )
    return poles, zeros


def fitted_range_steps(solution: Solution, covariance: FloatArray, quantile: float) -> tuple[FittedStep, ...]:
    """Steps of a receiver's range that were fitted, with the error of their size."""
    model = solution.model
    found = []
    for index, factor in enumerate(model.factors):
        if not isinstance(factor, RangeStep):
            continue
        first = model.names.index(f"factor{index}_{factor.parts[0]}")
        size, turn = (
            Estimate.gaussian(
                float(solution.values[at]) * unit, math.sqrt(float(covariance[at, at])) * unit, quantile=quantile
            )
            for at, unit in ((first, DB_PER_NEPER), (first + 1, math.degrees(1)))
        )
        found.append(FittedStep(f_hz=factor.f_hz, size_db=size, turn_deg=turn))
    return tuple(found)


def fitted_margins(
    solution: Solution, covariance: FloatArray, quantile: float, extra: Transfer | None = None
) -> FittedMargins:
    """Margins and closed-loop step of the fitted response, times `extra` (the chip's own known factor) where given."""
    model = solution.model

    def loop(values: FloatArray) -> Transfer:
        response = model.whole_response(values)
        return response if extra is None else response.cascade(extra)

    vicinity = Vicinity(response=loop(solution.values))

    def quantities(values: FloatArray) -> tuple[float | None, ...]:
        found = vicinity.figures(loop(values))
        return (found.crossover_hz, found.phase_margin_deg, found.gain_margin_db, found.overshoot, found.settling_s)

    crossover, phase_margin, gain_margin, overshoot, settling = estimates_by_curvature(
        quantities, solution.values, covariance, quantile=quantile, positive=(True, False, False, False, True)
    )
    return FittedMargins(
        crossover_hz=crossover,
        phase_margin_deg=phase_margin,
        gain_margin_db=gain_margin,
        overshoot=_not_negative(overshoot),
        settling_s=settling,
    )


def _not_negative(estimate: Estimate) -> Estimate:
    low, high = estimate.ci95
    if low is None or high is None:
        return estimate
    return Estimate(value=estimate.value, stderr=estimate.stderr, ci95=(max(low, 0.0), high), known=estimate.known)


def _extra(
    name: str,
    held_s: float,
    *,
    solution: Solution,
    deviations: FloatArray,
    quantile: float,
    profiled: Callable[[int], Profile],
) -> Estimate:
    """A nuisance parameter: held at its value, estimated under its prior, or, without one, by its profile."""
    model = solution.model
    if name not in model.names:
        return Estimate(value=held_s, stderr=None, ci95=(None, None))
    index = model.names.index(name)
    prior_s = model.delay.sd_s if name == "delay" else model.far_pole.sd_s
    if prior_s == math.inf:
        return estimate_by_profile(lambda v: float(v[index]) * model.time_s, solution, profiled(index), rising=True)
    return Estimate.gaussian(
        float(solution.values[index] * model.time_s),
        float(deviations[index] * model.time_s),
        quantile=quantile,
    )


def _sorted_poles(model: TwoPole, values: FloatArray) -> tuple[complex, ...]:
    try:
        response = model.response(values)
    except (ValueError, ArithmeticError):
        # Far out on a profile a coefficient can leave the range of floats: no response is left there.
        return ()
    return tuple(sorted(response.poles_hz, key=lambda pole: (abs(pole), pole.imag)))


def _quantities(model: TwoPole, values: FloatArray) -> tuple[float | None, ...]:
    """T(0), gain-bandwidth, pole 1 and pole 2 (Hz), zero time and the split τz − a2/a1 (s)."""
    g, q, b, zero_time_s, *_ = model.physical(values)
    first, second, *_ = (*(abs(pole) for pole in _sorted_poles(model, values)), None, None)
    dc_gain = g / q if q else None
    gain_bandwidth_hz = None if first is None or dc_gain is None else dc_gain * first
    return dc_gain, gain_bandwidth_hz, first, second, zero_time_s, zero_time_s - b


def _roots(model: TwoPole, values: FloatArray, covariance: FloatArray, roots: RootFinder) -> tuple[Root, ...]:
    """Roots with their errors by differences."""
    found = roots(model, values)
    if not found:
        return ()

    def parts(vector: FloatArray) -> list[float | None]:
        near = [part for root in roots(model, vector) for part in (root.real, root.imag)]
        return [*near, *[None] * (2 * len(found))][: 2 * len(found)]

    slopes = gradient(parts, values)
    return _with_errors(found, slopes[0::2] + 1j * slopes[1::2], covariance)


def _with_errors(roots: Sequence[complex], slopes: ComplexArray, covariance: FloatArray) -> tuple[Root, ...]:
    """Each root with the covariance of (re, im), where its error is not larger than itself."""
    found = []
    for root, slope in zip(roots, slopes, strict=True):
        parts = np.stack([slope.real, slope.imag])
        with np.errstate(all="ignore"):
            spread = parts @ covariance @ parts.T
        # No number where there is no derivative; below 0 by rounding of a huge variance: the root is there, its error
        # is not.
        known = 0 <= np.trace(spread) < abs(root) ** 2
        found.append(Root(value_hz=root, covariance=frozen_float(spread) if known else None))
    return tuple(found)
