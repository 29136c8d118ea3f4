"""Weighted least squares by lmfit, as one function with a frozen answer.

Residuals are real and already divided by their standard deviation; a complex residual is interleaved re, im by
`interleaved`, because lmfit flattens complex arrays that way and a Jacobian in another order fails silently.
lmfit's own objects stay in here.

Fits that are only to tell which start is best, or how far chi-square has risen, go by `racing.descend`: lmfit's
bookkeeping takes ten times as long as their arithmetic. And MINPACK's C code as in scipy 1.17 reads one number beyond
the Jacobian when it renews the norm of a column that nearly depends on the others, so that such a start runs
differently from one call to the next.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray, frozen_float
from fitamp.fitting.racing import Jacobian, Residual, descend
from fitamp.tall import sum_of_squares

__all__ = ["Optimum", "covariance_of", "interleaved", "minimise", "triangle_of"]

# MINPACK's relative tolerances on chi-square and parameters: at lmfit's defaults (1.5e-8) the NIST set MGH09 stops
# early with success=True; at rounding level it reaches the certified digits.
TOLERANCE = 1e-15
# From this tolerance on the end is not reported, but weighed against others.
COARSE = 1e-9
# Eigenvalues of the scaled J'J above this share of the largest leave its inverse nine digits.
WELL_CONDITIONED = 1e-7
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
    enough: float = 0.0,
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
        Relative, on chi-square and on parameters, at which to stop. From 1e-9 on (and with a Jacobian) the descent is
        our own.
    max_steps
        Evaluations (times p + 1 where the derivatives are differences) after which to give up.
    enough
        Chi-square below which our own descent ends at once, not converged.

    Returns
    -------
    Optimum
        `converged` is False when the descent gave up or the end point is not finite; it proves no global minimum.
    """
    names = tuple(names)
    if jacobian is not None and tolerance >= COARSE:
        end = descend(residual, jacobian, start, tolerance=tolerance, max_steps=max_steps, enough=enough)
        values, settled, covariance = end.values, end.settled, _inverse(end.matrix)
    else:
        values, settled, covariance = _by_lmfit(
            residual, start, names=names, jacobian=jacobian, tolerance=tolerance, max_steps=max_steps
        )
    residuals = residual(values)
    if covariance is None:
        nothing = np.diag(np.full(len(names), UNDETERMINED_VARIANCE))
        covariance = nothing if jacobian is None else covariance_of(jacobian(values))
    return Optimum(
        names=names,
        values=frozen_float(values),
        covariance=frozen_float(covariance),
        chi_square=sum_of_squares(residuals),
        residuals=frozen_float(residuals),
        converged=settled and bool(np.isfinite(residuals).all()),
    )


def _by_lmfit(
    residual: Residual,
    start: Sequence[float] | FloatArray,
    *,
    names: tuple[str, ...],
    jacobian: Jacobian | None,
    tolerance: float,
    max_steps: int,
) -> tuple[FloatArray, bool, FloatArray | None]:
    """Where lmfit ended, whether it says that it is there, and its covariance, where there is no Jacobian for one."""
    import lmfit

    class Minimizer(lmfit.Minimizer):  # type: ignore[misc]  # lmfit has no types
        def _calculate_uncertainties_correlations(self) -> None:
            """Skipped: errors come from `covariance_of`."""

    def values_of(current: Any) -> FloatArray:
        return np.array([current[name].value for name in names])

    # A list spares lmfit a copy of its expression evaluator, which takes longer than a fit.
    parameters = [lmfit.Parameter(name, value=float(value)) for name, value in zip(names, start, strict=True)]
    options: dict[str, Any] = {"ftol": tolerance, "xtol": tolerance, "gtol": 0.0}
    if jacobian is None:
        options |= {"epsfcn": TOLERANCE, "max_nfev": max_steps * (len(names) + 1)}
    else:
        options["max_nfev"] = max_steps
        options["Dfun"] = lambda current: jacobian(values_of(current))
    # lmfit leaves numpy's error state changed when a residual raises; the context puts it back.
    with np.errstate():
        minimizer = Minimizer(
            lambda current: residual(values_of(current)), parameters, scale_covar=False, nan_policy="propagate"
        )
        result = minimizer.leastsq(**options)
    # MINPACK's codes 1-4 are convergence, 6-8 say that the tolerance asked for is below rounding: both are the end.
    settled = result.ier in {1, 2, 3, 4, 6, 7, 8}
    own = None if jacobian is not None or result.covar is None else np.asarray(result.covar, dtype=float)
    return values_of(result.params), settled, own


def _inverse(matrix: FloatArray) -> FloatArray | None:
    """Inverse of J'J; None where it is so nearly singular that the Jacobian itself has to be looked at."""
    if not np.isfinite(matrix).all() or not (np.diag(matrix) > 0).all():
        return None
    scale = np.sqrt(np.diag(matrix))
    eigenvalues, vectors = np.linalg.eigh(matrix / np.outer(scale, scale))
    if eigenvalues[0] < WELL_CONDITIONED * eigenvalues[-1]:
        return None
    return np.asarray((vectors / eigenvalues) @ vectors.T / np.outer(scale, scale), dtype=float)


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
