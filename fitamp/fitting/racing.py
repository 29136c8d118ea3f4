"""A plain Levenberg–Marquardt descent, for fits whose end is compared and not reported.

Normal equations with columns scaled by their largest norm so far (J. J. Moré, Lecture Notes in Mathematics 630, 1978)
and the damping of H. B. Nielsen (K. Madsen, H. B. Nielsen and O. Tingleff, Methods for Non-Linear Least Squares
Problems, 2nd ed. 2004, sec. 3.2). They square the condition of the problem and so leave seven digits or so, of which
a race needs no more; what wins is finished by `leastsq.minimise`.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.tall import normal_equations

__all__ = ["Jacobian", "Residual", "descend"]

Residual = Callable[[FloatArray], FloatArray]
Jacobian = Callable[[FloatArray], FloatArray]

# Damping relative to the scaled normal matrix: first; so small that a step is Gauss and Newton's; at the least, which
# keeps directions without information still; and so large that no step would be seen.
FIRST_DAMPING, NEWTON, LEAST_DAMPING, HOPELESS = 1e-2, 1e-6, 1e-13, 1e13
# A step counts that gains this share of what was promised.
WORTHWHILE = 1e-4


def descend(
    residual: Residual,
    jacobian: Jacobian,
    start: Sequence[float] | FloatArray,
    *,
    tolerance: float,
    max_steps: int,
    enough: float = 0.0,
) -> tuple[FloatArray, bool]:
    """Go down from `start` until a step promises or gains no more than `tolerance` of chi-square.

    Or until chi-square is below `enough`, where it is left unsettled.

    Returns
    -------
    values : shape (p,)
    settled : False when `max_steps` evaluations were not enough, or where residuals or slopes are not finite
    """
    values = np.array(start, dtype=float)
    residuals = residual(values)
    matrix, gradient, chi = normal_equations(jacobian(values), residuals)
    if not (np.isfinite(matrix).all() and np.isfinite(chi)):
        return values, False
    longest = np.zeros(len(values))
    damping, growth = FIRST_DAMPING, 2.0
    for _ in range(max_steps - 1):
        longest = np.maximum(longest, np.diag(matrix))
        scale = np.sqrt(np.where(longest > 0, longest, 1.0))
        scaled, slope = matrix / np.outer(scale, scale), gradient / scale
        step = np.linalg.solve(scaled + damping * np.eye(len(values)), -slope)
        promised = float(-(2 * slope + scaled @ step) @ step)
        if promised <= tolerance * chi and damping <= NEWTON:
            return values, True
        trial = values + step / scale
        residuals = residual(trial)
        gained = chi - float(residuals @ residuals)
        if not gained > WORTHWHILE * promised:  # also where it is not a number
            damping, growth = damping * growth, 2 * growth
            if damping > HOPELESS:
                return values, True
            continue
        values = trial
        matrix, gradient, chi = normal_equations(jacobian(values), residuals)
        if not np.isfinite(matrix).all() or chi < enough:
            return values, False
        if max(gained, promised) <= tolerance * chi:
            return values, True
        damping = max(damping * max(1 / 10, 1 - (2 * gained / promised - 1) ** 3), LEAST_DAMPING)
        growth = 2.0
    return values, False
