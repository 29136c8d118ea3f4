"""Runs every method on the same noisy sweeps of a scenario and holds errors against the Cramér–Rao bound."""

from __future__ import annotations

import statistics
import time
import warnings
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from benchmarking.methods import METHODS, Answer, Method
from benchmarking.scenarios import SCENARIOS, Scenario

__all__ = ["Score", "run_scenario", "warm_up"]

POLE2_FACTOR = 2.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Score:
    """How a method did, quantities in the order of the scenario's `judged`.

    rmse, bias : shape (k,), over the bound, of the runs that did not fail; None where all failed
    coverage : shape (k,), share of the 95 % intervals that hold the truth; None where there are no intervals
    failed : share of all runs
    milliseconds : median of all runs
    """

    method: Method
    rmse: np.ndarray | None
    bias: np.ndarray | None
    coverage: np.ndarray | None
    failed: float
    milliseconds: float


def warm_up(methods: Sequence[Method], seed: int) -> None:
    """Let every method import and compile what it needs, so that no run's time has it."""
    scenario = next(iter(SCENARIOS.values()))
    gain = scenario.measure(np.random.default_rng(seed))
    for method in methods:
        _timed(method, scenario, gain)


def run_scenario(
    scenario: Scenario, methods: Sequence[Method], *, runs: int, seed: int, done: Callable[[], None] = lambda: None
) -> tuple[Score, ...]:
    """Scores of the methods on `runs` sweeps; a scenario's sweeps do not depend on what else is run.

    `done` is called after every sweep.
    """
    answers: dict[Method, list[Answer | None]] = {method: [] for method in methods}
    times: dict[Method, list[float]] = {method: [] for method in methods}
    for run in range(runs):
        gain = scenario.measure(np.random.default_rng([seed, list(SCENARIOS).index(scenario.name), run]))
        for method in methods:
            answer, taken = _timed(method, scenario, gain)
            answers[method].append(answer)
            times[method].append(taken)
        done()
    bound = scenario.bound()
    return tuple(_score(scenario, bound, method, answers[method], times[method]) for method in methods)


def _timed(method: Method, scenario: Scenario, gain: np.ndarray) -> tuple[Answer | None, float]:
    """Answer, None where it is a failure, and milliseconds. Warnings of the libraries are not what is counted here."""
    answer = None
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        warnings.simplefilter("ignore")
        start = time.perf_counter()
        try:
            answer = METHODS[method](scenario, gain)
        except Exception:  # whatever a method raises is its failure, and the run goes on
            answer = None
        taken = time.perf_counter() - start
    if answer is not None and _is_failure(scenario, answer):
        answer = None
    return answer, 1e3 * taken


def _is_failure(scenario: Scenario, answer: Answer) -> bool:
    if any(value is None or not np.isfinite(value) for value in answer.values):
        return True
    if not scenario.pole2_known:
        return False
    off = 0.0 if answer.pole2_hz is None else answer.pole2_hz / scenario.truth["pole2_hz"]
    return not 1 / POLE2_FACTOR <= off <= POLE2_FACTOR


def _score(
    scenario: Scenario, bound: np.ndarray, method: Method, answers: Sequence[Answer | None], times: Sequence[float]
) -> Score:
    good = [answer for answer in answers if answer is not None]
    rmse = bias = coverage = None
    if good:
        true = scenario.true_values()
        errors = (np.array([answer.values for answer in good], dtype=float) - true) / bound
        rmse, bias = np.sqrt((errors**2).mean(axis=0)), errors.mean(axis=0)
        intervals = np.array([answer.intervals for answer in good if answer.intervals is not None])
        if len(intervals):
            coverage = ((intervals[:, :, 0] <= true) & (true <= intervals[:, :, 1])).mean(axis=0)
    return Score(
        method=method,
        rmse=rmse,
        bias=bias,
        coverage=coverage,
        failed=1 - len(good) / len(answers),
        milliseconds=statistics.median(times),
    )
