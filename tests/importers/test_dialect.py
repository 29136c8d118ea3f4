"""Layout of a text table: separator, decimal mark, first row."""

from __future__ import annotations

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.importers.dialect import Separator, find_block, is_comment, split_cells, uncommented
from fitamp.importers.text import Line

WORDS = st.text(st.characters(codec="ascii", exclude_characters='"()', exclude_categories=["Cc"]), max_size=8)


def lines(text: str) -> list[Line]:
    return [Line(number=number, text=line) for number, line in enumerate(text.split("\n"), start=1)]


@given(st.lists(WORDS.map(str.strip), min_size=2, max_size=5), st.sampled_from([",", ";", "\t"]))
def test_cells_written_by_the_csv_module_come_back(cells: list[str], separator: str) -> None:
    stream = io.StringIO()
    csv.writer(stream, delimiter=separator, quoting=csv.QUOTE_ALL, lineterminator="").writerow(cells)
    assert split_cells(stream.getvalue(), Separator(separator)) == tuple(cells)


@pytest.mark.parametrize(
    ("text", "separator", "cells"),
    [
        ("1, 2 ,3", Separator.COMMA, ("1", "2", "3")),
        ("1,5;2,7", Separator.SEMICOLON, ("1,5", "2,7")),
        ('"1,5","2,7"', Separator.COMMA, ("1,5", "2,7")),
        ("1\t\t3", Separator.TAB, ("1", "", "3")),
        ("  1   2\t3 ", Separator.SPACE, ("1", "2", "3")),
        ("1,(2,3)", Separator.COMMA, ("1", "(2,3)")),
        ("1 (2, 3)", Separator.SPACE, ("1", "(2, 3)")),
        ("1,5;(2,5;3,5)", Separator.SEMICOLON, ("1,5", "(2,5;3,5)")),
    ],
)
def test_line_is_split(text: str, separator: Separator, cells: tuple[str, ...]) -> None:
    assert split_cells(text, separator) == cells


def test_open_quote_is_refused() -> None:
    with pytest.raises(ValueError, match="a quote is not closed on this line"):
        split_cells('1,"2', Separator.COMMA)


@pytest.mark.parametrize("text", ["# a", "! a", "% a", "// a", "  #a", "## a"])
def test_comment_marks(text: str) -> None:
    assert is_comment(text)
    assert uncommented(text) == "a"
    assert not is_comment("a # b")


@pytest.mark.parametrize(
    ("text", "separator", "first"),
    [
        ("f,a,b\n1,2,3\n2,3,4", Separator.COMMA, 2),
        ("f;a;b\n1,5;2,5;3,5\n2,5;3,5;4,5", Separator.SEMICOLON, 2),
        ("f\ta\n1,5\t2,5\n2,5\t3,5", Separator.TAB, 2),
        ("f a\n1,5 2,5\n2,5 3,5", Separator.SPACE, 2),
        ("Points, 201, 10\nDate, 2026-01-05\n\nf,a,b\nHz,dB,deg\n1,2,3\n2,3,4", Separator.COMMA, 6),
        ("f,a,b\n1,OVL,OVL\n2,3,4\n3,4,5", Separator.COMMA, 2),
        ("# 1,2\n1,2\n# 3\n\n2,3", Separator.COMMA, 2),
        ("f,a\n1,2", Separator.COMMA, 2),
    ],
)
def test_separator_and_first_row_are_told_from_the_numbers(text: str, separator: Separator, first: int) -> None:
    block = find_block("a.csv", lines(text))
    assert (block.separator, block.rows[0].number) == (separator, first)


def test_separator_at_row_ends_is_taken_off_only_where_every_row_has_it() -> None:
    every = find_block("a.csv", lines("f,a,\n1,2,\n2,3,"))
    assert (every.width, every.trailing) == (2, True)
    some = find_block("a.csv", lines("f,a,note\n1,2,\n2,3,x"))
    assert (some.width, some.trailing) == (3, False)
