"""A plain Levenberg–Marquardt descent, for fits whose end is compared and not reported.

Normal equations with columns scaled by their largest norm so far (J. J. Moré in Numerical Analysis, Springer 1978)
and the damping of H. B. Nielsen (K. Madsen, H. B. Nielsen and O. Tingleff, Methods for Non-Linear Least Squares
Problems, 2nd ed. 2004, sec. 3.2). They square the condition of the problem and so leave seven digits or so, of which
a race needs no more; what wins is finished by `leastsq.minimise`.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.tall import normal_equations, sum_of_squares

__all__ = ["Descent", "Jacobian", "Residual", "descend"]

Residual = Callable[[FloatArray], FloatArray]
Jacobian = Callable[[FloatArray], FloatArray]

# Damping relative to the scaled normal matrix: first; so small that a step is Gauss and Newton's; at the least, which
# keeps directions without information still; and so large that no step would be seen.
FIRST_DAMPING, NEWTON, LEAST_DAMPING, HOPELESS = 1e-2, 1e-6, 1e-13, 1e13
# The pace is that of so many steps; so many times as many will not be waited for.
PACE, PATIENCE = 20, 50
# A step counts that gains this share of what was promised.
WORTHWHILE = 1e-4


@dataclass(frozen=True, slots=True, kw_only=True)
class Descent:
    """Where a descent ended.

    values : shape (p,)
    matrix : J'J there, shape (p, p)
    settled : False when there were not enough steps, or where residuals or slopes are not finite
    """

    values: FloatArray
    matrix: FloatArray
    settled: bool


def descend(
    residual: Residual,
    jacobian: Jacobian,
    start: Sequence[float] | FloatArray,
    *,
    tolerance: float,
    max_steps: int,
    enough: float = 0.0,
) -> Descent:
    """Go down from `start` until a step promises or gains no more than `tolerance` of chi-square.

    Or until chi-square is below `enough`, where it is left unsettled, or will not come there at its present pace, which
    settles it too; or for `max_steps` evaluations.
    """
    values = np.array(start, dtype=float)
    residuals = residual(values)
    matrix, gradient, chi = normal_equations(jacobian(values), residuals)
    if not (np.isfinite(matrix).all() and np.isfinite(chi)):
        return Descent(values=values, matrix=matrix, settled=False)
    longest = np.zeros(len(values))
    damping, growth = FIRST_DAMPING, 2.0
    settled, taken, landmark = False, 0, chi
    for _ in range(max_steps - 1):
        longest = np.maximum(longest, np.diag(matrix))
        scale = np.sqrt(np.where(longest > 0, longest, 1.0))
        scaled, slope = matrix / np.outer(scale, scale), gradient / scale
        step = np.linalg.solve(scaled + damping * np.eye(len(values)), -slope)
        promised = float(-(2 * slope + scaled @ step) @ step)
        if promised <= tolerance * chi and damping <= NEWTON:
            settled = True
            break
        trial = values + step / scale
        residuals = residual(trial)
        gained = chi - sum_of_squares(residuals)
        if not gained > WORTHWHILE * promised:  # also where it is not a number
            damping, growth = damping * growth, 2 * growth
            if damping > HOPELESS:
                settled = True
                break
            continue
        values = trial
        matrix, gradient, chi = normal_equations(jacobian(values), residuals)
        if not np.isfinite(matrix).all() or chi < enough:
            break
        taken += 1
        if taken % PACE == 0:
            landmark, pace = chi, landmark - chi
            settled = enough > 0 and PATIENCE * pace < chi - enough
        if settled or max(gained, promised) <= tolerance * chi:
            settled = True
            break
        damping = max(damping * max(1 / 10, 1 - (2 * gained / promised - 1) ** 3), LEAST_DAMPING)
        growth = 2.0
    return Descent(values=values, matrix=matrix, settled=settled)
