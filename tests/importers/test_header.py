"""The line that names the columns, wherever it stands above the numbers."""

from __future__ import annotations

import pytest

from fitamp.errors import SweepError
from fitamp.importers.dialect import find_block
from fitamp.importers.header import Header, find_header
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.text import Line

ROWS = "10,60,-1\n20,60,-2\n"
NAMED = [(Quantity.FREQUENCY, Unit.KHZ), (Quantity.MAGNITUDE, Unit.DB), (Quantity.PHASE, Unit.DEGREE)]


def header_of(text: str) -> Header:
    lines = [Line(number=number, text=line) for number, line in enumerate(text.split("\n"), start=1)]
    return find_header("a.csv", find_block("a.csv", lines))


@pytest.mark.parametrize(
    ("above", "line"),
    [
        ("f (kHz),mag_db,phase_deg\n", 1),
        ("\n\nf (kHz),mag_db,phase_deg\n\n", 3),
        ("f,Gain,Phase\nkHz,dB,deg\n", 1),
        ("f,Gain,Phase\n[kHz],(dB),°\n", 1),
        ("f (kHz),Gain (dB),Phase\n,,deg\n", 1),
        ("f,Gain,Phase\n# kHz, dB, deg\n", 1),
        ("kHz,dB,deg\n", 1),
        ("# kHz, dB, deg\n", 1),
        ("# f/kHz, |T| dB, arg/deg\n", 1),
        ("# f/kHz;|T| dB;arg/deg\n# drive 10 mV\n", 1),
        ("Instrument, xyz, 3\n# f/kHz  |T| dB  arg/deg\n", 2),
        ("f (kHz)\tmag_db\tphase_deg\n", 1),
        ("f (kHz);mag_db;phase_deg\n", 1),
        ("f (kHz) Gain (dB) Phase (deg)\n", 1),
        ("f_khz,mag_db,phase_deg\n----------------------\n", 1),
    ],
)
def test_header_is_found(above: str, line: int) -> None:
    header = header_of(above + ROWS)
    assert header.line == line
    assert [(meaning.quantity, meaning.unit) for meaning in header.meanings] == NAMED
    assert ("header", f"line {line}") in [(d.topic, d.choice) for d in header.decisions]


TITLES = "f,Gain,Phase\nkHz,dB,deg\n"


@pytest.mark.parametrize(
    ("above", "line"),
    [
        (TITLES + "one,two,three\n", 1),
        ("f (kHz),mag_db,phase_deg\none,two,three\n", 1),
        ("Lab,x,y\n\n" + TITLES + "one,two,three\n", 3),
    ],
)
def test_header_with_units_is_taken_over_a_line_that_names_nothing(above: str, line: int) -> None:
    header = header_of(above + ROWS)
    assert header.line == line
    assert [(meaning.quantity, meaning.unit) for meaning in header.meanings] == NAMED
    assert header.decisions[0].reason.startswith("the one line that names the columns; line ")


@pytest.mark.parametrize(
    ("above", "line", "others"),
    [
        ("f,Gain,Phase\none,two,three\n", 2, (1,)),  # no units: it may be a preamble
        (TITLES + "f_hz,mag_db,phase_deg\none,two,three\n", 4, (1, 2, 3)),  # two that contradict each other
        (TITLES + "f (kHz),x,y\n", 3, ()),  # the last line names something
    ],
)
def test_header_in_doubt_stays_the_last_line_and_the_others_are_kept(
    above: str, line: int, others: tuple[int, ...]
) -> None:
    header = header_of(above + ROWS)
    assert (header.line, header.others) == (line, others)


def test_unit_of_two_meanings_in_a_units_row_leaves_a_doubt() -> None:
    header = header_of("Frequency;Gain;Phase\nkHz;dB;Grad\n" + ROWS.replace(",", ";"))
    assert header.line == 1
    assert [meaning.unit for meaning in header.meanings] == [Unit.KHZ, Unit.DB, None]
    assert header.meanings[2].doubt == "Grad may be degrees or gradians, 400 to the turn"


def test_table_without_header_has_none() -> None:
    for text in (ROWS, "some title\n" + ROWS, "# just a remark\n" + ROWS):
        header = header_of(text)
        assert header.line is None
        assert len(header.meanings) == 3


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "f_hz,Gain,Phase\nkHz,dB,deg\n" + ROWS,
            "a.csv, line 2, column 1: unit 'kHz' contradicts Hz in the header 'f_hz'",
        ),
        ("f_hz,mag_db,phase_deg\n5,60\n" + ROWS, "a.csv, line 2: a row of numbers apart from the 3 columns below it"),
        ("5\n" + ROWS, "a.csv, line 1: a row of numbers apart from the 3 columns below it"),
        ("f_hz,mag_db\n" + ROWS, "a.csv, line 1: 2 names for the 3 columns below; give each column one name"),
        ('f_hz,"mag_db,phase_deg\n' + ROWS, "a.csv, line 1: a quote is not closed on this line"),
    ],
)
def test_header_that_does_not_fit_is_refused(text: str, message: str) -> None:
    with pytest.raises(SweepError, match=message):
        header_of(text)
