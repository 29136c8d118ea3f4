"""Roots as marks: zero times become regions of the real axis, through infinity where they pass 0."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import comparison_of, fit_of_pair

from fitamp.comparison import Route
from fitamp.design import Design, HalfPlane, Roots
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting import LoopFit
from fitamp.fitting.result import Root
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


def test_the_zero_is_the_one_that_the_verdict_rests_on() -> None:
    comparison = comparison_of(1300)
    verdict = replace(comparison.verdict, zero_time_s=Estimate.gaussian(1e-9, 1e-12, quantile=1.96))
    by_circuit = measured_marks(comparison.fit, replace(comparison, verdict=verdict))[-1]
    # 1/(2π·1 ns) is 159.15 MHz.
    assert by_circuit.value_hz == pytest.approx(-159.15e6, rel=1e-4)
    by_behaviour = replace(comparison, verdict=replace(verdict, route=Route.BEHAVIOUR))
    assert measured_marks(comparison.fit, by_behaviour) == measured_marks(comparison.fit)


def _with_poles(*roots: Root, far_pole_s: tuple[float | None, float | None] = (None, None)) -> LoopFit:
    """A fit to 100 MHz whose pole 1 alone is determined, with other roots."""
    fit = comparison_of(0).fit
    pole2 = Estimate(value=None, stderr=None, ci95=(5e9, None), known=Known.LOWER_BOUND)
    far_pole = Estimate(value=None, stderr=None, ci95=far_pole_s, known=Known.UNDETERMINED)
    return replace(fit, poles=roots, parameters=replace(fit.parameters, pole2_hz=pole2, far_pole_s=far_pole))


def _real(value_hz: float, stderr_hz: float) -> Root:
    return Root(value_hz=complex(-value_hz), covariance=np.diag([stderr_hz**2, 0.0]))


@pytest.mark.parametrize("covariance", [None, np.diag([1e18, 1e20])])
def test_a_pair_far_beyond_the_sweep_that_nothing_determines_is_no_pair(covariance: np.ndarray | None) -> None:
    far = (Root(value_hz=-7e8 + sign * 1.7e11j, covariance=covariance) for sign in (1, -1))
    marks = measured_marks(_with_poles(_real(1e4, 40.0), *far))
    assert [mark.name for mark in marks] == ["pole 1", "pole 2", "zero"]
    assert marks[1].words == "above 5.000 GHz"


def test_a_real_pole_nearer_than_a_pair_is_pole_1() -> None:
    pair = (Root(value_hz=-5e7 + sign * 3e7j, covariance=np.diag([1e10, 1e10])) for sign in (1, -1))
    marks = measured_marks(_with_poles(_real(1e4, 40.0), *pair))
    assert [mark.name for mark in marks] == ["pole 1", "pole pair", "zero"]


def test_a_third_pole_that_may_be_at_infinity_reaches_there_and_not_to_0() -> None:
    # 2 ± 2·1.2 in units of its own value: the time 1/(2π·pole) may be 0.
    wide = next(
        mark
        for mark in measured_marks(_with_poles(_real(1e4, 40.0), _real(4e7, 1e6), _real(7e8, 4.2e8)))
        if mark.name == "pole 3"
    )
    ((far, near),) = wide.regions_hz
    assert far == -math.inf
    assert -7e8 < near < -2e8
    assert wide.words.startswith("above ")


@pytest.mark.parametrize(("low_s", "is_open"), [(-1e-12, True), (1e-10, False)])
def test_the_interval_of_the_third_poles_time_decides_on_infinity(low_s: float, is_open: bool) -> None:
    roots = (_real(1e4, 40.0), _real(4e7, 1e6), _real(7e8, 1e8))
    mark = next(
        mark for mark in measured_marks(_with_poles(*roots, far_pole_s=(low_s, 3e-10))) if mark.name == "pole 3"
    )
    assert mark.reaches_infinity is is_open
    assert mark.regions_hz[0][1] == pytest.approx(-7e8 / (1 + comparison_of(0).fit.quantile / 7))
