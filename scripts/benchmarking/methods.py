"""The methods that are held against each other: fitamp, and what one would write in ten minutes with lmfit.

Each takes a scenario and a sweep's loop gain and returns an `Answer`; whatever it raises counts as a failure.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from enum import StrEnum
from typing import Any

import numpy as np

import fitamp
from benchmarking.rational import aaa_roots, vector_fit_roots
from benchmarking.scenarios import Judged, Scenario

__all__ = ["METHODS", "Answer", "Method"]

QUANTILE_95 = 1.96
Interval = tuple[float, float]


class Method(StrEnum):
    """Rows of the tables."""

    FITAMP = "fitamp"
    LMFIT_DB = "lmfit-db"
    LMFIT_LOG = "lmfit-log"
    VECTOR = "vector-fit"
    AAA = "aaa"


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """What a method found, in the order of the scenario's `judged`; None where it has no number, or no intervals."""

    values: tuple[float | None, ...]
    pole2_hz: float | None
    intervals: tuple[Interval, ...] | None = None


def by_fitamp(scenario: Scenario, gain: np.ndarray) -> Answer:
    """The package, noise unknown, with what the scenario says of the lag. An open end of an interval is infinite."""
    # Its split is τz − a2/a1; what a2/a1 = 1/(pole 1 + pole 2) lacks of 1/pole 2 is made up at the true values.
    true = scenario.truth
    lacking_s = 1 / (2 * math.pi * true["pole2_hz"]) - 1 / (2 * math.pi * (true["pole1_hz"] + true["pole2_hz"]))
    sweep = fitamp.Sweep(freq_hz=scenario.freq_hz, gain=gain)
    found = fitamp.fit_sweep(sweep, far_pole=scenario.far_pole, delay=scenario.delay).parameters
    values: list[float | None] = []
    intervals: list[Interval] = []
    for quantity in scenario.judged:
        estimate = getattr(found, quantity.value)
        shift = -lacking_s if quantity is Judged.SPLIT else 0.0
        low, high = estimate.ci95
        values.append(None if estimate.value is None else estimate.value + shift)
        intervals.append((-math.inf if low is None else low + shift, math.inf if high is None else high + shift))
    return Answer(values=tuple(values), pole2_hz=found.pole2_hz.value, intervals=tuple(intervals))


def _starts(freq_hz: np.ndarray, gain: np.ndarray) -> dict[str, float]:
    """What one reads off the plot: level and corner at the low end; pole 2 and a left zero near the top of the band."""
    level = float(np.abs(gain[0]))
    corner = int(np.argmax(np.abs(gain) < level / math.sqrt(2)))
    return {"dc_gain": level, "pole1_hz": float(freq_hz[corner]), "pole2_hz": freq_hz[-1] / 2, "zero_hz": freq_hz[-1]}


def by_lmfit_in_decibels(scenario: Scenario, gain: np.ndarray) -> Answer:
    """Magnitude in dB and phase in degrees, each point alike; gain, poles and zero as they are, in V/V and Hz.

    A zero given by its frequency cannot cross from one half plane to the other, so both are tried.
    """
    import lmfit

    freq_hz = scenario.freq_hz
    measured_db, measured_deg = 20 * np.log10(np.abs(gain)), np.degrees(np.unwrap(np.angle(gain)))

    def residual(params: Any) -> np.ndarray:
        value = params.valuesdict()
        jf = 1j * freq_hz
        model = value["dc_gain"] * (1 + jf / value["zero_hz"])
        model = model / (1 + jf / value["pole1_hz"]) / (1 + jf / value["pole2_hz"])
        phase_deg = np.degrees(np.unwrap(np.angle(model)))
        return np.concatenate([20 * np.log10(np.abs(model)) - measured_db, phase_deg - measured_deg])

    results = []
    for side in (1, -1):
        params = lmfit.Parameters()
        start = _starts(freq_hz, gain)
        params.add("zero_hz", value=side * start.pop("zero_hz"))
        for name, value in start.items():
            params.add(name, value=value, min=0)
        results.append(lmfit.minimize(residual, params))
    result = min(results, key=lambda end: end.chisqr)
    return _answer(scenario, result, lambda u: {**u, "zero_time_s": 1 / (2 * math.pi * u["zero_hz"])})


def by_lmfit_in_logarithms(scenario: Scenario, gain: np.ndarray) -> Answer:
    """Complex residual relative to the reading, each point alike; logarithms of gain and poles, zero time in ns."""
    import lmfit
    from uncertainties.umath import exp

    s = 2j * np.pi * scenario.freq_hz

    def residual(params: Any) -> np.ndarray:
        value = params.valuesdict()
        model = np.exp(value["ln_dc_gain"]) * (1 + s * value["zero_ns"] * 1e-9)
        for pole in ("ln_pole1_hz", "ln_pole2_hz"):
            model = model / (1 + s / (2 * np.pi * np.exp(value[pole])))
        return (model - gain) / np.abs(gain)

    start = _starts(scenario.freq_hz, gain)
    params = lmfit.Parameters()
    for name in ("dc_gain", "pole1_hz", "pole2_hz"):
        params.add(f"ln_{name}", value=math.log(start[name]))
    params.add("zero_ns", value=1e9 / (2 * math.pi * start["zero_hz"]))
    result = lmfit.minimize(residual, params)

    def quantities(found: Mapping[str, Any]) -> dict[str, Any]:
        logs = {name.removeprefix("ln_"): exp(value) for name, value in found.items() if name.startswith("ln_")}
        return {**logs, "zero_time_s": found["zero_ns"] * 1e-9}

    return _answer(scenario, result, quantities)


def _answer(scenario: Scenario, result: Any, quantities: Callable[[Mapping[str, Any]], dict[str, Any]]) -> Answer:
    """Values ± 1.96 standard errors of an lmfit result, errors propagated with their correlations."""
    # lmfit sets it only where it could estimate errors.
    uncertain = getattr(result, "uvars", None)
    if uncertain is None:
        found = quantities(result.params.valuesdict())
        values = tuple(float(quantity.of(found)) for quantity in scenario.judged)
        return Answer(values=values, pole2_hz=found["pole2_hz"])
    found = quantities(uncertain)
    judged = [quantity.of(found) for quantity in scenario.judged]
    return Answer(
        values=tuple(value.n for value in judged),
        pole2_hz=found["pole2_hz"].n,
        intervals=tuple((value.n - QUANTILE_95 * value.s, value.n + QUANTILE_95 * value.s) for value in judged),
    )


def _rational(roots: Callable[..., dict[str, float]]) -> Callable[[Scenario, np.ndarray], Answer]:
    def method(scenario: Scenario, gain: np.ndarray) -> Answer:
        found = roots(scenario.freq_hz, gain, real_poles=scenario.real_poles, pairs=scenario.pairs)
        return Answer(values=tuple(q.of(found) for q in scenario.judged), pole2_hz=found[Judged.POLE2.value])

    return method


METHODS: dict[Method, Callable[[Scenario, np.ndarray], Answer]] = {
    Method.FITAMP: by_fitamp,
    Method.LMFIT_DB: by_lmfit_in_decibels,
    Method.LMFIT_LOG: by_lmfit_in_logarithms,
    Method.VECTOR: _rational(vector_fit_roots),
    Method.AAA: _rational(aaa_roots),
}
