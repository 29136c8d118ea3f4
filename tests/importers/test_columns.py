"""From header meanings to the columns in use."""

from __future__ import annotations

from dataclasses import replace

import pytest

from fitamp.errors import SweepError
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.columns import chosen_columns, told_columns
from fitamp.importers.header import Header
from fitamp.importers.quantity import Quantity, Unit, meaning_of


def header(text: str, line: int | None = 3) -> Header:
    return Header(line=line, meanings=tuple(map(meaning_of, text.split(","))), decisions=())


@pytest.mark.parametrize(
    ("text", "frequency", "gain"),
    [
        ("freq_hz,mag_db,phase_deg", 0, [1, 2]),
        ("phase_deg,mag_db,freq_hz", 2, [1, 0]),
        ("RBW (Hz),Frequency (Hz),re,im", 1, [2, 3]),
        ("freq_hz,mag,mag_db,phase_deg", 0, [2, 3]),
        ("freq_hz,re,im,mag,phase", 0, [1, 2]),
        ("freq_hz,gain error (dB),mag_db,phase margin (deg),phase_deg", 0, [2, 4]),
        ("Marker (Hz),re,im", 0, [1, 2]),
    ],
)
def test_columns_without_doubt_are_taken(text: str, frequency: int, gain: list[int]) -> None:
    columns = told_columns("a.csv", header(text), [])
    assert columns.frequency.index == frequency
    assert [column.index for column in columns.gain] == gain
    assert all("named by the header on line 3" in decision.reason for decision in columns.decisions)


def test_magnitude_and_phase_beside_real_and_imaginary_are_for_checking() -> None:
    columns = told_columns("a.csv", header("freq_hz,mag_db,phase_deg,re,im"), [])
    assert [column.quantity for column in columns.gain] == [Quantity.REAL, Quantity.IMAGINARY]
    assert [column.index for column in columns.check] == [1, 2]


def test_complex_column_is_told_by_its_cells() -> None:
    columns = told_columns("a.csv", header("freq_hz,T"), [1])
    assert [(column.index, column.quantity, column.unit) for column in columns.gain] == [(1, Quantity.COMPLEX, None)]
    with pytest.raises(SweepError, match="line 3: the header names no loop gain"):
        told_columns("a.csv", header("freq_hz,complex gain"), [])
    with pytest.raises(SweepError, match="names a complex column and parts of a gain as well; say which"):
        told_columns("a.csv", header("freq_hz,T,re,im"), [1])


def test_refusal_names_the_other_lines_that_may_be_headers() -> None:
    words = Header(line=3, meanings=tuple(map(meaning_of, ["one", "two"])), decisions=(), others=(1, 2))
    with pytest.raises(
        SweepError, match=r"line 3: .*; lines 1 and 2 may be headers as well: keep one header, or say w"
    ):
        told_columns("a.csv", words, [])
    with pytest.raises(SweepError, match="; line 1 may be a header as well: keep one header, or say which columns"):
        told_columns("a.csv", replace(words, others=(1,)), [])


def test_unit_that_is_in_doubt_is_refused_with_the_reason() -> None:
    whole = (
        r"'Phase \(Grad\)' does not say whether the phase is in deg or rad \(Grad may be degrees or gradians, 400 to"
    )
    with pytest.raises(SweepError, match=whole):
        told_columns("a.csv", header("freq_hz,mag_db,Phase (Grad)"), [])


def test_choice_is_looked_up_by_number_and_name() -> None:
    choice = ColumnChoice.parse("f='x':kHz mag=3 phase='phase':rad")
    columns = chosen_columns("a.csv", choice, header("x,phase,mag_db"))
    assert (columns.frequency.index, columns.frequency.unit) == (0, Unit.KHZ)
    assert [(column.index, column.unit) for column in columns.gain] == [(2, Unit.DB), (1, Unit.RADIAN)]


@pytest.mark.parametrize(
    ("choice", "text", "message"),
    [
        ("f=1:Hz complex=4", "a,b,c", "gives complex column 4, but the file has 3 columns"),
        ("f=1:Hz complex='d'", "a,b,c", r"asks for 'd', which is there not at all \(the file has 'a', 'b', 'c'\)"),
        ("f=1:Hz complex='b'", "a,b,b", "asks for 'b', which is there more than once"),
        ("f=1 complex=2", "a,b", "neither --columns nor the header says whether f is in Hz or kHz or MHz"),
        ("f=1 complex=2", "mag_db,b", "neither --columns nor the header says whether f is in"),
    ],
)
def test_choice_that_does_not_fit_the_file_is_refused(choice: str, text: str, message: str) -> None:
    with pytest.raises(SweepError, match=message):
        chosen_columns("a.csv", ColumnChoice.parse(choice), header(text))


def test_name_in_a_file_without_header_is_refused() -> None:
    with pytest.raises(SweepError, match=r"asks for 'b', which is there not at all \(the file has no header\)"):
        chosen_columns("a.csv", ColumnChoice.parse("f=1:Hz complex='b'"), header(",", line=None))
