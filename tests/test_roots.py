"""Roots of polynomials, well conditioned and repeated."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from fitamp.roots import clusters, polynomial_roots


@settings(max_examples=60, deadline=None, derandomize=True)
@given(
    st.lists(st.integers(0, 33), min_size=1, max_size=7, unique=True),
    st.lists(st.sampled_from([-1.0, 1.0]), min_size=7, max_size=7),
)
def test_real_roots_over_eight_decades_come_back_to_1e_12(steps: list[int], signs: list[float]) -> None:
    # Roots on a quarter-decade raster are far enough apart to be well conditioned; the coefficients are exact to
    # rounding because each is multiplied out in the order of size.
    roots = [sign * 10 ** (2 + step / 4) for step, sign in zip(sorted(steps), signs, strict=False)]
    coefficients = np.ones(1)
    for root in roots:
        coefficients = np.convolve(coefficients, [1.0, -1.0 / root])
    assert_allclose(polynomial_roots(coefficients), roots, rtol=1e-12)


@pytest.mark.parametrize(
    ("coefficients", "expected"),
    [
        ([1.0, 2.0, 1.0], [-1, -1]),
        ([1.0, 3.0, 3.0, 1.0], [-1, -1, -1]),
        ([1.0, 0.0, 2.0, 0.0, 1.0], [1j, -1j, 1j, -1j]),
    ],
)
def test_repeated_roots_are_right_as_far_as_rounding_allows(coefficients: list[float], expected: list[complex]) -> None:
    # An m-fold root moves by the m-th root of a rounding: 1e-8 for a double, 6e-6 for a triple root.
    found = polynomial_roots(coefficients)
    tolerance = 5e-8 if len(coefficients) != 4 else 5e-5
    for root in expected:
        assert min(abs(root - other) for other in found) < tolerance
    assert len(found) == len(expected)
    for side in {root.imag for root in expected}:
        copies = [root for root in found if side == 0 or root.imag * side > 0]
        assert sum(copies) / len(copies) == pytest.approx(expected[0].real + 1j * side, abs=1e-9)


def test_roots_of_unity_and_of_a_constant() -> None:
    assert_allclose(polynomial_roots([-1.0, 0.0, 0.0, 0.0, 1.0]), [-1, 1j, -1j, 1], atol=1e-15)
    assert polynomial_roots([5.0]) == ()
    assert polynomial_roots([0.0, 0.0, 2.0, 1.0]) == (0, 0, -2)
    assert polynomial_roots([2.0, 1.0, 0.0, 0.0]) == (-2,)


def test_coefficients_that_are_not_finite_have_no_roots() -> None:
    with pytest.raises(ValueError, match="must be finite"):
        polynomial_roots([1.0, math.inf])


def test_random_polynomials_agree_with_numpy() -> None:
    # Second opinion: eigenvalues of the companion matrix (numpy.roots), good where the roots are of one size.
    rng = np.random.default_rng(2)
    for _ in range(100):
        coefficients = rng.normal(size=rng.integers(2, 10))
        expected = np.roots(coefficients[::-1])
        for root in polynomial_roots(coefficients):
            assert np.min(np.abs(expected - root)) < 1e-9 * (1 + abs(root))


def test_clusters_hold_roots_that_nearly_coincide() -> None:
    assert clusters([-1.0, -1.001, -2.0, 1j, -1j]) == [[-1.0, -1.001], [-2.0], [1j], [-1j]]
