"""The comparison table: each quantity designed, designed seen as measured, measured, and against its limit."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.comparison.result import Route, Row, Verdict, Window
from fitamp.design import Design
from fitamp.estimate import Estimate, Known
from fitamp.fitting import LoopFit
from fitamp.margins import margins

__all__ = [
    "QUANTITIES",
    "comparison_rows",
    "designed_poles_hz",
    "designed_values",
    "deviation_from",
    "is_far_beyond",
    "is_inside",
    "limits_on",
    "pole2_may_be_hidden",
]

QUANTITIES = (
    "dc_gain",
    "gain_bandwidth_hz",
    "pole1_hz",
    "pole2_hz",
    "zero_time_s",
    "crossover_hz",
    "phase_margin_deg",
    "gain_margin_db",
)
# Already relative or logarithmic: their deviation is a difference, not a ratio.
BY_DIFFERENCE = frozenset({"phase_margin_deg", "gain_margin_db"})
# No spread of elements and no forgotten probe moves pole 2 so far; a zero on pole 2 seems to.
HIDDEN_POLE_RATIO = 4.0
# What a sweep does not see is varied by no more than this, of parameters of order 1.
FARTHEST_STEP = 1.0


def designed_poles_hz(design: Design) -> tuple[float, ...]:
    """Distances of the designed poles on the bench, the nearest first."""
    # A mirror pole is no pole of the compensation, however low it lies.
    mirror_hz = design.elements.mirror_pole_hz if design.elements is not None else None
    return tuple(sorted(abs(pole) for pole in design.on_bench().poles_hz if mirror_hz is None or pole != -mirror_hz))


def pole2_may_be_hidden(fit: LoopFit, design: Design) -> bool:
    """Whether what was found as pole 2 may be the third pole, with the zero on the true pole 2."""
    pole2_hz = fit.parameters.pole2_hz.value
    return pole2_hz is not None and is_far_beyond(pole2_hz, design)


def is_far_beyond(pole2_hz: float, design: Design) -> bool:
    """Whether a second pole lies farther out than elements can move it."""
    return pole2_hz > HIDDEN_POLE_RATIO * designed_poles_hz(design)[1]


def designed_values(design: Design) -> dict[str, float | None]:
    """The exact designed value of every quantity, from all roots of the design (with the bench's load)."""
    response = design.on_bench()
    # The loop's own delay costs phase margin on the chip; the cable's does not.
    seen = margins(replace(response, delay_s=design.transfer().delay_s))
    poles = designed_poles_hz(design)
    return {
        "dc_gain": response.dc_gain,
        "gain_bandwidth_hz": response.gain_bandwidth_hz,
        "pole1_hz": poles[0],
        "pole2_hz": poles[1],
        "zero_time_s": design.zero_time_s,
        "crossover_hz": seen.crossover_hz,
        "phase_margin_deg": seen.phase_margin_deg,
        "gain_margin_db": seen.gain_margin_db,
    }


def measured_values(fit: LoopFit) -> dict[str, Estimate]:
    """The measured counterpart of every quantity."""
    return dict((*fit.parameters.items(), *fit.margins.items()))


def comparison_rows(
    fit: LoopFit,
    designed_fit: LoopFit | None,
    design: Design,
    window: Window,
    *,
    trusted: bool = True,
    verdict: Verdict | None = None,
) -> tuple[Row, ...]:
    """One row a quantity, in a fixed order; of a fit that is not trusted none is said to be inside or outside.

    verdict : whose zero time is the one that counts; the fit's where None
    """
    exact, measured = designed_values(design), measured_values(fit)
    as_measured = (
        {} if designed_fit is None else {name: one.value for name, one in measured_values(designed_fit).items()}
    )
    sure = {name for name in QUANTITIES if trusted}
    if verdict is not None:
        measured["zero_time_s"] = verdict.zero_time_s
    if verdict is not None and verdict.route is Route.CIRCUIT:
        # The circuit is exact, and measures the designed zero as designed.
        as_measured["zero_time_s"] = design.zero_time_s
        sure.add("zero_time_s")
    rows = []
    for quantity in QUANTITIES:
        reference = as_measured.get(quantity)
        low, high = limits_on(quantity, design, window)
        estimate = measured[quantity]
        deviation, sigma = deviation_from(quantity, estimate, reference)
        if quantity == "zero_time_s" and abs(reference or 0.0) <= design.small_zero_time_s:
            deviation = None  # percents of next to nothing say nothing
        rows.append(
            Row(
                quantity=quantity,
                designed=exact[quantity],
                designed_as_measured=reference,
                measured=estimate,
                deviation=deviation,
                sigma=sigma,
                low=low,
                high=high,
                inside=_is_inside(fit, quantity, estimate, low, high) if quantity in sure else None,
            )
        )
    return tuple(rows)


def limits_on(quantity: str, design: Design, window: Window) -> tuple[float | None, float | None]:
    """Limits on a quantity; of the zero time its window."""
    if quantity == "zero_time_s":
        return window.low_s, window.high_s
    limit = design.limits.get(quantity)
    return (None, None) if limit is None else (limit.low, limit.high)


def deviation_from(quantity: str, estimate: Estimate, reference: float | None) -> tuple[float | None, float | None]:
    """Deviation as a row has it, and in standard errors of the estimate."""
    if estimate.value is None or reference is None:
        return None, None
    difference = estimate.value - reference
    sigma = difference / estimate.stderr if estimate.stderr else None
    if quantity in BY_DIFFERENCE:
        return difference, sigma
    return (difference / abs(reference) if reference else None), sigma


def _is_inside(fit: LoopFit, quantity: str, estimate: Estimate, low: float | None, high: float | None) -> bool | None:
    if quantity != "gain_margin_db" or estimate.value is not None or (low is None and high is None):
        return is_inside(estimate, low, high)
    # Without a value the phase does not reach −180°, or not for sure; where it does not, the margin has no limit.
    start, end = -math.inf if low is None else low, math.inf if high is None else high
    found = {start <= margin_db <= end for margin_db in _gain_margins_db(fit)}
    return found.pop() if len(found) == 1 else None


def _gain_margins_db(fit: LoopFit) -> list[float]:
    """Gain margins of the fitted loop and of those about it that its errors leave open; infinite without a crossing.

    Those are the ends of the axes of the 95 % ellipsoid of the parameters.
    """
    model, values = fit.solution.model, fit.solution.values
    variances, axes = np.linalg.eigh(fit.covariance)
    steps: FloatArray = fit.quantile * np.sqrt(variances.clip(0)) * axes
    steps = steps * np.minimum(1.0, FARTHEST_STEP / np.maximum(np.abs(steps).max(axis=0), FARTHEST_STEP))
    found = []
    for vector in (values, *(values + sign * step for step in steps.T for sign in (1, -1))):
        loop = model.whole_response(vector)
        gain_margin_db = margins(loop if model.known is None else loop.cascade(model.known)).gain_margin_db
        found.append(math.inf if gain_margin_db is None else gain_margin_db)
    return found


def is_inside(estimate: Estimate, low: float | None, high: float | None) -> bool | None:
    """Whether an estimate is inside its limits; None where there are none, or its interval does not agree."""
    if (low is None and high is None) or estimate.known is Known.UNDETERMINED:
        return None
    start = float("-inf") if low is None else low
    end = float("inf") if high is None else high
    if estimate.is_within(start, end):
        return True
    return None if estimate.touches(start, end) else False
