"""Array types used across fitamp, and the one way in which a frozen value keeps an array."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["ComplexArray", "FloatArray", "frozen_complex", "frozen_float"]

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


def frozen_float(values: ArrayLike) -> FloatArray:
    """Return a read-only float copy of `values`."""
    return _read_only(np.array(values, dtype=np.float64))


def frozen_complex(values: ArrayLike) -> ComplexArray:
    """Return a read-only complex copy of `values`."""
    return _read_only(np.array(values, dtype=np.complex128))


def _read_only(array: NDArray[Any]) -> NDArray[Any]:
    array.setflags(write=False)
    return array
