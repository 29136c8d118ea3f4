"""Decimal marks and thousands separators: one way of writing reads all numbers of a file, or it is refused."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.errors import SweepError
from fitamp.importers.cells import number_from
from fitamp.importers.notation import Notation, find_notation, may_tell

POINT, COMMA = Notation(), Notation(decimal=",")


def notation_of(cells: list[str]) -> Notation:
    return find_notation("a.csv", list(enumerate(cells, start=1)))[0]


@pytest.mark.parametrize(
    ("cells", "notation"),
    [
        (["1.5", "2"], POINT),
        (["1", "2"], POINT),
        (["1.000", "10.000"], POINT),
        (["1,5", "2"], COMMA),
        (["1,000", "2,5"], COMMA),
        (["0,125"], COMMA),
        (["1,250e3"], COMMA),
        (["(1.5,2.5)"], POINT),
        (["(1,5)", "3"], POINT),
        (["(1,5;2,5)"], COMMA),
        (["1,5+2,5j"], COMMA),
        (["OK, 2.5 V"], POINT),
        (["1,000.5"], Notation(thousands=",")),
        (["1,000,000", "2"], Notation(thousands=",")),
        (["1,000", "2.5"], Notation(thousands=",")),
        (["1.000,5"], Notation(decimal=",", thousands=".")),
        (["1.000.000", "2"], Notation(decimal=",", thousands=".")),
        (["1.000", "59,98"], Notation(decimal=",", thousands=".")),
        (["1'000", "2.5"], Notation(thousands="'")),
        (["1\N{RIGHT SINGLE QUOTATION MARK}000"], Notation(thousands="'")),
        (["1 000 000", "2"], Notation(thousands=" ")),
        (["1\N{NARROW NO-BREAK SPACE}000", "59,98"], Notation(decimal=",", thousands=" ")),
        (["1 000,5 Hz"], Notation(decimal=",", thousands=" ")),
        (["-1,234,567.8", "1,5.2"], None),
    ],
)
def test_the_one_way_that_reads_all_cells_is_found(cells: list[str], notation: Notation | None) -> None:
    if notation is None:
        with pytest.raises(SweepError, match=r"a\.csv, line 1: '-1,234,567\.8' has thousands separators"):
            notation_of(cells)
    else:
        assert notation_of(cells) == notation


@pytest.mark.parametrize(
    ("cells", "message"),
    [
        (["1,000", "12,000"], "a.csv, line 1: '1,000' may have a decimal comma or a thousands separator"),
        (["1.000", "59,980"], "a.csv, line 2: '59,980' may have a decimal comma or a thousands separator"),
        (["1,5", "1,000,000"], "a.csv, line 2: '1,000,000' has thousands separators"),
        (["2.5", "1,5"], "a.csv, line 2: '1,5' has a comma where other cells have a decimal point"),
        (["1.000.00"], "a.csv, line 1: '1.000.00' is not a number"),
        (["1'000", "1 000"], 'a.csv, line 1: "1\'000" has thousands separators'),
    ],
)
def test_comma_that_could_be_two_things_is_refused(cells: list[str], message: str) -> None:
    with pytest.raises(SweepError, match=message):
        notation_of(cells)


@given(st.lists(st.integers(1000, 10**12), min_size=1), st.sampled_from([",", ".", "'", " "]))
def test_numbers_written_in_groups_come_back(values: list[int], mark: str) -> None:
    # Python's own format with "," is the reference for the groups; the extra cell leaves one way of writing.
    decimal = "," if mark == "." else "."
    cells = [*(f"{value:,}".replace(",", mark) for value in values), f"0{decimal}5"]
    way = notation_of(cells)
    assert way == Notation(decimal=decimal, thousands=mark)
    read = [number_from(cell, decimal=way.decimal, thousands=way.thousands) for cell in cells]
    assert read == [*values, 0.5]


def test_decisions_name_the_cell_that_decides() -> None:
    _, (decimal, thousands) = find_notation("a.csv", [(7, "12"), (8, "1.000,5")])
    assert (decimal.topic, decimal.choice) == ("decimal mark", "comma")
    assert (thousands.topic, thousands.choice) == ("thousands separator", "point")
    assert "'1.000,5' on line 8" in thousands.reason


def test_columns_with_single_points_tell_nothing() -> None:
    assert not may_tell("1.5\n2\n-3e5")
    for column in ("1\n1,5", "1.000.000", "1'000", "1 000"):
        assert may_tell(column)
