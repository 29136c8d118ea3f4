"""Roots of real polynomials, each to the precision that its own conditioning allows."""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterable
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

__all__ = ["EPSILON", "clusters", "in_order", "polynomial_roots"]

EPSILON = float(np.finfo(float).eps)
# Iterations needed: 2 to 4 for well-separated roots, 12 or so for repeated ones.
MAX_ITERATIONS = 200
# A residual this many roundings above zero cannot be improved in double precision.
RESIDUAL_ROUNDINGS = 2.0
# Roots nearer to each other than this, relatively, are looked at as one cluster.
CLUSTER_RTOL = 3e-3


def polynomial_roots(coefficients: ArrayLike) -> tuple[complex, ...]:
    """Return the roots of a real polynomial, nearest the origin first, complex ones in exact conjugate pairs.

    Parameters
    ----------
    coefficients : array_like, shape (n,)
        Ascending powers, real. Zeros at the end are left off; zeros at the start give roots at the origin.

    Returns
    -------
    tuple of complex, of length n − 1 after leaving off

    Notes
    -----
    Simultaneous iteration after O. Aberth, Math. Comp. 27 (1973) 339, started on the radii of the Newton
    polygon after D. A. Bini, Numer. Algorithms 13 (1996) 179. Both work root by root, so each root has the
    relative precision that its own conditioning allows. Eigenvalues of a companion matrix are sure only
    relative to the largest root, which can cost a dominant pole eight decades below it its digits. An m-fold
    root is right to about the m-th root of the rounding error, as it must be from rounded coefficients; the mean
    of its m copies is right to rounding.
    """
    values: list[float] = np.asarray(coefficients, dtype=float).tolist()
    if not all(map(math.isfinite, values)):
        raise ValueError("polynomial coefficients must be finite")
    while values and values[-1] == 0:
        values.pop()
    at_origin = next((index for index, value in enumerate(values) if value != 0), 0)
    values = values[at_origin:]
    degree = len(values) - 1
    if degree < 1:
        return (0j,) * at_origin
    if degree == 1:
        return (0j,) * at_origin + (complex(-values[0] / values[1]),)
    if degree == 2 and (pair := _quadratic(*values)) is not None:
        return (0j,) * at_origin + in_order(pair)
    # In x = s/scale the geometric mean of the roots is 1, so that no power over- or underflows.
    scale = math.exp((math.log(abs(values[0])) - math.log(abs(values[-1]))) / degree)
    scaled = [value * scale**power / values[0] for power, value in enumerate(values)]
    found = _pair_conjugates(_recentre(scaled, _iterate(scaled, _starts(scaled))))
    return (0j,) * at_origin + in_order(root * scale for root in found)


def _quadratic(constant: float, linear: float, square: float) -> tuple[complex, complex] | None:
    """Both roots of constant + linear·x + square·x²; None where a square leaves the range of floats.

    The larger root by the sum that does not cancel, the smaller by their product (N. J. Higham, Accuracy and Stability
    of Numerical Algorithms, 2nd ed., sec. 1.8).
    """
    # By powers of two, which round nothing: constant and square become of order 1.
    height, width = math.frexp(constant)[1], (math.frexp(constant)[1] - math.frexp(square)[1]) // 2
    try:
        constant, linear, square = (
            math.ldexp(value, power * width - height) for power, value in enumerate((constant, linear, square))
        )
        half = linear / 2
        quarter = half * half - constant * square
        if quarter < 0:
            upper = complex(math.ldexp(-half / square, width), math.ldexp(math.sqrt(-quarter) / abs(square), width))
            return upper, upper.conjugate()
        larger = -half - math.copysign(math.sqrt(quarter), half)
        roots = (math.ldexp(larger / square, width), math.ldexp(constant / larger, width))
    except OverflowError:
        return None
    return (complex(roots[0]), complex(roots[1])) if math.isfinite(quarter) and all(roots) else None


def in_order(roots: Iterable[complex]) -> tuple[complex, ...]:
    """Nearest the origin first; of a pair, the one with positive imaginary part first."""
    return tuple(sorted(roots, key=lambda root: (abs(root), root.real, -root.imag)))


def clusters(roots: Iterable[complex]) -> list[list[complex]]:
    """Group roots that nearly coincide (within `CLUSTER_RTOL` of the first of their group)."""
    groups: list[list[complex]] = []
    for root in roots:
        home = next((group for group in groups if abs(group[0] - root) < CLUSTER_RTOL * abs(root)), None)
        if home is None:
            groups.append([root])
        else:
            home.append(root)
    return groups


def _iterate(coefficients: list[float], starts: list[complex]) -> list[complex]:
    """Aberth's iteration until no residual is above rounding."""
    roots = list(starts)
    moving = set(range(len(roots)))
    for _ in range(MAX_ITERATIONS):
        for index in sorted(moving):
            x = roots[index]
            value, slope, size = 0j, 0j, 0.0
            for coefficient in reversed(coefficients):
                slope = slope * x + value
                value = value * x + coefficient
                size = size * abs(x) + abs(coefficient)
            if abs(value) <= RESIDUAL_ROUNDINGS * EPSILON * size:
                moving.discard(index)
                continue
            repulsion = sum(1 / (x - other) for i, other in enumerate(roots) if i != index and other != x)
            divisor = slope - value * repulsion
            # A stationary point sends the step to infinity; a small turn leaves it.
            step = value / divisor if divisor else 0.1 * x * cmath.exp(1j)
            roots[index] = x - step
            if abs(step) <= EPSILON * abs(x):
                moving.discard(index)
        if not moving:
            break
    return roots


def _starts(coefficients: list[float]) -> list[complex]:
    """Starting points from the upper convex hull of ln|a_k| over k; edge of length m puts m on one circle."""
    points = [(k, math.log(abs(value))) for k, value in enumerate(coefficients) if value != 0]
    hull: list[tuple[int, float]] = []
    for point in points:
        while len(hull) > 1 and _is_below(hull[-2], hull[-1], point):
            hull.pop()
        hull.append(point)
    starts: list[complex] = []
    for (left, low), (right, high) in pairwise(hull):
        count = right - left
        radius = math.exp((low - high) / count)
        # Alone on its circle a root is real and its sign known. The turn is for two such neighbours that are
        # a pair in truth: from real starts no iteration would leave the real axis.
        sign = -coefficients[left] / coefficients[right] if count == 1 else 1.0
        turns = (2 * math.pi * i / count + (0.1 if count == 1 else 0.7) for i in range(count))
        starts += [math.copysign(radius, sign) * cmath.exp(1j * turn) for turn in turns]
    return starts


def _is_below(left: tuple[int, float], middle: tuple[int, float], right: tuple[int, float]) -> bool:
    chord = left[1] + (right[1] - left[1]) * (middle[0] - left[0]) / (right[0] - left[0])
    return middle[1] <= chord


def _recentre(coefficients: list[float], roots: list[complex]) -> list[complex]:
    """Move repeated roots so that their mean is right to rounding, though each alone cannot be.

    The mean of m coinciding roots is a simple, well-conditioned root of the derivative of order m − 1.
    """
    moved: list[complex] = []
    for group in clusters(roots):
        mean = sum(group) / len(group)
        radius = max(abs(root - mean) for root in group)
        if len(group) == 1 or radius > 10 * EPSILON ** (1 / len(group)) * abs(mean):
            moved += group
            continue
        derivative = np.polynomial.polynomial.polyder(coefficients, len(group) - 1)
        slope = np.polynomial.polynomial.polyder(derivative)
        centre = mean
        for _ in range(3):
            centre -= complex(
                np.polynomial.polynomial.polyval(centre, derivative) / np.polynomial.polynomial.polyval(centre, slope)
            )
        moved += [root + (centre - mean) for root in group]
    return moved


def _pair_conjugates(roots: list[complex]) -> list[complex]:
    """Make roots of a real polynomial exactly real or exactly paired, closest matches first."""
    distances = sorted(
        (abs(a - b.conjugate()), i, j) for i, a in enumerate(roots) for j, b in enumerate(roots) if i <= j
    )
    paired: list[complex] = []
    left = set(range(len(roots)))
    for _, i, j in distances:
        if i not in left or j not in left:
            continue
        left -= {i, j}
        if i == j:
            paired.append(complex(roots[i].real))
        else:
            mean = (roots[i] + roots[j].conjugate()) / 2
            paired += [mean, mean.conjugate()]
    return paired
