"""Cells in which an instrument or a spreadsheet says that it has no reading.

Such a point is left out with its line and reason, if most points have a reading. Any other word where a number
should be stays an error.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import FloatArray

__all__ = ["MOST_WITHOUT", "SCPI_NO_READING", "is_no_reading", "without_reading"]

# The largest share of points without a reading that a sweep may have; a fit leaves out no more, either.
MOST_WITHOUT = 0.1

# Overload, underrange, no value: words of meters, analysers and spreadsheets (common practice, no source).
_SAID = (
    "ovl ovld ovf ovr ol o.l o.l. over overload overflow overrange unlock unlocked uncal "
    "nan -nan +nan inf +inf -inf infinity -infinity +infinity n/a na n.a. n.a null none nil void "
    "invalid err error fail #n/a #n/v #nv #div/0! #num! #value! #wert! #zahl! #ref! ? ??"
)
_WORDS = frozenset(_SAID.split())
_DRAWN = re.compile(r"([-*#_.=\u2013\u2014\u2212])\1+|[-*\u2013\u2014\u2212]")

# What an instrument sends for "not a number" and for an infinity (SCPI-1999, volume 1, section 7.2.1; from memory).
SCPI_NO_READING = (9.91e37, 9.9e37)


def is_no_reading(text: str) -> bool:
    """Whether a cell is empty or says in so many words that there is no reading."""
    cell = text.strip().lower()
    return not cell or cell in _WORDS or bool(_DRAWN.fullmatch(cell))


def without_reading(values: FloatArray) -> NDArray[np.bool_]:
    """Where numbers are the ones that stand for no reading, shape as `values`."""
    if not len(values) or max(values.max(), -values.min()) < min(SCPI_NO_READING):
        return np.zeros(len(values), dtype=bool)
    return np.isin(np.abs(values), SCPI_NO_READING)
