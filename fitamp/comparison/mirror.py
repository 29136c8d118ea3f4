"""What an uncertain mirror pole adds to the uncertainty of a fit.

The pole of the current mirror and its zero are taken as designed in the fit. Their magnitude bends the response as a
zero or third pole would, so that a mirror pole 10 % off its place has moved τz by ten standard errors. The sweep is
fitted with the pole one standard deviation off to either side, and each quantity's shift is added to its error (JCGM
100:2008, sec. 5.1.3: an input estimated elsewhere).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import TypeVar

from fitamp.design import Design
from fitamp.estimate import Estimate
from fitamp.fitting import FittedMargins, FittedParameters, LoopFit
from fitamp.fitting.derive import fitted_margins, fitted_parameters
from fitamp.fitting.statements import place_of_zero
from fitamp.fitting.two_pole import solve
from fitamp.transfer import Transfer

__all__ = ["mirror_moved", "widened_by_mirror"]

QUANTILE = 1.96
Estimates = TypeVar("Estimates", FittedParameters, FittedMargins)


def mirror_moved(design: Design) -> tuple[Design, Design] | None:
    """The design with its mirror pole one standard deviation higher, and lower; None without an uncertain mirror."""
    if design.elements is None or design.elements.mirror_pole_hz is None:
        return None
    spread = design.spreads.get("mirror_pole_hz", 0.0)
    if not spread:
        return None
    pole_hz = design.elements.mirror_pole_hz
    # By a factor, so that a large spread keeps the pole positive.
    higher, lower = (
        replace(design, elements=replace(design.elements, mirror_pole_hz=pole_hz * factor))
        for factor in (1 + spread, 1 / (1 + spread))
    )
    return higher, lower


def widened_by_mirror(fit: LoopFit, known: Sequence[Transfer | None]) -> LoopFit:
    """The fit with every estimate's error widened by what moving the mirror pole does to it.

    known : the known factors of the moved designs
    """
    moved = [_moved(fit, factor) for factor in known]
    parameters = _widened(fit.parameters, [parameters for parameters, _ in moved])
    margins = _widened(fit.margins, [margins for _, margins in moved])
    zero = place_of_zero(parameters, margins, parameters.zero_time_s, fit.adequacy)
    return replace(fit, parameters=parameters, margins=margins, zero=zero)


def _moved(fit: LoopFit, known: Transfer | None) -> tuple[FittedParameters, FittedMargins]:
    """The same model with another known factor, from where the fit ended, under the same noise.

    A search of its own might put a pole or a resonance where the mirror is off its place; a change of noise would pass
    for an effect of the mirror.
    """
    model = replace(fit.solution.model, known=known)
    solution = solve(model, fit.sweep, fit.noise, fit.solution.values)
    covariance = solution.covariance * fit.adequacy.inflation
    return (
        fitted_parameters(solution, fit.sweep, fit.adequacy, fit.quantile),
        fitted_margins(solution, covariance, fit.quantile, known),
    )


def _widened(all_of: Estimates, others: Sequence[Estimates]) -> Estimates:
    moved = {
        name: _with_shift(estimate, [getattr(other, name) for other in others]) for name, estimate in all_of.items()
    }
    return replace(all_of, **moved)


def _with_shift(estimate: Estimate, others: Sequence[Estimate]) -> Estimate:
    """Ends moved outwards by the largest of the shifts, in quadrature; untouched where there is no value."""
    values = [moved.value for moved in others if moved.value is not None]
    if estimate.value is None or estimate.stderr is None or not values:
        return estimate
    value = estimate.value
    shift = max(abs(moved - value) for moved in values)
    low, high = estimate.ci95
    return Estimate(
        value=value,
        stderr=math.hypot(estimate.stderr, shift),
        ci95=(
            None if low is None else value - math.hypot(value - low, QUANTILE * shift),
            None if high is None else value + math.hypot(high - value, QUANTILE * shift),
        ),
        known=estimate.known,
    )
