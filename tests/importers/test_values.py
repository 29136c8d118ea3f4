"""Columns of cells to numbers: the short way for plain numbers reads as the long way does."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from fitamp.errors import SweepError
from fitamp.importers.blocks import Table
from fitamp.importers.cells import number_from
from fitamp.importers.columns import Column
from fitamp.importers.dialect import Block, Separator
from fitamp.importers.notation import Notation
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.readings import is_no_reading
from fitamp.importers.text import Line
from fitamp.importers.values import Values, column_values

FREQUENCY = Column(index=0, name="f", quantity=Quantity.FREQUENCY, unit=Unit.HZ)


def values_of(cells: list[str], column: Column = FREQUENCY, *, decimal: str = ".") -> Values:
    rows = tuple(Line(number=number, text=cell) for number, cell in enumerate(cells, start=11))
    block = Block(separator=Separator.TAB, rows=rows, width=1, above=(), comments=0, trailing=False)
    table = Table(block=block, cells=tuple((cell,) for cell in cells))
    return column_values("a.csv", table, column, Notation(decimal=decimal))


@given(st.text("0123456789+-.eE", min_size=1, max_size=8))
def test_short_way_takes_what_the_long_way_takes(text: str) -> None:
    assume(not is_no_reading(text))
    try:
        expected = number_from(text)
    except ValueError:
        with pytest.raises(SweepError, match=r"a\.csv, line 11, column 1"):
            values_of([text])
    else:
        assert values_of([text]).numbers.tolist() == [expected]
        assert values_of([text.replace(".", ",")], decimal=",").numbers.tolist() == [expected]


@pytest.mark.parametrize(
    ("cell", "message"),
    [
        ("1e400", "'1e400' is too large"),
        ("1e-400", "'1e-400' is too small"),
        ("1_000", "'1_000' is not a number"),
        ("1,5", "'1,5' has a comma where the decimal mark is a point"),
        ("x" * 300, "has 300 characters and is no plain number"),
    ],
)
def test_first_cell_that_is_no_number_is_named(cell: str, message: str) -> None:
    with pytest.raises(SweepError, match=r"a\.csv, line 12, column 1 \('f'\): .*" + message):
        values_of(["1", cell, "2", cell])


def test_cells_without_a_reading_are_faults_with_their_rows() -> None:
    values = values_of(["1", "OVL", "3", "9.9E37", ""])
    assert sorted(values.faults) == [1, 3, 4]
    assert values.faults[1] == "'OVL' is not a number; measure the point again or remove the row"
    assert values.numbers[[0, 2]].tolist() == [1, 3]


def test_complex_cells() -> None:
    column = Column(index=0, name="T", quantity=Quantity.COMPLEX, unit=None)
    values = values_of(["1+2j", "---", "(3,4)", "9.91e37-1j"], column)
    assert sorted(values.faults) == [1, 3]
    assert np.asarray(values.numbers)[[0, 2]].tolist() == [1 + 2j, 3 + 4j]


def test_zero_is_a_number_and_no_underflow() -> None:
    assert values_of(["0", "0.0e-99", "-0"]).numbers.tolist() == [0, 0, 0]
