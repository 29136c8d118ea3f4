"""Estimates: intervals, bounds, and questions to them."""

from __future__ import annotations

import math

import pytest
from scipy import stats

from fitamp.estimate import NOT_KNOWN, Estimate, Known, two_sided_95


def test_gaussian_interval_is_symmetric() -> None:
    estimate = Estimate.gaussian(5.0, 0.5, quantile=2.0)
    assert (estimate.value, estimate.stderr, estimate.ci95) == (5.0, 0.5, (4.0, 6.0))
    assert estimate.is_measured
    assert estimate.known is Known.MEASURED


@pytest.mark.parametrize("value", [3.0, -3.0])
def test_lognormal_interval_keeps_the_sign_and_is_symmetric_in_ratio(value: float) -> None:
    estimate = Estimate.lognormal(value, 0.2, quantile=1.96)
    low, high = estimate.ci95
    assert low is not None
    assert high is not None
    assert low < value < high
    assert low * high == pytest.approx(value**2)
    assert math.copysign(1, low) == math.copysign(1, value) == math.copysign(1, high)
    assert estimate.stderr == pytest.approx(0.6)
    # The quantile in the logarithm: scipy's log-normal distribution.
    outer = stats.lognorm.ppf(0.975, 0.2 * 1.96 / stats.norm.ppf(0.975), scale=3.0)
    assert max(abs(low), abs(high)) == pytest.approx(outer, rel=1e-9)


def test_small_relative_errors_make_both_intervals_alike() -> None:
    assert Estimate.lognormal(10.0, 1e-4, quantile=2.0).ci95 == pytest.approx(
        Estimate.gaussian(10.0, 1e-3, quantile=2.0).ci95, rel=1e-7
    )


@pytest.mark.parametrize(
    ("ci95", "within", "touching"),
    [
        ((1.0, 2.0), True, True),
        ((-1.0, 2.0), False, True),
        ((None, 2.0), False, True),
        ((1.0, None), False, True),
        ((None, -1.0), False, False),
        ((4.0, None), False, False),
        ((3.0, 3.5), False, True),
        ((0.0, 3.0), True, True),
    ],
)
def test_within_and_touching_take_open_sides_for_infinite(
    ci95: tuple[float | None, float | None], within: bool, touching: bool
) -> None:
    estimate = Estimate(value=None, stderr=None, ci95=ci95, known=Known.LOWER_BOUND)
    assert estimate.is_within(0.0, 3.0) is within
    assert estimate.touches(0.0, 3.0) is touching


def test_an_open_side_fits_into_an_open_region() -> None:
    bound = Estimate(value=None, stderr=None, ci95=(1.0, None), known=Known.LOWER_BOUND)
    assert bound.is_within(0.0, math.inf)
    assert not bound.is_measured


def test_what_is_not_known_is_within_nothing_and_touches_everything() -> None:
    assert not NOT_KNOWN.is_within(-math.inf, math.inf)
    assert NOT_KNOWN.touches(5.0, 6.0)
    assert not NOT_KNOWN.is_measured


def test_an_undetermined_quantity_with_ends_is_still_within_nothing() -> None:
    estimate = Estimate(value=None, stderr=None, ci95=(1.0, 2.0), known=Known.UNDETERMINED)
    assert not estimate.is_within(0.0, 3.0)
    assert not estimate.touches(3.0, 4.0)


# Table of Student's t, 97.5 % point (any textbook; from memory).
@pytest.mark.parametrize(("freedom", "quantile"), [(1, 12.706), (5, 2.571), (10, 2.228), (30, 2.042), (1e9, 1.960)])
def test_quantile_is_students_t(freedom: float, quantile: float) -> None:
    assert two_sided_95(freedom) == pytest.approx(quantile, abs=5e-4)
