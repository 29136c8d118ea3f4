"""Products of tall arrays, a block of rows at a time.

In one piece they would wake the threads of the linear algebra, which cost more than they save, on a busy machine much
more; and the last digits would depend on how many threads there are.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray

__all__ = ["normal_equations", "product", "sum_of_squares"]

BLOCK_ROWS = 4096


def product(left: FloatArray, right: FloatArray) -> FloatArray:
    """left' right, shape (p, q) or (p,), of arrays of shapes (m, p) and (m, q) or (m,)."""
    total = left[:BLOCK_ROWS].T @ right[:BLOCK_ROWS]
    for first in range(BLOCK_ROWS, len(left), BLOCK_ROWS):
        rows = slice(first, first + BLOCK_ROWS)
        total += left[rows].T @ right[rows]
    return np.asarray(total)


def normal_equations(slopes: FloatArray, residuals: FloatArray) -> tuple[FloatArray, FloatArray, float]:
    """J'J (p, p), J'r (p,) and r'r of slopes J (m, p) and residuals r (m,)."""
    both = np.column_stack([slopes, residuals])
    gram = product(both, both)
    return gram[:-1, :-1], gram[:-1, -1], float(gram[-1, -1])


def sum_of_squares(values: FloatArray) -> float:
    """v'v of values of shape (m,)."""
    return sum(float(rows @ rows) for rows in np.split(values, range(BLOCK_ROWS, len(values), BLOCK_ROWS)))
