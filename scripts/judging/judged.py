"""What was said of a die, and whether it is right."""

from __future__ import annotations

import math
import time
from dataclasses import dataclass

import numpy as np

import fitamp
from fitamp import Nulling
from fitamp.comparison import Route, Verdict
from fitamp.comparison.verdict import judge_nulling
from judging.making import FREQ_HZ, NOISE, Lot, design, edges_s, expected_stderr_s, made, regions

REGIONS = tuple(nulling for nulling in Nulling if nulling is not Nulling.UNDECIDED)
CLEARLY = 3.0
NEAR_ONE = 0.25


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """One die's truth and what one route said of it.

    product : true gm2·Rz; zero_time_s : true zero time in s
    expected_s : standard error in s that sweep and design leave of the zero time at the best
    verdict : None where the fit failed
    route : from what the verdict came; None where the fit failed
    estimate_s, stderr_s, low_s, high_s : of the zero time that the verdict rests on, in s; None where there is none
    """

    product: float
    zero_time_s: float
    expected_s: float
    verdict: Nulling | None
    route: Route | None
    estimate_s: float | None
    stderr_s: float | None
    low_s: float | None
    high_s: float | None

    @property
    def region(self) -> Nulling:
        """Where the true zero time lies."""
        return next(name for name, (low, high) in regions().items() if low <= self.zero_time_s <= high)

    @property
    def is_decided(self) -> bool:
        """Whether the verdict names a region."""
        return self.verdict in REGIONS

    @property
    def is_wrong(self) -> bool:
        """Whether the verdict names another region than the true one."""
        return self.is_decided and self.verdict is not self.region

    @property
    def is_wrong_half_plane(self) -> bool:
        """Whether the verdict names a half plane and the true zero, not small, lies in the other."""
        if not self.is_decided or Nulling.AT_INFINITY in (self.verdict, self.region):
            return False
        return (self.verdict is Nulling.WRONG_SIDE) != (self.region is Nulling.WRONG_SIDE)

    @property
    def is_clear(self) -> bool:
        """Whether n is not near 1 and the true zero time is 3 expected standard errors or more from every limit.

        The same for both routes: a route that is less certain excuses nothing by that.
        """
        nearest_s = min(abs(self.zero_time_s - edge) for edge in edges_s())
        return nearest_s >= CLEARLY * self.expected_s and abs(self.product - 1) > NEAR_ONE

    @property
    def covers(self) -> bool:
        """Whether the 95 % interval holds the true zero time; an open end holds all."""
        low = -math.inf if self.low_s is None else self.low_s
        return low <= self.zero_time_s <= (math.inf if self.high_s is None else self.high_s)

    @property
    def pull(self) -> float | None:
        """Standard errors by which the zero time is too large; None where there is none."""
        if self.estimate_s is None or not self.stderr_s:
            return None
        return (self.estimate_s - self.zero_time_s) / self.stderr_s

    @property
    def errors_off(self) -> float:
        """Standard errors from the true zero time to the region that the verdict names; infinite without one."""
        low, high = regions()[self.verdict] if self.verdict in REGIONS else (-math.inf, math.inf)
        distance_s = max(low - self.zero_time_s, self.zero_time_s - high, 0.0)
        return distance_s / self.stderr_s if self.stderr_s else math.inf


@dataclass(frozen=True, slots=True, kw_only=True)
class Die:
    """What was said of one die by `compare` itself, and by two poles and a zero alone; seconds that compare took."""

    compared: Judged
    behaviour: Judged
    seconds: float


def compare_die(index: int, *, lot: Lot, seed: int, delay_s: float, delay_sd_s: float) -> Die:
    """Make die number `index`, measure and compare it. Of the same seed its elements are the same for any delay."""
    rng = np.random.default_rng([seed, index])
    part = made(lot, index, rng, delay_s=delay_s, delay_sd_s=delay_sd_s)
    gain = fitamp.simulate_bench(part.transfer().evaluate(FREQ_HZ), NOISE, rng)
    sweep, designed = fitamp.Sweep(freq_hz=FREQ_HZ, gain=gain), design(delay_s, delay_sd_s)
    start = time.perf_counter()
    verdicts: tuple[Verdict | None, Verdict | None] = None, None
    try:
        comparison = fitamp.compare(sweep, designed)
        verdicts = comparison.verdict, judge_nulling(comparison.fit, designed)
    except fitamp.FitError:
        pass
    seconds = time.perf_counter() - start
    expected_s = expected_stderr_s(part, designed)
    compared, behaviour = (_judged(part, verdict, expected_s) for verdict in verdicts)
    return Die(compared=compared, behaviour=behaviour, seconds=seconds)


def _judged(part: fitamp.Elements, verdict: Verdict | None, expected_s: float) -> Judged:
    low, high = (None, None) if verdict is None else verdict.zero_time_s.ci95
    return Judged(
        product=part.nulling_product,
        zero_time_s=part.zero_time_s,
        expected_s=expected_s,
        verdict=None if verdict is None else verdict.nulling,
        route=None if verdict is None else verdict.route,
        estimate_s=None if verdict is None else verdict.zero_time_s.value,
        stderr_s=None if verdict is None else verdict.zero_time_s.stderr,
        low_s=low,
        high_s=high,
    )
