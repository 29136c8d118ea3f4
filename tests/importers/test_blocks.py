"""Tables of one file: where one ends and the next begins."""

from __future__ import annotations

import pytest

from fitamp.errors import SweepError
from fitamp.importers.blocks import Table, find_tables
from fitamp.importers.dialect import find_block
from fitamp.importers.text import Line

HEADER = "freq_hz,re,im\n"
ROWS = "1,2,3\n2,3,4\n4,5,6\n"


def tables_of(text: str) -> tuple[Table, ...]:
    lines = [Line(number=number, text=line) for number, line in enumerate(text.splitlines(), start=1)]
    return find_tables("a.csv", find_block("a.csv", lines), lines)


def test_header_among_the_rows_begins_a_table_with_the_lines_above_it() -> None:
    first, second = tables_of(f"lab\n{HEADER}{ROWS}\nrun 2\n# drive 10 mV\n{HEADER}Hz,,\n1,7,8\n# x\n2,8,9\n")
    assert [line.number for line in first.rows] == [3, 4, 5]
    assert [line.text for line in first.block.above] == ["lab", "freq_hz,re,im"]
    assert [line.number for line in second.rows] == [11, 13]
    assert [line.text for line in second.block.above if line.text] == [
        "run 2", "# drive 10 mV", "freq_hz,re,im", "Hz,,"
    ]  # fmt: skip
    assert second.cells == (("1", "7", "8"), ("2", "8", "9"))
    assert (first.block.comments, second.block.comments) == (0, 1)


def test_header_is_known_again_where_its_words_mean_nothing() -> None:
    assert len(tables_of(f"a,b,c\n{ROWS}a,b,c\n{ROWS}")) == 2


def test_rows_without_a_reading_are_no_header() -> None:
    (table,) = tables_of(f"{HEADER}{ROWS}---,---,---\nOVL,OVL,OVL\n8,9,10\n")
    assert len(table.rows) == 6


def test_line_that_says_the_table_ends_is_taken_off() -> None:
    (table,) = tables_of(f"{HEADER}{ROWS}END OF DATA\n")
    assert [line.text for line in table.closing] == ["END OF DATA"]
    assert len(table.rows) == 3


def test_more_rows_or_tables_than_a_file_may_have_are_refused() -> None:
    with pytest.raises(SweepError, match="more than the 1000 sweeps that a file may hold; split it"):
        tables_of((HEADER + ROWS) * 1001)
    wide = "1," * 20_000 + "1\n"
    with pytest.raises(SweepError, match="500 rows of 20001 columns are more than the 10000000 cells that a table may"):
        tables_of(wide * 500)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (f"{HEADER}{ROWS}stop\n", "a.csv, line 5: 'stop' stands among the rows of numbers"),
        (f"{HEADER}{ROWS}stop\n{ROWS}", "a.csv, line 5: 'stop' stands among the rows of numbers"),
        (f"{HEADER}{ROWS}END\n{ROWS}", "a.csv, line 5: 'END' stands among the rows of numbers"),
        (f"{HEADER}{ROWS}f,re\n1,2\n", "a.csv, line 5: 'f,re' stands among the rows of numbers"),
        (f"{HEADER}{ROWS}1,2\n", "a.csv, line 5: 2 cells where other rows have 3"),
        (f'{HEADER}{ROWS}1,"2,3\n', "a.csv, line 5: a quote is not closed on this line"),
    ],
)
def test_other_words_and_uneven_rows_are_refused(text: str, message: str) -> None:
    with pytest.raises(SweepError, match=message):
        tables_of(text)
