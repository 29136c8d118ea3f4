"""The cells of one column to numbers: all at once where they are plain, one by one where they are not."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.importers.blocks import Table
from fitamp.importers.cells import complex_from, number_from
from fitamp.importers.columns import Column
from fitamp.importers.notation import Notation
from fitamp.importers.quantity import Quantity
from fitamp.importers.readings import is_no_reading, without_reading
from fitamp.importers.tails import doubt_of_tail, tails_of

__all__ = ["Values", "column_values"]

_NOT_PLAIN = re.compile(r"[^0-9+\-.eE\n]")
_NOT_PLAIN_WITH_COMMA = re.compile(r"[^0-9+\-,eE\n]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Values:
    """Numbers of a column, shape (n,), and what is wrong with those that are no reading, by row from 0.

    Where a row is among the `faults` its number means nothing.
    """

    numbers: FloatArray | ComplexArray
    faults: dict[int, str]


def column_values(file: str, table: Table, column: Column, notation: Notation) -> Values:
    """Convert a column.

    Raises
    ------
    SweepError
        For the first cell that is neither a number nor says that there is none.
    """
    texts = table.texts(column.index)
    plain = None if column.quantity is Quantity.COMPLEX else _plain_floats(texts, notation.decimal)
    if plain is not None:
        return Values(numbers=plain, faults=_scpi_faults(plain, texts))
    read = _reader(column, notation)
    numbers: list[float | complex] = []
    faults: dict[int, str] = {}
    for row, text in enumerate(texts):
        try:
            numbers.append(read(text))
        except ValueError as error:
            if not is_no_reading(text):
                reason = doubt_of_tail(text, column.quantity, column.unit) or str(error)
                raise table.fault(file, row, reason, index=column.index, label=column.label) from None
            faults[row] = str(error)
            numbers.append(0.0)
    array = np.array(numbers)
    return Values(numbers=array, faults=faults | _scpi_faults(array, texts))


def _reader(column: Column, notation: Notation) -> Callable[[str], float | complex]:
    if column.quantity is Quantity.COMPLEX:
        return partial(complex_from, decimal=notation.decimal)
    tails = tails_of(column.quantity, column.unit)
    return partial(number_from, decimal=notation.decimal, thousands=notation.thousands, tails=tails)


def _scpi_faults(values: FloatArray | ComplexArray, texts: Sequence[str]) -> dict[int, str]:
    found = np.flatnonzero(without_reading(values.real) | without_reading(values.imag))
    reason = "is what instruments send for no reading; measure the point again or remove the row"
    return {row: f"{texts[row]!r} {reason}" for row in found.tolist()}


def _plain_floats(texts: Sequence[str], decimal: str) -> FloatArray | None:
    """All cells at once; None where one of them is anything but a plain number within a double's range.

    Python's `float` reads exactly what `number_from` does, where no other characters are there.
    """
    joined = "\n".join(texts)
    if (_NOT_PLAIN if decimal == "." else _NOT_PLAIN_WITH_COMMA).search(joined):
        return None
    if decimal == ",":
        texts = joined.replace(",", ".").split("\n")
    try:
        values = np.fromiter(map(float, texts), dtype=float, count=len(texts))
    except ValueError:
        return None
    if not np.isfinite(values).all():
        return None
    zeros = np.flatnonzero(values == 0)
    if any(re.search("[1-9]", re.split("[eE]", texts[row])[0]) for row in zeros.tolist()):
        return None
    return values
