"""Text tables: every dialect gives the numbers written in the file; what does not decide is refused with its line."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from bench_tables import FREQ_HZ, FREQ_UNITS, GAIN, RTOL, cells, file_of, table
from numpy.testing import assert_allclose

from fitamp.errors import SweepError, UsageError
from fitamp.importers import read_sweep
from fitamp.sweep import Sign, Sweep

HEADERS = {
    "re im": ["freq_hz", "Re(T)", "Im(T)"],
    "dB deg": ["Frequency (Hz)", "Gain (dB)", "Phase (deg)"],
    "linear deg": ["f / Hz", "|T| (V/V)", "arg(T) / °"],
    "dB rad": ["Freq[Hz]", "Magnitude dB", "phase [rad]"],
    "linear rad": ["freq_hz", "mag_lin", "angle_rad"],
    "complex j": ["freq_hz", "T"],
    "complex i": ["freq_hz", "loop gain"],
    "complex python": ["freq_hz", "T"],
    "complex pair": ["freq_hz", "T"],
}
LAYOUTS = {
    "comma": (",", "."),
    "comma, decimal comma in quotes": (",", ","),
    "semicolon": (";", "."),
    "semicolon, decimal comma": (";", ","),
    "tab": ("\t", "."),
    "tab, decimal comma": ("\t", ","),
    "spaces": ("   ", "."),
    "spaces, decimal comma": ("   ", ","),
}


def assert_same(sweep: Sweep, rtol: float = RTOL) -> None:
    assert_allclose(sweep.freq_hz, FREQ_HZ, rtol=rtol)
    assert np.max(np.abs(sweep.gain / GAIN - 1)) < rtol
    assert sweep.sign is Sign.AS_READ


def choices(sweep: Sweep) -> dict[str, str]:
    return {decision.topic: decision.choice for decision in sweep.decisions}


@pytest.mark.parametrize("layout", LAYOUTS)
@pytest.mark.parametrize("form", HEADERS)
def test_every_layout_and_form_gives_the_numbers_in_the_file(tmp_path: Path, layout: str, form: str) -> None:
    separator, decimal = LAYOUTS[layout]
    if form == "complex i" and not separator.strip():
        separator = "\t"  # 1.2 + 3.4i has spaces of its own
    rows = cells(form)
    if form == "complex pair" and decimal == ",":
        rows = [[f, pair.replace(",", ";")] for f, pair in rows]
        text = "\n".join(
            [separator.join(HEADERS[form])] + [separator.join(f'"{c.replace(".", ",")}"' for c in row) for row in rows]
        )
    else:
        text = table(HEADERS[form], rows, separator=separator, decimal=decimal)
    sweep = read_sweep(file_of(tmp_path, text))
    assert_same(sweep)
    assert choices(sweep)["decimal mark"] == ("comma" if decimal == "," else "point")
    assert sweep.origin.form == "csv"


@pytest.mark.parametrize("unit", FREQ_UNITS)
def test_frequency_units_are_turned_into_hertz(tmp_path: Path, unit: str) -> None:
    name = "omega" if unit == "rad/s" else "f"
    text = table([f"{name} ({unit})", "re", "im"], cells("re im", freq_unit=unit), separator=",")
    sweep = read_sweep(file_of(tmp_path, text))
    assert_same(sweep)
    assert choices(sweep)["frequency"].endswith(f"in {unit}")


@pytest.mark.parametrize("unit_row", ["Hz;dB;deg", "[Hz];[dB];[°]", "(Hz);dB;(degrees)"])
def test_units_may_stand_in_a_row_of_their_own(tmp_path: Path, unit_row: str) -> None:
    lines = table(["Frequency", "Gain", "Phase"], cells("dB deg"), separator=";").splitlines()
    sweep = read_sweep(file_of(tmp_path, "\n".join([lines[0], unit_row, *lines[1:]])))
    assert_same(sweep)
    assert choices(sweep)["units row"] == "line 2"


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize(
    ("codec", "mark", "name"),
    [
        ("utf-8", b"", "UTF-8"),
        ("utf-8", b"\xef\xbb\xbf", "UTF-8"),
        ("utf-16-le", b"\xff\xfe", "UTF-16 LE"),
        ("utf-16-be", b"\xfe\xff", "UTF-16 BE"),
        ("utf-16-le", b"", "UTF-16 LE"),
        ("latin-1", b"", "Latin-1"),
    ],
)
def test_encodings_and_line_ends(tmp_path: Path, codec: str, mark: bytes, name: str, end: str) -> None:
    text = table(["freq_hz", "mag_db", "Phase (°)"], cells("dB deg"), separator=",").replace("\n", end)
    sweep = read_sweep(file_of(tmp_path, mark + text.encode(codec)))
    assert_same(sweep)
    assert choices(sweep)["encoding"] == name


@pytest.mark.parametrize(
    "preamble",
    [
        "Instrument: xyz\nDate, 2026-01-05 10:00\nPoints, 25, 10\n\n",
        "# invented\n! drive 10 mV\n% level 0.1\n// file 3\n",
        "sep=,\n",
        '"Loop gain, bench 2","",""\n\n',
    ],
)
def test_preamble_and_comment_lines_are_passed_over(tmp_path: Path, preamble: str) -> None:
    sweep = read_sweep(file_of(tmp_path, preamble + table(HEADERS["re im"], cells("re im"), separator=",")))
    assert_same(sweep)


def test_comment_line_may_be_the_header_as_numpy_writes_it(tmp_path: Path) -> None:
    # numpy.savetxt with header= puts the names after "# ".
    path = tmp_path / "savetxt.txt"
    np.savetxt(path, np.column_stack([FREQ_HZ, GAIN.real, GAIN.imag]), header="freq_hz re im", encoding="utf-8")
    assert_same(read_sweep(path))


def test_comment_lines_among_the_rows_are_left_aside_and_counted(tmp_path: Path) -> None:
    lines = table(HEADERS["re im"], cells("re im"), separator=",").splitlines()
    sweep = read_sweep(file_of(tmp_path, "\n".join([*lines[:5], "# range switched", "", *lines[5:]])))
    assert_same(sweep)
    assert choices(sweep)["comments"] == "1 left aside"


def test_falling_order_is_reversed_with_a_decision(tmp_path: Path) -> None:
    sweep = read_sweep(file_of(tmp_path, table(HEADERS["re im"], cells("re im")[::-1], separator=",")))
    assert_same(sweep)
    assert choices(sweep)["order"] == "reversed"


def test_unicode_minus_is_read_as_minus_with_a_decision(tmp_path: Path) -> None:
    text = table(HEADERS["dB deg"], cells("dB deg"), separator=";").replace("-", "\N{MINUS SIGN}")
    sweep = read_sweep(file_of(tmp_path, text))
    assert_same(sweep)
    assert choices(sweep)["minus sign"] == "U+2212 read as minus"


def test_separator_at_the_end_of_every_row_makes_no_column(tmp_path: Path) -> None:
    text = table(HEADERS["re im"], cells("re im"), separator=",").replace("\n", ",\n")
    assert_same(read_sweep(file_of(tmp_path, text)))


def test_other_columns_are_left_aside(tmp_path: Path) -> None:
    rows = [[str(i), "2026-01-05 10:00", *row, "OK" if i % 2 else ""] for i, row in enumerate(cells("re im"))]
    sweep = read_sweep(file_of(tmp_path, table(["no", "time", *HEADERS["re im"], "state"], rows, separator=",")))
    assert_same(sweep)
    assert choices(sweep)["other columns"] == "1, 2, 6 left aside"


def test_point_at_zero_hertz_is_left_out_with_its_reason(tmp_path: Path) -> None:
    rows = [["0", "10000", "0"], *cells("re im")]
    sweep = read_sweep(file_of(tmp_path, table(HEADERS["re im"], rows, separator=",")))
    assert_same(sweep)
    (point,) = sweep.left_out
    assert (point.f_hz, point.gain) == (0.0, 10000)
    assert "logarithmic" in point.reason


def test_real_and_imaginary_are_used_where_magnitude_and_phase_agree(tmp_path: Path) -> None:
    rows = [a + [f"{float(x):.3f}" for x in b[1:]] for a, b in zip(cells("re im"), cells("dB deg"), strict=True)]
    header = [*HEADERS["re im"], "mag_db", "phase_deg"]
    sweep = read_sweep(file_of(tmp_path, table(header, rows, separator=",")))
    assert_same(sweep)
    assert choices(sweep)["magnitude and phase"] == "left aside"
    rows[3][3] = "0"
    with pytest.raises(SweepError, match=r"line 5: real and imaginary part do not agree with magnitude and phase"):
        read_sweep(file_of(tmp_path, table(header, rows, separator=",")))


def test_columns_option_decides_what_the_header_does_not(tmp_path: Path) -> None:
    path = file_of(tmp_path, table(["Frequency", "Gain", "Phase"], cells("dB rad", freq_unit="kHz"), separator=","))
    assert_same(read_sweep(path, columns="f=1:kHz mag='Gain':dB phase=Phase:rad"))
    bare = file_of(tmp_path, "\n".join(",".join(row) for row in cells("dB deg")))
    assert_same(read_sweep(bare, columns="f=1:Hz mag=2:dB phase=3:deg"))


def test_example_in_a_refusal_can_be_pasted_once_the_units_are_chosen(tmp_path: Path) -> None:
    path = file_of(tmp_path, table(["Frequency", "Gain of loop", "Phase"], cells("dB deg"), separator=","))
    with pytest.raises(
        SweepError, match="does not say whether the frequency is in Hz, kHz, MHz, GHz or rad/s"
    ) as caught:
        read_sweep(path)
    pasted = re.search(r'--columns "(.*)"', str(caught.value))
    assert pasted is not None
    with pytest.raises(
        UsageError, match="gives f the unit 'Hz-or-kHz-or-MHz-or-GHz-or-rad/s'; expected one of Hz, kHz"
    ):
        read_sweep(path, columns=pasted[1])
    chosen = re.sub("-or-[^ ]*", "", pasted[1])
    assert chosen == "f='Frequency':Hz mag='Gain of loop':dB phase='Phase':deg"
    assert_same(read_sweep(path, columns=chosen))


GOOD = "freq_hz,mag_db,phase_deg\n10,60,-1\n20,60,-2\n40,59,-4\n"
BROKEN = {
    "overload": (GOOD + "80,OVL,-3\n", "line 5, column 2 ('mag_db'): 'OVL' is not a number; measure"),
    "dashes": (GOOD + "80,---,-3\n", "line 5, column 2 ('mag_db'): '---' is not a number; measure"),
    "empty cell": (GOOD + "80,,-3\n", "line 5, column 2 ('mag_db'): the cell is empty; measure"),
    "nan": (GOOD + "80,1,nan\n", "line 5, column 3 ('phase_deg'): 'nan' is not a finite number; measure"),
    "inf": (GOOD + "80,-inf,1\n", "line 5, column 2 ('mag_db'): '-inf' is not a finite number; measure"),
    "prefix": (GOOD + "80,1k,1\n", "line 5, column 2 ('mag_db'): '1k' has a prefix or unit; write the plain number"),
    "unit": (GOOD + "80,50 Hz,1\n", "line 5, column 2 ('mag_db'): '50 Hz' has a prefix or unit; write"),
    "milli or mega": (GOOD + "80m,50,1\n", "line 5, column 1 ('freq_hz'): '80m' is millihertz as it stands, where"),
    "letter as mark": (GOOD + "3M3,50,1\n", "line 5, column 1 ('freq_hz'): '3M3' has a letter in place of the decimal"),
    "prefix twice": (
        GOOD.replace("freq_hz", "f (kHz)") + "1M,50,1\n",
        "line 5, column 1 ('f (kHz)'): '1M' has a prefix, and the column is in kHz already; write the plain number",
    ),
    "mega in simulators": (
        "freq_hz,re,im\n10,1,1\n20,1M,1\n",
        "line 3, column 2 ('re'): '1M' may be mega, or milli as circuit simulators write it; write the plain number",
    ),
    "instrument's NaN": (
        "freq_hz,re,im\n10,1,1\n20,9.91E+37,1\n",
        "line 3, column 2 ('re'): '9.91E+37' is what instruments send for no reading; measure the point again",
    ),
    "Fortran exponent": (GOOD + "1D3,50,1\n", "line 5, column 1 ('freq_hz'): '1D3' has a Fortran exponent; write it"),
    "overflow": (GOOD + "1e400,50,1\n", "line 5, column 1 ('freq_hz'): '1e400' is too large"),
    "underflow": (GOOD + "1e-400,50,1\n", "line 5, column 1 ('freq_hz'): '1e-400' is too small"),
    "fault in the first row": (GOOD.replace("10,60,-1", "10,OVL,OVL"), "line 2, column 2 ('mag_db'): 'OVL' is not"),
    "short first row": (GOOD.replace("10,60,-1", "10,60"), "line 2: a row of numbers apart from the 3 columns below"),
    "short row": (GOOD + "80,1\n", "line 5: 2 cells where other rows have 3 (separator: comma); complete the row"),
    "long row": (GOOD + "80,1,2,3\n", "line 5: 4 cells where other rows have 3 (separator: comma)"),
    "last line": (GOOD + "stop\n", "line 5: 'stop' stands among the rows of numbers; remove the line, and keep one"),
    "second table": (
        GOOD + GOOD,
        "line 6: a second header among the rows; the file holds 2 sweeps, from lines 2, 6: choose one",
    ),
    "wider table": (GOOD + "f,re,im,n\n1,2,3,4\n", "line 5: 'f,re,im,n' stands among the rows of numbers; remove the"),
    "words": (GOOD + "a,b,c\n", "line 5, column 1 ('freq_hz'): 'a' is not a number; measure the point again"),
    "open quote": (GOOD + '80,"50,-3\n', "line 5: a quote is not closed on this line; close it"),
    "open quote above": (GOOD.replace("10,60", '10,"60'), "line 2: a quote is not closed on this line; close it"),
    "repeated frequency": (GOOD + "40,58,-5\n", "line 5: frequency 40 Hz is there already on line 4; keep one"),
    "no order": (GOOD + "30,58,-5\n80,50,-6\n", "line 5: frequency must rise or fall throughout, but 30 Hz stands"),
    "negative frequency": (GOOD + "-80,58,-5\n", "line 5: frequency -80 Hz is negative; remove the row"),
    "thousands, crooked": (
        "freq_hz;re;im\n1,00,000;1;2\n2,00,000;1;2\n",
        "line 2: '1,00,000' has thousands separators; export the numbers without them",
    ),
    "thousands or decimals": (
        "freq_hz;re;im\n1,000;10;2\n2,000;10;2\n",
        "line 2: '1,000' may have a decimal comma or a thousands separator; export with a decimal point",
    ),
    "two decimal marks": (
        "freq_hz;re;im\n1.5;2,5;2\n2.5;2,5;2\n",
        "line 2: '2,5' has a comma where other cells have a",
    ),
    "decimal comma as separator": (
        "freq_hz,mag_db,phase_deg\n10,5,60,1,-1,5\n20,5,60,2,-2,5\n",
        "line 1: 3 names for the 6 columns below; the comma seems to be decimal mark as well as separator",
    ),
    "linear below zero": (
        "freq_hz,mag_lin,phase_deg\n10,9,-1\n20,-8,-2\n",
        "line 3, column 2 ('mag_lin'): '-8' is a linear magnitude below 0; check the unit of the column",
    ),
    "level beyond reason": (
        "freq_hz,mag_db,phase_deg\n10,9,-1\n20,9999,-2\n",
        "line 3, column 2 ('mag_db'): '9999' is a level far beyond any loop gain; check the unit",
    ),
    "no header": (
        GOOD.split("\n", 1)[1],
        'no header names the 3 columns; say which columns to use, as in --columns "f=1:Hz',
    ),
    "units contradict": (
        "freq_hz,re,im\nkHz,,\n10,1,1\n20,1,1\n",
        "line 2, column 1: unit 'kHz' contradicts Hz in the header 'freq_hz'; correct one of them",
    ),
    "no numbers": ("some text\nand more\n", "no row with two or more numbers found; expected columns of numbers"),
    "not complex": (
        "freq_hz,T\n10,1-1j\n20,1-2j\n40,OVL\n",
        "line 4, column 2 ('T'): 'OVL' is not a complex number such as 1.2+3.4j; measure",
    ),
}


@pytest.mark.parametrize("case", BROKEN)
def test_broken_table_is_refused_in_one_line_that_says_where(tmp_path: Path, case: str) -> None:
    content, message = BROKEN[case]
    path = file_of(tmp_path, content)
    with pytest.raises(SweepError, match=f"^{re.escape(str(path))}(, |: ){re.escape(message)}") as caught:
        read_sweep(path)
    assert "\n" not in str(caught.value)


UNDECIDED = {
    "freq,mag_db,phase_deg": "column 1: 'freq' does not say whether the frequency is in Hz, kHz, MHz, GHz or rad/s",
    "f (mHz),mag_db,phase_deg": "column 1: 'f (mHz)' does not say whether the frequency is in Hz, kHz",
    "freq_hz,mag,phase_deg": "column 2: 'mag' does not say whether the magnitude is in dB or linear",
    "freq_hz,|T|,phase_deg": "column 2: '|T|' does not say whether the magnitude is in dB or linear",
    "freq_hz,mag_db,phase": "column 3: 'phase' does not say whether the phase is in deg or rad",
    "freq_hz,mag_db,gain_db": "the header names a magnitude but no phase",
    "freq_hz,re,phase_deg": "the header names a phase but no magnitude",
    "freq_hz,re,x": "the header names a real part but no imaginary part",
    "x,mag_db,phase_deg": "no column is named as frequency",
    "freq_hz,Re(Z) (Ω),Im(Z) (Ω)": "the header names no loop gain",
    "freq_hz,Re (mV),Im (mV)": "the header names no loop gain",
}


@pytest.mark.parametrize("header", UNDECIDED)
def test_header_that_does_not_decide_is_refused_naming_the_option(tmp_path: Path, header: str) -> None:
    path = file_of(tmp_path, f"{header}\n10,60,1\n20,60,2\n")
    with pytest.raises(SweepError, match=f"line 1(, |: ){re.escape(UNDECIDED[header])}"):
        read_sweep(path)


@pytest.mark.parametrize(
    ("header", "names"),
    [
        ("freq_hz,mag_db,gain_db,phase_deg", "'mag_db', 'gain_db' may each be the magnitude"),
        ("freq_hz,mag_db,mag_lin,phase_deg", "'mag_db', 'mag_lin' may each be the magnitude"),
        ("freq_hz,mag_db,phase_deg,phase_rad", "'phase_deg', 'phase_rad' may each be the phase"),
        ("freq_hz,freq_mhz,mag_db,phase_deg", "'freq_hz', 'freq_mhz' may each be the frequency"),
        ("freq_hz,Re(S11),Re(S21),Im(S21)", "'Re(S11)', 'Re(S21)' may each be the real part"),
    ],
)
def test_two_columns_for_one_quantity_are_refused(tmp_path: Path, header: str, names: str) -> None:
    path = file_of(tmp_path, f"{header}\n10,60,1,1\n20,60,2,2\n")
    with pytest.raises(SweepError, match=f"line 1: {re.escape(names)}.*--columns"):
        read_sweep(path)


def test_the_one_column_with_a_unit_is_taken_before_one_without(tmp_path: Path) -> None:
    rows = [[row[0], "7", *row[1:]] for row in cells("dB deg")]
    path = file_of(tmp_path, table(["freq_hz", "level", "mag_db", "phase_deg"], rows, separator=","))
    assert_same(read_sweep(path))
