"""Drift among repeats: named where it is, seldom where there is none."""

from __future__ import annotations

import re

import numpy as np
import pytest
from numpy.typing import ArrayLike
from repeated_sweeps import FREQ_HZ, repeats

from fitamp.conditioning.repeats import DRIFT, NOISE, average_repeats
from fitamp.sweep import Concern, Decision, Sweep


def said(sweeps: list[Sweep], topic: str = DRIFT) -> list[Decision]:
    return [decision for decision in average_repeats(sweeps).decisions if decision.topic == topic]


@pytest.mark.parametrize(("count", "points"), [(2, 281), (5, 281), (3, 60)])
def test_clean_repeats_raise_a_false_alarm_in_one_set_of_fifty_at_most(count: int, points: int) -> None:
    # 1 % for a drift, 0.5 % for a noisier repeat, 1 % for their noise against the scatter: of 60 sets, 5 or more would
    # come once in 60 tries.
    freq_hz = np.geomspace(10.0, 100e6, points)
    sets = [average_repeats(repeats(count, 1000 * count + seed, freq_hz=freq_hz)) for seed in range(60)]
    assert sum(any(decision.concern is Concern.CAUTION for decision in average.decisions) for average in sets) <= 4


@pytest.mark.parametrize(
    ("count", "changes", "who"),
    [
        (2, {1: 1.003}, "B.csv departs from A.csv"),
        (3, {1: 1.003}, "B.csv departs from the others"),
        (5, {4: 1.003}, "E.csv departs from the others"),
        (5, {2: np.exp(-2j * np.pi * FREQ_HZ * 5e-12)}, "C.csv departs from the others"),
        (3, {1: 1.002, 2: 1.004}, "a trend from A.csv to C.csv"),
        (5, {i: 1 + 0.001 * i for i in range(5)}, "a trend from A.csv to E.csv"),
        (6, {3: 1.003, 4: 1.003, 5: 1.003}, "a step between C.csv and D.csv"),
    ],
)
def test_a_drift_is_named(count: int, changes: dict[int, ArrayLike], who: str) -> None:
    for seed in range(5):
        (drift,) = said(repeats(count, seed, changes=changes))
        assert drift.choice == who
        assert drift.concern is Concern.CAUTION


def test_a_drift_is_placed_and_sized() -> None:
    change = 1 + 0.01 * (FREQ_HZ > 10e6)
    (drift,) = said(repeats(5, 1, changes={1: change}))
    # 18 points in half a decade, 4/5 of the variance left beside the others' mean: √(2 · 18 · 4/5) · 1 %/0.1 % = 54.
    assert drift.reason.startswith("most from 31.62 MHz to 100.0 MHz, by 5")
    assert re.search(r"by 5\d standard errors: loop gain \+(0\.9[5-9]|1) % in magnitude, ", drift.reason)


def test_two_that_drift_are_both_named_the_stronger_first() -> None:
    found = said(repeats(5, 1, changes={0: 1.003, 3: 0.995}))
    assert [drift.choice for drift in found] == ["D.csv departs from the others", "A.csv departs from the others"]


def test_a_drift_is_found_in_few_points() -> None:
    (drift,) = said(repeats(3, 1, freq_hz=np.geomspace(1e5, 50e6, 14), changes={0: 1.02}))
    assert drift.choice == "A.csv departs from the others"


def test_a_noisier_repeat_is_named() -> None:
    rng = np.random.default_rng(1)
    rough = 1 + 3e-3 * (rng.standard_normal(281) + 1j * rng.standard_normal(281))
    (noisier,) = said(repeats(5, 1, changes={1: rough}), NOISE)
    assert noisier.choice == "B.csv is noisier"
    assert "times as much as the others do" in noisier.reason
