"""What the command line asks in text."""

from __future__ import annotations

import pytest

from fitamp.errors import UsageError
from fitamp.planning import Wanted
from fitamp.planning.asked import parse_band, parse_list, parse_wanted


@pytest.mark.parametrize(
    ("text", "unit", "values"),
    [
        ("0 pF, 5 pF, 10 pF", "F", (0.0, 5e-12, 10e-12)),
        ("0, 5pF,1e-11 F", "F", (0.0, 5e-12, 1e-11)),
        ("0, 500 Ohm, -400 Ohm", "Ω", (0.0, 500.0, -400.0)),
        ("−1.2 kΩ", "Ω", (-1200.0,)),
        ("0.0", "Ω", (0.0,)),
    ],
)
def test_lists_are_quantities_with_commas_between(text: str, unit: str, values: tuple[float, ...]) -> None:
    assert parse_list(text, unit, option="--loads") == pytest.approx(values)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("0,5 pF", "--loads: in '0,5 pF' a comma stands between digits; write a decimal mark as a point"),
        ("5 pF,, 10 pF", "--loads: there is nothing between two commas in '5 pF,, 10 pF'"),
        ("", "--loads: there is nothing between two commas"),
        ("5", "--loads: '5' has no unit; expected F"),
        ("5 kOhm", "--loads: '5 kOhm' has unit .*; expected F"),
        ("none", "--loads: 'none' is not a number with unit"),
        ("nan F", "--loads: 'nan F'"),
    ],
)
def test_lists_that_cannot_be_read_are_refused(text: str, message: str) -> None:
    with pytest.raises(UsageError, match=message):
        parse_list(text, "F", option="--loads")


def test_a_band_has_two_rising_ends() -> None:
    assert parse_band(["1 kHz", "200 MHz"]) == (1e3, 200e6)
    with pytest.raises(UsageError, match="--band: 200 MHz to 1 kHz does not rise"):
        parse_band(["200 MHz", "1 kHz"])
    with pytest.raises(UsageError, match="--band: 0 Hz to 1 kHz does not rise from above 0 Hz"):
        parse_band(["0 Hz", "1 kHz"])
    with pytest.raises(UsageError, match="--band: '1000' has no unit; expected Hz"):
        parse_band(["1000", "1 MHz"])


def test_wishes_are_relative_or_in_the_unit() -> None:
    assert parse_wanted("gm2 1 %, phase_margin_deg 0.5 deg,gm2_rz 0.01, bench_delay_s 2 s") == (
        Wanted(name="gm2", relative=0.01),
        Wanted(name="phase_margin_deg", absolute=0.5),
        Wanted(name="gm2_rz", absolute=0.01),
        Wanted(name="bench_delay_s", absolute=2.0),
    )


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("gm2", "--want: 'gm2' is not a name with a standard deviation"),
        ("", "--want: '' is not a name"),
        ("gm3 1 %", "--want: gm3 is not among what a plan knows: gm1, R1"),
        ("gm2 much", r"--want: gm2 much has no standard deviation that can be read; expected 1 % or 1\.6 mS"),
        ("gm2 1 pF", "--want: gm2 1 pF has no standard deviation"),
        ("gm2_rz 1 mS", r"expected 1 % or 0\.01"),
        ("gm2 0 %", "--want: gm2 0 %; a standard deviation is above 0"),
        ("gm2 -1 mS", "a standard deviation is above 0"),
    ],
)
def test_wishes_that_cannot_be_read_are_refused(text: str, message: str) -> None:
    with pytest.raises(UsageError, match=message):
        parse_wanted(text)
