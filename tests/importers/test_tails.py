"""Prefixes and units behind the digits: SI prefixes (SI brochure, table 7) by column."""

from __future__ import annotations

from fractions import Fraction

import pytest

from fitamp.importers.cells import number_from
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.tails import doubt_of_tail, tails_of, unit_in_cells

F, MAG, PH, RE, IM, CX = Quantity


@pytest.mark.parametrize(
    ("text", "quantity", "unit", "value"),
    [
        ("1.2k", F, Unit.HZ, "1200"),
        ("2.5M", F, Unit.HZ, "2.5e6"),
        ("2.5 MHz", F, Unit.HZ, "2.5e6"),
        ("3Meg", F, Unit.HZ, "3e6"),
        ("0.3G", F, Unit.HZ, "3e8"),
        ("80 Hz", F, Unit.HZ, "80"),
        ("10 kHz", F, Unit.KHZ, "10"),
        ("1.5krad/s", F, Unit.RAD_PER_S, "1500"),
        ("-60.1 dB", MAG, Unit.DB, "-60.1"),
        ("1.2k", MAG, Unit.LINEAR, "1200"),
        ("33m", MAG, Unit.LINEAR, "0.033"),
        ("-12.5°", PH, Unit.DEGREE, "-12.5"),
        ("-0.3 rad", PH, Unit.RADIAN, "-0.3"),
        ("4.7µ", RE, None, "4.7e-6"),
        ("-4.7u", IM, None, "-4.7e-6"),
    ],
)
def test_value_is_the_nearest_double_of_the_decimal_number(
    text: str, quantity: Quantity, unit: Unit | None, value: str
) -> None:
    # Fraction is exact; float of it is rounded once.
    assert number_from(text, tails=tails_of(quantity, unit)) == float(Fraction(value))


@pytest.mark.parametrize(
    ("text", "quantity", "unit", "doubt"),
    [
        ("80m", F, Unit.HZ, "'80m' is millihertz as it stands"),
        ("80mHz", F, Unit.HZ, "'80mHz' is millihertz as it stands"),
        ("1k", F, Unit.KHZ, "'1k' has a prefix, and the column is in kHz already"),
        ("1 MHz", F, Unit.KHZ, "'1 MHz' has a prefix, and the column is in kHz already"),
        ("2M", MAG, Unit.LINEAR, "'2M' may be mega, or milli as circuit simulators write it"),
        ("2M", RE, None, "'2M' may be mega, or milli"),
    ],
)
def test_what_may_mean_two_things_is_no_number_and_says_why(
    text: str, quantity: Quantity, unit: Unit | None, doubt: str
) -> None:
    with pytest.raises(ValueError, match="has a prefix or unit"):
        number_from(text, tails=tails_of(quantity, unit))
    assert doubt_of_tail(text, quantity, unit).startswith(doubt)


def test_exponent_and_prefix_together_are_refused() -> None:
    with pytest.raises(ValueError, match="'1e3k' has a prefix or unit"):
        number_from("1e3k", tails=tails_of(F, Unit.HZ))


def test_complex_cells_take_no_tails() -> None:
    assert tails_of(CX, None) == {}


def test_unit_that_all_cells_have_is_the_columns() -> None:
    assert unit_in_cells(["10 Hz", "1 kHz", "---", "2.5MHz"]) is Unit.HZ
    assert unit_in_cells(["60 dB", "-3,5dB"]) is Unit.DB
    assert unit_in_cells(["1 rad/s"]) is Unit.RAD_PER_S
    for cells in (["10 Hz", "10"], ["10", "20"], ["1k"], ["1 Hz", "1 dB"], ["", "OVL"], []):
        assert unit_in_cells(cells) is None
