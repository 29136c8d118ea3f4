"""Stretches of a misfit: found where it is, none where it is everywhere, and said in words."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.arrays import FloatArray
from fitamp.fitting.stretches import place_in_words, stretches_of


def noise(seed: int, count: int = 281) -> FloatArray:
    """What noise adds to a sum of squares: exponential, 0 on average."""
    return np.random.default_rng(seed).exponential(size=count) - 1


@pytest.mark.parametrize(("first", "last"), [(0, 30), (100, 140), (250, 280), (200, 202)])
def test_a_bump_is_found_where_it_is(first: int, last: int) -> None:
    for seed in range(10):
        misfit = noise(seed)
        misfit[first : last + 1] += 1000 / (last - first + 1)
        ((start, end),) = stretches_of(misfit)
        assert start == pytest.approx(first, abs=8)
        assert end == pytest.approx(last, abs=8)


@pytest.mark.parametrize("apart", [40, 160])
def test_two_bumps_are_two_stretches_by_rising_index(apart: int) -> None:
    misfit = noise(1)
    misfit[60:64] += 100
    misfit[60 + apart : 64 + apart] += 80
    (first, second) = stretches_of(misfit)
    assert first == pytest.approx((60, 63), abs=3)
    assert second == pytest.approx((60 + apart, 63 + apart), abs=3)


def test_a_pattern_that_waves_is_one_stretch() -> None:
    wave = 40 * np.sin(np.linspace(0, 4 * np.pi, 60)) ** 2
    for seed in range(10):
        misfit = noise(seed)
        misfit[150:210] += wave
        assert len(stretches_of(misfit)) == 1


def test_a_small_bump_beside_a_large_one_is_not_worth_naming() -> None:
    misfit = noise(2)
    misfit[60:70] += 100
    misfit[220:225] += 10
    (only,) = stretches_of(misfit)
    assert only == pytest.approx((60, 69), abs=4)


def test_what_is_everywhere_has_no_place() -> None:
    for seed in range(10):
        assert stretches_of(noise(seed) + 2) == ()


def test_what_many_places_share_has_no_place() -> None:
    misfit = noise(3)
    misfit[10::40] += 100
    assert stretches_of(misfit) == ()


def test_no_misfit_has_no_place() -> None:
    assert stretches_of(np.zeros(0)) == ()
    assert stretches_of(np.full(20, -1.0)) == ()


def test_the_stretch_has_the_largest_surplus_of_all_segments() -> None:
    # Against all segments tried one by one; the surplus is what is above 0.8 of the mean.
    rng = np.random.default_rng(5)
    for _ in range(20):
        misfit = rng.standard_normal(40) ** 3
        start = rng.integers(30)
        misfit[start : start + 8] += 30
        surplus = misfit - 0.8 * misfit.mean()
        sums = {(i, j): float(surplus[i : j + 1].sum()) for i in range(40) for j in range(i, 40)}
        assert stretches_of(misfit) == (max(sums, key=lambda segment: sums[segment]),)


@pytest.mark.parametrize(
    ("where_hz", "words"),
    [
        ((), "throughout the band"),
        (((12e6, 60e6),), "mostly between 12 MHz and 60 MHz"),
        (((3.0e6, 3.1e6),), "mostly around 3.0 MHz"),
        (((5e6, 5e6),), "mostly around 5.0 MHz"),
        (((10.0, 250.0), (1e6, 2e6)), "mostly between 10 Hz and 250 Hz and between 1.0 MHz and 2.0 MHz"),
    ],
)
def test_words(where_hz: tuple[tuple[float, float], ...], words: str) -> None:
    assert place_in_words(where_hz) == words
