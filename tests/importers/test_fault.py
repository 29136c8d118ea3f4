"""The line of a refused file, with a mark under the fault."""

from __future__ import annotations

import pickle
from pathlib import Path

import pytest
from bench_tables import file_of

from fitamp.errors import SweepError
from fitamp.importers import read_sweep
from fitamp.importers.fault import LineError, at_line, excerpt, span_of

GOOD = "freq_hz,re,im\n10,9,-1\n20,9,-2\n40,8,-4\n"
SHOWN = {
    "cell": ("a.csv", GOOD + "80, abc ,1\n", "    5 | 80, abc ,1\n      |     ^^^"),
    "the right one of equal cells": ("a.csv", GOOD + "80,80,x80\n", "    5 | 80,80,x80\n      |       ^^^"),
    "empty cell": ("a.csv", GOOD + "80,,1\n", "    5 | 80,,1\n      |    ^"),
    "whole line": ("a.csv", GOOD + "  stop here\n", "    5 |   stop here\n      |   ^^^^^^^^^"),
    "quote": ("a.csv", GOOD + '80,"1,1\n', '    5 | 80,"1,1\n      |    ^'),
    "wide characters": ("a.csv", GOOD + "80,周波,数数数\n", "    5 | 80,周波,数数数\n      |    ^^^^"),
    "escape": ("a.csv", GOOD + "80,a\x1b[31mb,1\n", None),
    "tabs": ("a.csv", GOOD.replace(",", "\t") + "80\t\u202ex\t1\n", "    5 | 80\\t\\u202ex\\t1\n      |     ^^^^^^^"),
    "notation": ("a.csv", "freq_hz;re;im\n1.5;2,5;3\n", "    2 | 1.5;2,5;3\n      |     ^^^"),
    "order": ("a.csv", GOOD + "30,1,1\n", "    5 | 30,1,1\n      | ^^^^^^"),
    "number of a Touchstone file": ("a.s1p", "# Hz S RI\n1 2 3\n2 x 3\n", "    3 | 2 x 3\n      |   ^"),
    "option of a Touchstone file": ("a.s1p", "# Hz S RX\n1 2 3\n", "    1 | # Hz S RX\n      |        ^^"),
}


@pytest.mark.parametrize("name", SHOWN)
def test_refused_file_shows_its_line_with_a_mark(tmp_path: Path, name: str) -> None:
    file, content, shown = SHOWN[name]
    path = file_of(tmp_path, content, file)
    with pytest.raises(SweepError, match=f"{file}, line ") as caught:
        read_sweep(path)
    if shown is None:
        shown = "    5 | 80,a\\x1b[31mb,1\n      |     ^^^^"
    assert "\n".join(caught.value.excerpt) == shown
    assert "\n" not in str(caught.value)


def test_binary_file_shows_the_line_with_escapes(tmp_path: Path) -> None:
    with pytest.raises(SweepError, match="line 2: this is a binary file") as caught:
        read_sweep(file_of(tmp_path, b"\x80\n12\x00\xff"))
    assert caught.value.excerpt == ("    2 | 12\\x00ÿ", "      |   ^^^^")


def test_fault_of_a_whole_file_has_no_line_to_show(tmp_path: Path) -> None:
    with pytest.raises(SweepError, match="the file is empty") as caught:
        read_sweep(file_of(tmp_path, ""))
    assert caught.value.excerpt == ()


def test_long_lines_are_cut_round_the_fault() -> None:
    text = "1," * 500 + "bad" + ",2" * 500
    line, marks = excerpt(7, text, (1000, 1003))
    assert len(line) <= 100
    assert (line[8], line[-1]) == ("…", "…")
    assert line[marks.index("^") : marks.index("^") + 3] == "bad"
    line, marks = excerpt(7, "x" * 10_000, None)
    assert max(len(line), len(marks)) <= 100
    assert marks.count("^") == 45


def test_cell_is_found_behind_its_fellows() -> None:
    assert span_of("1, 1 ,1", ["1", "1", "1"], 2) == (6, 7)
    assert span_of('"a""b",c', ['a"b', "c"], 1) is None


def test_error_survives_another_process() -> None:
    error = at_line("a.csv", 3, "is wrong", where="column 1", span=(0, 1))
    again = pickle.loads(pickle.dumps(error))
    assert (str(again), again.line, again.span) == ("a.csv, line 3, column 1: is wrong", 3, (0, 1))
    assert isinstance(again, LineError)
