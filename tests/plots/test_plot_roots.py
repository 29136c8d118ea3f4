"""Roots as marks: zero times become regions of the real axis, through infinity where they pass 0."""

from __future__ import annotations

import math

import pytest
from drawn_parts import comparison_of, fit_of_pair

from fitamp.design import Design, HalfPlane, Roots
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.plots.roots import designed_marks, measured_marks, zero_regions_hz

NS_HZ = 1 / (2 * math.pi * 1e-9)  # a zero time of 1 ns as a frequency


def _interval(low: float | None, high: float | None) -> Estimate:
    return Estimate(value=None, stderr=None, ci95=(low, high), known=Known.UNDETERMINED)


def test_positive_zero_times_lie_in_the_left_half_plane() -> None:
    (region,) = zero_regions_hz(_interval(0.5e-9, 1e-9))
    assert region == pytest.approx((-2 * NS_HZ, -NS_HZ))


def test_negative_zero_times_lie_in_the_right_half_plane() -> None:
    (region,) = zero_regions_hz(_interval(-1e-9, -0.5e-9))
    assert region == pytest.approx((NS_HZ, 2 * NS_HZ))


def test_an_interval_around_0_passes_through_infinity() -> None:
    left, right = zero_regions_hz(_interval(-0.5e-9, 1e-9))
    assert left == pytest.approx((-math.inf, -NS_HZ))
    assert right == pytest.approx((2 * NS_HZ, math.inf))


def test_an_open_end_reaches_the_origin() -> None:
    (region,) = zero_regions_hz(_interval(1e-9, None))
    assert region == pytest.approx((-NS_HZ, 0.0))


@pytest.mark.parametrize(
    ("low", "high", "expected"), [(0.0, 1e-9, (-math.inf, -NS_HZ)), (-1e-9, 0.0, (NS_HZ, math.inf))]
)
def test_an_end_at_0_is_infinity_on_the_side_of_the_rest(
    low: float, high: float, expected: tuple[float, float]
) -> None:
    (region,) = zero_regions_hz(_interval(low, high))
    assert region == pytest.approx(expected)


def test_nothing_known_has_no_region() -> None:
    assert zero_regions_hz(NOT_KNOWN) == ()


def test_a_pair_is_one_mark() -> None:
    pair, zero = (mark for mark in measured_marks(fit_of_pair()) if mark.name != "pole 3")
    assert pair.is_pair
    assert pair.label == "pole pair"
    assert zero.side.startswith("right")


def test_a_zero_designed_at_infinity_says_so() -> None:
    roots = Roots(dc_gain=1000, pole1_hz=1e3, pole2_hz=60e6, half_plane=HalfPlane.INFINITY)
    zero = designed_marks(Design.from_roots(roots))[-1]
    assert zero.is_at_infinity
    assert zero.reaches_infinity
    assert zero.sentence == "zero: at infinity"


def test_measured_marks_carry_value_and_error() -> None:
    marks = {mark.name: mark for mark in measured_marks(comparison_of(0).fit)}
    assert marks["pole 1"].words.endswith("kHz")
    assert marks["zero"].label == "zero (right)"
    assert "±" in marks["zero"].words
