"""Reading quantities strictly, and writing them rounded as they are known."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.units import from_db, parse_gain, parse_quantity, parse_ratio, si, si_exact, si_with_error, to_db


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("1.8 pF", "F", 1.8e-12),
        ("1.8pF", "F", 1.8e-12),
        ("1800 fF", "F", 1.8e-12),
        ("1.3 kOhm", "Ω", 1300.0),
        ("900 kΩ", "Ω", 900e3),
        ("900 k\N{OHM SIGN}", "Ω", 900e3),
        ("0 Ohm", "Ω", 0.0),
        ("1.6 mS", "S", 1.6e-3),
        ("1.6 mA/V", "S", 1.6e-3),
        ("150 uS", "S", 150e-6),
        ("150 \N{MICRO SIGN}S", "S", 150e-6),
        ("150 \N{GREEK SMALL LETTER MU}S", "S", 150e-6),
        ("1.2e3 Hz", "Hz", 1200.0),
        ("58 MHz", "Hz", 58e6),
        ("58 mhz", "Hz", 0.058),
        ("\N{MINUS SIGN}0.5 ns", "s", -0.5e-9),
        ("-0.5 ns", "s", -0.5e-9),
        ("60°", "deg", 60.0),
        ("82 dB", "dB", 82.0),
    ],
)
def test_quantity_is_read_in_its_spellings(text: str, unit: str, value: float) -> None:
    assert parse_quantity(text, unit) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "unit", "complaint"),
    [
        ("1,8 pF", "F", "'1,8 pF' has a comma; write the decimal mark as a point"),
        ("1,000 Hz", "Hz", "has a comma"),
        ("1.8 pF", "Ω", "unit 'F'; expected Ω, as in '1.3 kOhm'"),
        ("1.3k", "Ω", "no unit; expected Ω"),
        ("0.6 megohm", "Ω", "'0.6 megohm' has unit 'megohm'; expected Ω, as in '0.6 MOhm'"),
        ("1.5 Kilohm", "Ω", "has unit 'Kilohm'; expected Ω, as in '1.5 kOhm'"),
        ("2 picofarads", "F", "has unit 'picofarads'; expected F, as in '2 pF'"),
        ("5 microns", "S", "has unit 'microns'; expected S, as in '1.6 mS'"),
        ("10 xF", "F", "has unit 'xF'; expected F, as in '1.8 pF'"),
        ("80 mV", "Hz", "has unit 'mV'; expected Hz, as in '1.2 kHz'"),
        ("1.3 kF", "Ω", "has unit 'F'; expected Ω"),
        ("1.6 ms", "S", "unit 's'; expected S"),  # milliseconds are no conductance
        ("0.5 nS", "s", "unit 'S'; expected s"),
        ("1.3 k Ohm", "Ω", "not a number with unit; expected something like '1.3 kOhm'"),
        ("gm2 = 1.6 mS", "S", "not a number with unit"),
        ("1.6 mS -- simulated", "S", "not a number with unit"),
        ("1_000 Hz", "Hz", "not a number with unit"),
        ("about 3 Hz", "Hz", "not a number with unit"),
        ("", "Hz", "not a number with unit"),
        ("inf Hz", "Hz", "not a number with unit"),
        ("1e400 Hz", "Hz", "'1e400 Hz' is not finite"),
    ],
)
def test_doubtful_quantity_is_refused(text: str, unit: str, complaint: str) -> None:
    with pytest.raises(ValueError, match=complaint):
        parse_quantity(text, unit)


@pytest.mark.parametrize(("text", "value"), [("10 %", 0.1), ("10%", 0.1), (0.1, 0.1), ("0.1", 0.1), (0, 0.0)])
def test_ratio_is_read(text: str | float, value: float) -> None:
    assert parse_ratio(text) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize("text", ["0,1", "ten", "", "10 %%", "10 dB", "1e400", "1.2.3", True])
def test_text_that_is_no_ratio_is_refused(text: str) -> None:
    with pytest.raises(ValueError, match=r"is not a ratio; expected something like '10 %' or 0\.1"):
        parse_ratio(text)


@pytest.mark.parametrize("read", [parse_ratio, parse_gain])
def test_number_that_is_not_finite_is_refused(read: object) -> None:
    assert callable(read)
    with pytest.raises(ValueError, match="nan is not finite"):
        read(math.nan)


@pytest.mark.parametrize(("text", "gain"), [("80 dB", 1e4), ("-20 dB", 0.1), ("126", 126), (126, 126)])
def test_gain_is_read_in_decibels_or_plainly(text: str | float, gain: float) -> None:
    assert parse_gain(text) == pytest.approx(gain, rel=1e-12)


def test_gain_beyond_the_number_range_is_refused() -> None:
    with pytest.raises(ValueError, match="'1e5 dB' is beyond any gain"):
        parse_gain("1e5 dB")
    with pytest.raises(ValueError, match="unit 'Hz'; expected V/V"):
        parse_gain("5 Hz")


def test_factor_of_two_is_six_decibels() -> None:
    assert to_db(2.0) == pytest.approx(6.0206, abs=5e-5)  # 20 log10 2, from a table of logarithms
    assert from_db(6.0206) == pytest.approx(2.0, rel=1e-5)


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        # Review of Particle Physics, Introduction, sec. 5.3 (from memory): its two examples,
        (0.827, 0.119, "0.83 ± 0.12"),
        (0.827, 0.367, "0.8 ± 0.4"),
        # and its rule at the borders: two digits to 354, one from 355 to 949, 950 to 999 as 1000 with two.
        (8.27, 0.354, "8.27 ± 0.35"),
        (8.27, 0.355, "8.3 ± 0.4"),
        (8.27, 0.949, "8.3 ± 0.9"),
        (8.27, 0.950, "8.3 ± 1.0"),
        (8.27, 0.999, "8.3 ± 1.0"),
        (0.827, 0.0967, "0.83 ± 0.10"),
        (827.0, 119.0, "830 ± 120"),
    ],
)
def test_value_and_error_are_rounded_together(value: float, error: float, text: str) -> None:
    assert si_with_error(value, error, "") == text


@pytest.mark.parametrize(
    ("value", "error", "unit", "text"),
    [
        (58.234e6, 0.118e6, "Hz", "58.23 ± 0.12 MHz"),
        (827e3, 119e3, "Hz", "830 ± 120 kHz"),
        (999.96e3, 200.0, "Hz", "999.96 ± 0.20 kHz"),
        (999.96e3, 967.0, "Hz", "1.0000 ± 0.0010 MHz"),
        (-150e-12, 23e-12, "s", "−150 ± 23 ps"),
        (-1e-15, 3e-12, "F", "0.0 ± 3.0 pF"),
        (0.0, 3e-12, "F", "0.0 ± 3.0 pF"),
        (58e6, 120e6, "Hz", "60 ± 120 MHz"),
        (12634.0, 134.0, "V/V", "12630 ± 130 V/V"),
        (0.0523, 0.0041, "deg", "0.052 ± 0.004 deg"),
        (1.2e30, 1.1e29, "Hz", "1.200e+30 ± 1.1e+29 Hz"),
        (1.2e6, None, "Hz", "1.200 MHz"),
        (1.2e6, 0.0, "Hz", "1.200 MHz"),
        (None, 0.1, "Hz", "–"),
        (math.nan, 0.1, "Hz", "–"),
    ],
)
def test_error_is_written_in_the_prefix_of_the_value(
    value: float | None, error: float | None, unit: str, text: str
) -> None:
    assert si_with_error(value, error, unit) == text


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (1.234e6, "Hz", "1.234 MHz"),
        (999.96e3, "Hz", "1.000 MHz"),
        (9.9999e3, "Hz", "10.00 kHz"),
        (99.9996, "Hz", "100.0 Hz"),
        (1e-12, "F", "1.000 pF"),
        (-1.234e-6, "s", "−1.234 µs"),
        (0.0, "Ω", "0 Ω"),
        (math.inf, "Hz", "inf Hz"),
        (12600.0, "V/V", "12600 V/V"),
        (65.25, "deg", "65.25 deg"),
        (0.05, "deg", "0.05000 deg"),
        (1e-21, "F", "1.000e−21 F"),
        (1e300, "V/V", "1.000e+300 V/V"),
        (None, "Hz", "–"),
        (math.nan, "Hz", "–"),
    ],
)
def test_number_is_written_with_its_prefix(value: float | None, unit: str, text: str) -> None:
    assert si(value, unit) == text


@given(st.floats(min_value=1e-15, max_value=1e12), st.sampled_from(["Hz", "F", "Ω", "S", "s"]))
def test_what_is_written_reads_back(value: float, unit: str) -> None:
    # Four digits: half a step of the fourth is 0.05 % at worst.
    assert parse_quantity(si(value, unit), unit) == pytest.approx(value, rel=5.01e-4)


@given(st.floats(min_value=1e-30, max_value=1e30), st.sampled_from(["Hz", "F", "Ω", "S", "s", "V/V"]))
def test_exact_text_reads_back_as_the_very_number(value: float, unit: str) -> None:
    assert parse_quantity(si_exact(value, unit), unit) == value


def test_exact_text_stays_short_where_it_can() -> None:
    assert [si_exact(1.6e-3, "S"), si_exact(1.8e-12, "F"), si_exact(0.0, "Ω")] == ["1.6 mS", "1.8 pF", "0 Ω"]


@given(st.floats(min_value=1e-12, max_value=1e12), st.floats(min_value=1e-5, max_value=10))
def test_rounded_error_keeps_one_or_two_digits(value: float, relative: float) -> None:
    error = value * relative
    number, _, rest = si_with_error(value, error, "Hz").partition(" ± ")
    spread, _, unit = rest.partition(" ")
    shown = parse_quantity(f"{spread} {unit}", "Hz")
    assert shown == pytest.approx(error, rel=0.13)  # 0.355 to 0.4 is the coarsest step
    # One digit of 0.355 is the coarsest: half a step of 0.1 is 0.14 of the error.
    assert abs(parse_quantity(f"{number} {unit}", "Hz") - value) <= 0.15 * error
