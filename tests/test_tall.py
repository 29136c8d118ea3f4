"""Products by blocks are the products."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.tall import BLOCK_ROWS, normal_equations, product, sum_of_squares


@pytest.mark.parametrize("rows", [1, 7, BLOCK_ROWS, BLOCK_ROWS + 1, 3 * BLOCK_ROWS - 5])
def test_blocks_add_up_to_numpys_product(rows: int) -> None:
    rng = np.random.default_rng(rows)
    left, right = rng.standard_normal((rows, 4)), rng.standard_normal((rows, 2))
    assert product(left, right) == pytest.approx(np.einsum("mp,mq->pq", left, right), rel=1e-10, abs=1e-10)
    assert product(left, right[:, 0]) == pytest.approx(np.einsum("mp,m->p", left, right[:, 0]), rel=1e-10, abs=1e-10)
    matrix, gradient, total = normal_equations(left, right[:, 0])
    assert matrix == pytest.approx(np.einsum("mp,mq->pq", left, left), rel=1e-10, abs=1e-10)
    assert gradient == pytest.approx(np.einsum("mp,m->p", left, right[:, 0]), rel=1e-10, abs=1e-10)
    assert total == pytest.approx(np.einsum("m,m->", right[:, 0], right[:, 0]), rel=1e-12)
    assert sum_of_squares(right[:, 0]) == pytest.approx(total, rel=1e-12)
