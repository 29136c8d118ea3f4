"""Cells to numbers: Python's float and complex are the reference for what is read, and more is refused."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.importers.cells import complex_from, is_complex_like, is_number_like, number_from, show

NUMBERS = st.floats(allow_nan=False, allow_infinity=False)


@given(NUMBERS)
def test_any_double_comes_back_to_the_bit(value: float) -> None:
    for text in (repr(value), f"{value:.17g}", f" {value:+.16e} ".upper()):
        read = number_from(text)
        assert read == value
        assert math.copysign(1, read) == math.copysign(1, value)
    assert number_from(repr(value).replace(".", ","), decimal=",") == value
    assert number_from(repr(value).replace("-", "\N{MINUS SIGN}")) == value
    assert is_number_like(repr(value))


@given(NUMBERS, NUMBERS)
def test_complex_numbers_come_back_in_every_notation(re: float, im: float) -> None:
    value = complex(re, im)
    sign = "-" if math.copysign(1, im) < 0 else "+"
    for text in (
        f"{re!r}{sign}{abs(im)!r}j",
        f"({re!r}{sign}{abs(im)!r}j)",
        f"{re!r} {sign} {abs(im)!r}i",
        f"{re!r}{sign}j{abs(im)!r}",
        f"{re!r} {sign} {abs(im)!r}*i",
        f"({re!r},{im!r})",
        f"({re!r}; {im!r})",
    ):
        assert complex_from(text) == value
        assert is_complex_like(text)
    assert complex_from(f"({re!r};{im!r})".replace(".", ","), decimal=",") == value


def test_pure_real_and_pure_imaginary_are_complex_numbers() -> None:
    assert complex_from("1.5") == 1.5
    assert complex_from("-2.5e-3j") == -2.5e-3j
    assert complex_from(str(2.5j)) == 2.5j


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "the cell is empty"),
        ("NaN", "'NaN' is not a finite number"),
        ("#N/A", "'#N/A' is not a finite number"),
        ("-Infinity", "'-Infinity' is not a finite number"),
        ("1D3", "'1D3' has a Fortran exponent"),
        ("1.5d-3", "'1.5d-3' has a Fortran exponent"),
        ("1e400", "'1e400' is too large"),
        ("-1e-400", "'-1e-400' is too small"),
        ("1,000.5", "'1,000.5' has thousands separators"),
        ("1 000 000", "'1 000 000' has thousands separators"),
        ("1'000", "has thousands separators"),
        ("1.000.000", "'1.000.000' has thousands separators"),
        ("1\u202f000", "has thousands separators"),
        ("1,5", "'1,5' has a comma where the decimal mark is a point"),
        ("1k", "'1k' has a prefix or unit"),
        ("10 MHz", "'10 MHz' has a prefix or unit"),
        ("1+2j", "'1\\+2j' is a complex number where a real one belongs"),
        ("OVL", "'OVL' is not a number"),
        ("---", "'---' is not a number"),
        ("1_000", "'1_000' is not a number"),
        ("0x10", "'0x10' is not a number"),
        ("\N{ARABIC-INDIC DIGIT ONE}", "is not a number"),
        ("(1.5)", "'\\(1.5\\)' is not a number"),
        ("1..5", "is not a number"),
        ("1e", "is not a number|has a prefix or unit"),
        ("--1", "'--1' is not a number"),
    ],
)
def test_all_else_is_refused_with_the_likely_reason(text: str, reason: str) -> None:
    with pytest.raises(ValueError, match=reason):
        number_from(text)


def test_point_is_refused_where_the_decimal_mark_is_a_comma() -> None:
    with pytest.raises(ValueError, match=r"'1\.5' has a point where the decimal mark is a comma"):
        number_from("1.5", decimal=",")
    with pytest.raises(ValueError, match=r"'1\.000,5' has thousands separators"):
        number_from("1.000,5", decimal=",")


@pytest.mark.parametrize("text", ["1+2", "(1.5)", "1.2+3.4k", "j", "OVL", "1e400+1j", "(1,2,3)"])
def test_broken_complex_numbers_are_refused(text: str) -> None:
    with pytest.raises(ValueError, match=r"is not a complex number such as|is too large"):
        complex_from(text)


@pytest.mark.parametrize("text", ["1D3", "1k", "1'000", "10 Hz", "1e400", "-3,5", ".5", "\N{MINUS SIGN}2"])
def test_wrongly_written_numbers_still_mark_a_row_of_data(text: str) -> None:
    assert is_number_like(text)


@pytest.mark.parametrize("text", ["", "OVL", "---", "freq", "S21", "2026-01-05", "10:30:00", "dB", "1 2"])
def test_words_and_dates_do_not_mark_a_row_of_data(text: str) -> None:
    assert not is_number_like(text)


def test_long_cells_are_shown_short_and_on_one_line() -> None:
    assert show("x" * 100) == "'" + "x" * 29 + "…'"
    assert "\n" not in show("a\nb")
