"""Parasitic capacitance from fitted poles, by the circuit's exact algebra.

The fit gives b = a2/a1 (about 1/pole 2) and the zero time. With the design's gm2, Cc, C1, R1 and R2, and Rz from the
zero time, a2 − b·a1 is linear in CL: one division gives the whole load. Where the sweep itself shows the third pole,
a3/a2 gives the first stage's capacitance too.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import fields, replace

import numpy as np

from fitamp.amplifier import Elements, coefficients
from fitamp.arrays import FloatArray
from fitamp.comparison.expectation import NO_PRIOR_SPREAD, resistor_for
from fitamp.comparison.result import Parasitic
from fitamp.comparison.rows import pole2_may_be_hidden
from fitamp.comparison.verdict import nulling_product
from fitamp.design import Design
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting import LoopFit
from fitamp.units import si, si_with_error

__all__ = ["SEEN_BY_DATA", "load_sentence", "parasitics"]

ASSUMED_KNOWN = ("gm2", "Cc", "C1", "R1", "R2")
# The third pole counts as seen by the sweep when the data shrink its prior's variance to less than this.
SEEN_BY_DATA = 0.25
QUANTILE = 1.96
# So many standard errors below 0 a product that cannot be negative contradicts what it was computed with.
CLEARLY = 3.0
LN_B, ZERO = 2, 3

Solver = Callable[[Elements, FloatArray], FloatArray]


def parasitics(fit: LoopFit, design: Design) -> Parasitic | None:
    """Total load, load parasitic and first-stage parasitic; None for a design without elements."""
    if design.elements is None:
        return None
    if fit.parameters.pole2_hz.known is not Known.MEASURED or pole2_may_be_hidden(fit, design):
        return _untold("pole 2 is not determined by this band")
    if not fit.adequacy.adequate:
        return _untold("the model does not describe the sweep")
    gm2_rz = nulling_product(fit.parameters.zero_time_s, design)
    if gm2_rz.value is not None and gm2_rz.stderr is not None and gm2_rz.value < -CLEARLY * gm2_rz.stderr:
        return _untold("gm2·Rz comes out negative, so that gm2 or Cc is not as designed")
    load = _propagate(_load_alone, fit, design, ASSUMED_KNOWN)[0]
    if load.value is None or load.value <= 0:
        return _untold("no load fits pole 2 with gm2, Cc and C1 anywhere near the design")
    bench = design.bench
    outside = design.elements.CL + bench.load_f
    bench_sd = bench.load_f * bench.load_spread
    extra = _shifted(load, outside, bench_sd)
    first_stage = NOT_KNOWN
    if _third_pole_seen(fit):
        both = _propagate(_load_and_first_stage, fit, design, ("gm2", "Cc", "R1", "R2"))
        first_stage = _shifted(both[1], design.elements.C1, 0.0)
    return Parasitic(
        load_total_f=load,
        load_f=extra,
        first_stage_f=first_stage,
        sentence=load_sentence(load, extra, first_stage, design),
    )


def _untold(why: str) -> Parasitic:
    return Parasitic(
        load_total_f=NOT_KNOWN,
        load_f=NOT_KNOWN,
        first_stage_f=NOT_KNOWN,
        sentence=f"the load capacitance cannot be told: {why}",
    )


def _load_alone(elements: Elements, observed: FloatArray) -> FloatArray:
    """CL from (b, τz): a2 − b·a1 = 0, linear in CL."""
    b, zero_time_s = observed[:2]

    def misfit(load_f: float) -> float:
        denominator = _denominator(elements, zero_time_s, CL=load_f)
        return float(denominator[2] - b * denominator[1])

    empty, unit = misfit(0.0), elements.CL
    return np.array([-empty * unit / (misfit(unit) - empty)])


def _load_and_first_stage(elements: Elements, observed: FloatArray) -> FloatArray:
    """(CL, C1) from (b, τz, τ3): a2 = b·a1 and a3 = τ3·a2, by Newton's method on their logarithms."""
    b, zero_time_s, far_pole_s = observed
    logs = np.log([elements.CL, elements.C1])

    def misfit(point: FloatArray) -> FloatArray:
        load_f, first_f = np.exp(point)
        denominator = _denominator(elements, zero_time_s, CL=load_f, C1=first_f)
        return np.array(
            [np.log(denominator[2] / (b * denominator[1])), np.log(denominator[3] / (far_pole_s * denominator[2]))]
        )

    from scipy.optimize import root

    with np.errstate(all="ignore"):
        answer = root(misfit, logs, tol=1e-12)
    return np.exp(answer.x) if np.abs(misfit(answer.x)).max() < 1e-6 else np.full(2, np.nan)


def _denominator(elements: Elements, zero_time_s: float, **changes: float) -> FloatArray:
    arguments: dict[str, float] = {
        field.name: getattr(elements, field.name)
        for field in fields(elements)
        if field.name not in ("Rz", "mirror_pole_hz", "delay_s")
    }
    arguments.update(changes)
    return np.asarray(coefficients(**arguments, Rz=resistor_for(elements, zero_time_s))[1], dtype=float)


def _propagate(solver: Solver, fit: LoopFit, design: Design, assumed: tuple[str, ...]) -> tuple[Estimate, ...]:
    """Estimates of a solver's answers, uncertain by the fit's covariance and the assumed elements' spreads.

    Linear propagation with all covariances (JCGM 100:2008, sec. 5.2.2).
    """
    elements = design.elements
    assert elements is not None
    model = fit.solution.model
    values = fit.solution.values

    def observed(vector: FloatArray) -> FloatArray:
        _, _, b, zero_time_s, far_pole_s, _ = model.physical(vector)
        return np.array([b, zero_time_s, far_pole_s])

    best = solver(elements, observed(values))
    slopes = []
    for index in range(len(values)):
        shift = np.zeros(len(values))
        shift[index] = 1e-5 * max(1.0, abs(values[index]))
        moved = [solver(elements, observed(values + sign * shift)) for sign in (1, -1)]
        slopes.append((moved[0] - moved[1]) / (2 * shift[index]))
    by_fit = np.array(slopes)
    variance = np.einsum("ik,ij,jk->k", by_fit, fit.covariance, by_fit)
    for name, spread in _spreads(design, assumed).items():
        moved = [
            solver(replace(elements, **{name: getattr(elements, name) * factor}), observed(values))
            for factor in (1 + 1e-4, 1 - 1e-4)
        ]
        variance = variance + ((moved[0] - moved[1]) / 2e-4 * spread) ** 2
    return tuple(
        Estimate.gaussian(float(value), float(sd), quantile=QUANTILE) if np.isfinite(sd) else NOT_KNOWN
        for value, sd in zip(best, np.sqrt(variance), strict=True)
    )


def _spreads(design: Design, names: tuple[str, ...]) -> Mapping[str, float]:
    return {name: NO_PRIOR_SPREAD if name in design.under_test else design.spreads[name] for name in names}


def _shifted(estimate: Estimate, by: float, sd: float) -> Estimate:
    if estimate.value is None or estimate.stderr is None:
        return NOT_KNOWN
    return Estimate.gaussian(estimate.value - by, float(np.hypot(estimate.stderr, sd)), quantile=QUANTILE)


def _third_pole_seen(fit: LoopFit) -> bool:
    """Whether the sweep, and not the design's prior, fixes the far-pole time."""
    model = fit.solution.model
    if "far_pole" not in model.names:
        return False
    far_pole = fit.parameters.far_pole_s
    if far_pole.value is None or far_pole.stderr is None or far_pole.value < 4 * far_pole.stderr:
        return False
    return far_pole.stderr**2 < SEEN_BY_DATA * model.far_pole.sd_s**2


def load_sentence(load: Estimate, extra: Estimate, first_stage: Estimate, design: Design) -> str:
    """Total load, what of it nobody designed, and the same of the first stage, in words."""
    elements = design.elements
    assert elements is not None
    if load.value is None or load.stderr is None or extra.value is None or extra.stderr is None:
        return "the load capacitance cannot be told from this fit"
    bench = f" and the bench's {si(design.bench.load_f, 'F', digits=3)}" if design.bench.load_f else ""
    parts = [
        f"load {si_with_error(load.value, load.stderr, 'F')} in all, "
        f"{si_with_error(extra.value, extra.stderr, 'F')} beyond the designed {si(elements.CL, 'F', digits=3)}{bench}"
    ]
    if abs(extra.value) < QUANTILE * extra.stderr:
        parts.append("which is no more than the uncertainty")
    parts.append("taking gm2, Cc, C1, R1 and R2 as designed, within their spreads")
    if first_stage.value is not None and first_stage.stderr is not None:
        parts.append(
            f"the third pole puts {si_with_error(first_stage.value, first_stage.stderr, 'F')} beyond the designed C1"
        )
    return "; ".join(parts)
