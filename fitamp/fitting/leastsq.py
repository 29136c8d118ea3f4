"""Weighted least squares by lmfit, as one function with a frozen answer.

Residuals are real and already divided by their standard deviation; a complex residual is interleaved re, im by
`interleaved`, because lmfit flattens complex arrays that way and a Jacobian in another order fails silently.
lmfit's own objects stay in here.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray, frozen_float

__all__ = ["Optimum", "covariance_of", "interleaved", "minimise", "triangle_of"]

Residual = Callable[[FloatArray], FloatArray]
Jacobian = Callable[[FloatArray], FloatArray]

# MINPACK's relative tolerances on chi-square and parameters: at lmfit's defaults (1.5e-8) the NIST set MGH09 stops
# early with success=True; at rounding level it reaches the certified digits.
TOLERANCE = 1e-15
# Singular values of the scaled Jacobian below this share of the largest carry rounding, not information.
RANK_RTOL = 1e-12
UNDETERMINED_VARIANCE = 1e30
# A fit that converges takes some tens of steps, NIST's hardest 513. In the curved valley of an exact
# sweep with two lags free MINPACK would go on for its default of thousands.
MAX_STEPS = 1000
# Rows that are brought to a triangle at a time. More of them would wake every thread of the linear algebra, which on a
# busy machine wait for one another a thousand times longer than they work.
BLOCK_ROWS = 512


@dataclass(frozen=True, slots=True, kw_only=True)
class Optimum:
    """Where a least-squares fit ended.

    values : shape (p,), in the order of `names`
    covariance : shape (p, p), for residuals in units of their standard deviation (never rescaled by chi-square);
        a direction about which the data say nothing has a variance of 1e30
    chi_square : sum of squared residuals
    residuals : shape (m,)
    """

    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    chi_square: float
    residuals: FloatArray
    converged: bool

    def stderr(self, name: str) -> float:
        """One standard deviation of a parameter."""
        index = self.names.index(name)
        return float(np.sqrt(self.covariance[index, index]))


def interleaved(values: ComplexArray) -> FloatArray:
    """Rows re, im, re, im … of a complex array of shape (n,) or (n, p): float of shape (2n,) or (2n, p)."""
    return np.stack([values.real, values.imag], axis=1).reshape(2 * len(values), *values.shape[1:])


def minimise(
    residual: Residual,
    start: Sequence[float] | FloatArray,
    *,
    names: Sequence[str],
    jacobian: Jacobian | None = None,
    tolerance: float = TOLERANCE,
    max_steps: int = MAX_STEPS,
) -> Optimum:
    """Minimise the sum of squared residuals from `start` with lmfit's Levenberg–Marquardt (MINPACK).

    Parameters
    ----------
    residual
        Parameter values of shape (p,) to residuals of shape (m,), in standard deviations.
    start : shape (p,)
        All parameters are unbounded: whoever needs a bound transforms.
    jacobian
        Values to derivatives of shape (m, p); differences where None.
    tolerance
        Relative, on chi-square and on parameters, at which to stop.
    max_steps
        Evaluations (times p + 1 where the derivatives are differences) after which to give up.

    Returns
    -------
    Optimum
        `converged` is False when MINPACK gave up or the end point is not finite; it proves no global minimum.
    """
    import lmfit

    names = tuple(names)
    parameters = lmfit.Parameters()
    for name, value in zip(names, start, strict=True):
        parameters.add(name, value=float(value))

    def values_of(current: Any) -> FloatArray:
        return np.array([current[name].value for name in names])

    options: dict[str, Any] = {"ftol": tolerance, "xtol": tolerance, "gtol": 0.0}
    if jacobian is None:
        options |= {"epsfcn": TOLERANCE, "max_nfev": max_steps * (len(names) + 1)}
    else:
        options["max_nfev"] = max_steps
        options["Dfun"] = lambda current: jacobian(values_of(current))
    # lmfit leaves numpy's error state changed when a residual raises; the context puts it back.
    with np.errstate():
        minimizer = lmfit.Minimizer(
            lambda current: residual(values_of(current)), parameters, scale_covar=False, nan_policy="propagate"
        )
        result = minimizer.leastsq(**options)
    values = values_of(result.params)
    residuals = residual(values)
    if jacobian is not None:
        covariance = covariance_of(jacobian(values))
    elif result.covar is not None:
        covariance = np.asarray(result.covar, dtype=float)
    else:
        covariance = np.diag(np.full(len(names), UNDETERMINED_VARIANCE))
    # MINPACK's codes 1-4 are convergence, 6-8 say that the tolerance asked for is below rounding: both are the end.
    converged = result.ier in {1, 2, 3, 4, 6, 7, 8} and bool(np.isfinite(residuals).all())
    return Optimum(
        names=names,
        values=frozen_float(values),
        covariance=frozen_float(covariance),
        chi_square=float(residuals @ residuals),
        residuals=frozen_float(residuals),
        converged=converged,
    )


def covariance_of(jacobian: FloatArray) -> FloatArray:
    """Inverse of J'J by singular values, columns scaled first; empty directions get a huge variance."""
    if not np.isfinite(jacobian).all():
        return np.asarray(np.diag(np.full(jacobian.shape[1], UNDETERMINED_VARIANCE)))
    scale = np.linalg.norm(jacobian, axis=0)
    scale = np.where(scale > 0, scale, 1.0)
    _, singular, rotation = np.linalg.svd(triangle_of(jacobian / scale), full_matrices=False)
    informative = singular > RANK_RTOL * singular.max(initial=0.0)
    variance = np.where(informative, 1 / np.where(informative, singular, 1.0) ** 2, UNDETERMINED_VARIANCE)
    scaled: FloatArray = (rotation.T * variance) @ rotation
    return np.asarray(scaled / np.outer(scale, scale), dtype=float)


def triangle_of(matrix: FloatArray) -> FloatArray:
    """A triangle R with R'R = A'A, of p columns and at most p rows, of a tall matrix A of p columns."""
    triangle = np.zeros((0, matrix.shape[1]))
    for first in range(0, max(len(matrix), 1), BLOCK_ROWS):
        block = np.vstack([triangle, matrix[first : first + BLOCK_ROWS]])
        triangle = np.asarray(np.linalg.qr(block, mode="r"), dtype=float)
    return triangle
