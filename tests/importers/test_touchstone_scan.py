"""Broken Touchstone files: each is refused in one line with the number of the line at fault."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from bench_tables import file_of

from fitamp.errors import SweepError
from fitamp.importers import read_sweep

OPTION = "# Hz S RI R 50\n"
FULL_ROW = "{} 1 0 2 0 3 0 4 0\n"
VERSION_2 = """[Version] 2.0
# Hz S RI R 50
[Number of Ports] 2
[Two-Port Data Order] 12_21
[Number of Frequencies] 2
[Network Data]
1 11 0 12 0 21 0 22 0
2 11 0 12 0 21 0 22 0
[End]
"""
ONE_PORT: dict[str, tuple[str | bytes, str]] = {
    "no option line": ("1 2 3\n", "line 1: no option line before the data; a Touchstone file needs one, such as # Hz"),
    "no option line at all": ("! nothing\n", "no option line; a Touchstone file needs one"),
    "option line after data": ("1 2 3\n" + OPTION, "line 1: no option line before the data"),
    "second option line": (OPTION + "1 2 3\n" + OPTION, "line 3: a second option line, after the one on line 1"),
    "no data": (OPTION + "! end\n", "no data; export the sweep again"),
    "unknown option": ("# Hz S RI Q 50\n1 2 3\n", "line 1: option 'Q' is not known; expected a line such as"),
    "option twice": ("# Hz kHz S RI R 50\n1 2 3\n", "line 1: the option line names the frequency unit twice; keep one"),
    "impedances": ("# Hz Z RI R 50\n1 2 3\n", "line 1: Z-parameters are no loop gain; export the trace as S-param"),
    "reference zero": ("# Hz S RI R 0\n1 2 3\n", "line 1: reference resistance 0 must be above 0 ohm; correct it"),
    "reference missing": ("# Hz S RI R\n1 2 3\n", "line 1: R has no value; write the reference resistance in ohms"),
    "reference no number": ("# Hz S RI R x\n1 2 3\n", "line 1: reference resistance: 'x' is not a number"),
    "short row": (OPTION + "1 2 3\n2 3\n", "line 3: 2 numbers; a row has a frequency and pairs, 3 numbers for 1 port"),
    "short last row": (OPTION + "1 2 3\n2\n", "line 3: 1 number for this frequency, expected 3 for 1 port"),
    "long row": (
        OPTION + "1 2 3 4 5\n",
        "line 2: 5 numbers for one frequency, expected 3 for 1 port; check the number",
    ),
    "word": (OPTION + "1 2 OVL\n", "line 2: number 3: 'OVL' is not a number; measure the point again"),
    "nan": (OPTION + "1 nan 3\n", "line 2: number 2: 'nan' is not a finite number"),
    "overflow": (OPTION + "1 1e400 3\n", "line 2: number 2: '1e400' is too large"),
    "decimal comma": (OPTION + "1,5 2,5 3\n", "line 2: number 1: '1,5' has a comma where the decimal mark is a point"),
    "Fortran exponent": (OPTION + "1D3 2 3\n", "line 2: number 1: '1D3' has a Fortran exponent; write it with E"),
    "falling": (OPTION + "2 2 3\n1 2 3\n", "line 3: frequency must rise, but 1 Hz follows 2 Hz; sort the rows"),
    "repeated": (OPTION + "2 2 3\n! again\n2 2 3\n", "line 4: frequency must rise, but 2 Hz follows 2 Hz"),
    "negative": (OPTION + "-1 2 3\n", "line 2: frequency -1 Hz is negative; correct the row"),
    "only DC": (OPTION + "0 2 3\n", "no point above 0 Hz; a sweep needs at least one"),
    "level": ("# Hz S DB R 50\n1 99999 3\n", "line 2: a level far beyond any loop gain; check the format"),
    "UTF-16": (
        (OPTION + "1 2 3\n").encode("utf-16"),
        "the file is UTF-16 LE; Touchstone is plain text, save it as UTF-8",
    ),
    "text table": ("freq_hz,re,im\n1,2,3\n", "line 1: no option line before the data"),
    "two ports inside": (VERSION_2, "line 3: [Number of Ports] 2 does not fit a file name for 1; correct either"),
}
TWO_PORT: dict[str, tuple[str, str]] = {
    "one-port rows": (OPTION + "1 2 3\n2 2 3\n", "line 2: 3 numbers for this frequency, expected 9 for 2 ports"),
    "truncated row": (
        OPTION + FULL_ROW.format(1) + "2 1 0 2 0 3 0\n" + FULL_ROW.format(3),
        "line 3: 7 numbers for this frequency, expected 9 for 2 ports; complete the row",
    ),
    "falling": (OPTION + FULL_ROW.format(2) + FULL_ROW.format(1), "line 3: frequency must rise, but 1 Hz follows 2 Hz"),
    "keyword without version": (
        OPTION + "[Network Data]\n",
        "line 2: keyword [Network Data] needs [Version] 2.0 as the",
    ),
    "version": (VERSION_2.replace("2.0", "3.0"), "line 1: version '3.0' is not known; expected 2.0 or 2.1"),
    "version too late": (OPTION + VERSION_2, "line 2: [Version] must stand once, before the option line"),
    "frequency count": (
        VERSION_2.replace("Frequencies] 2", "Frequencies] 3"),
        "line 5: [Number of Frequencies] 3, but there are 2; export the file again",
    ),
    "frequency count missing": (
        VERSION_2.replace("[Number of Frequencies] 2\n", ""),
        "line 5: [Number of Frequencies] is missing before [Network Data]",
    ),
    "frequency count no number": (
        VERSION_2.replace("Frequencies] 2", "Frequencies] two"),
        "line 5: [Number of Frequencies] 'two' is not a whole number above 0",
    ),
    "order missing": (
        VERSION_2.replace("[Two-Port Data Order] 12_21\n", ""),
        "line 5: [Two-Port Data Order] is missing before [Network Data]; complete the file",
    ),
    "order": (VERSION_2.replace("12_21", "11_22"), "line 4: [Two-Port Data Order] '11_22'; expected 12_21 or 21_12"),
    "matrix": (
        VERSION_2.replace("[Network", "[Matrix Format] Half\n[Network"),
        "line 6: [Matrix Format] 'Half'; expected",
    ),
    "mixed mode": (
        VERSION_2.replace("[Network", "[Mixed-Mode Order] D1,2 C1,2\n[Network"),
        "line 6: keyword [Mixed-Mode Order] cannot be used here; export plain S-parameters",
    ),
    "reference incomplete": (
        VERSION_2.replace("[Network", "[Reference] 50\n[Network"),
        "line 7: [Reference] lacks 1 value; complete it",
    ),
    "reference negative": (
        VERSION_2.replace("[Network", "[Reference] 50 -5\n[Network"),
        "line 6: reference resistance -5",
    ),
    "reference too long": (
        VERSION_2.replace("[Network", "[Reference] 1 2 3\n[Network"),
        "line 6: [Reference] has more",
    ),
    "data too early": (
        VERSION_2.replace("[Network Data]\n", ""),
        "line 6: data before [Network Data]; complete the file",
    ),
    "second data": (VERSION_2.replace("[End]", "[Network Data]\n[End]"), "line 9: a second [Network Data]; keep one"),
    "no end": (VERSION_2.replace("[End]\n", ""), "the file stops before [End]; export it again"),
    "data after end": (VERSION_2 + FULL_ROW.format(3), "line 10: data after [End]; keep one sweep per file"),
    "open information": (VERSION_2.replace("[Network", "[Begin Information]\n[Network"), "[Begin Information] without"),
    "bracket": (
        VERSION_2.replace("[Network Data]", "[Network Data"),
        "line 6: '[Network Data' is not a keyword in brackets",
    ),
}


@pytest.mark.parametrize("case", ONE_PORT)
def test_broken_one_port_file(tmp_path: Path, case: str) -> None:
    refused(file_of(tmp_path, ONE_PORT[case][0], "a.s1p"), ONE_PORT[case][1])


@pytest.mark.parametrize("case", TWO_PORT)
def test_broken_two_port_file(tmp_path: Path, case: str) -> None:
    refused(file_of(tmp_path, TWO_PORT[case][0], "a.s2p"), TWO_PORT[case][1])


def test_number_of_ports_has_to_be_known(tmp_path: Path) -> None:
    refused(file_of(tmp_path, OPTION + "1 2 3\n", "a.ts"), "the number of ports is not known; name the file .s1p")
    missing = VERSION_2.replace("[Number of Ports] 2\n", "")
    refused(file_of(tmp_path, missing, "b.ts"), "line 5: [Number of Ports] is missing before [Network Data]")
    early = VERSION_2.replace("[Number of Ports] 2\n", "[Reference] 50 50\n")
    refused(file_of(tmp_path, early, "c.ts"), "line 3: [Reference] before [Number of Ports]; correct the order")
    refused(file_of(tmp_path, OPTION + "1 2 3\n", "d.s0p"), "the file name says 0 ports; name it .s1p or .s2p")


def refused(path: Path, message: str) -> None:
    with pytest.raises(SweepError, match=f"^{re.escape(str(path))}(, |: ){re.escape(message)}") as caught:
        read_sweep(path)
    assert "\n" not in str(caught.value)
