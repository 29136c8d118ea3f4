"""Noise levels and path delay as the command line takes them."""

from __future__ import annotations

import math

import pytest

from fitamp.errors import UsageError
from fitamp.options import StatedDelay, parse_delay, parse_noise
from fitamp.sweep import NoiseLevels


@pytest.mark.parametrize(
    ("text", "error", "returned", "relative", "ratio"),
    [
        ("error=2e-5 return=3e-5 relative=1e-3", 2e-5, 3e-5, 1e-3, 0.0),
        ("relative = 0.1 %\treturn=1e-5", 0.0, 1e-5, 1e-3, 0.0),
        (" ratio=1e-6 error=0 ", 0.0, 0.0, 0.0, 1e-6),
    ],
)
def test_noise_is_read_in_any_order(text: str, error: float, returned: float, relative: float, ratio: float) -> None:
    levels = NoiseLevels(error_channel=error, return_channel=returned, relative=relative, ratio=ratio, source="given")
    assert parse_noise(text) == levels


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "no level above 0 in ''; expected something like --noise \"error=2e-5 return=2e-5 relative=1e-3\""),
        ("error=0 return=0", "no level above 0"),
        ("2e-5", "'2e-5' is not one of error, return, relative, ratio with =; as in --noise"),
        ("noise=2e-5", "'noise=2e-5' is not one of"),
        ("error=2e-5,return=2e-5", "error=2e-5,return=2e-5 is not a number; expected something like error=2e-5"),
        ("error=-94dB", "error=-94dB is not a number"),
        ("relative=nan", "relative=nan is not a number"),
        ("relative=", "relative= is not a number"),
        ("error=1e-5 error=2e-5", "error is given twice"),
        ("error=-2e-5", "error=-2e-5 is no noise level for a drive of 1; expected 0, or 1e-15 to 1"),
        ("error=1e200", "is no noise level"),
        ("error=1e-200", "is no noise level"),
    ],
)
def test_noise_that_is_none_is_refused(text: str, words: str) -> None:
    with pytest.raises(UsageError, match=r"^--noise: ") as caught:
        parse_noise(text)
    assert words in str(caught.value)


@pytest.mark.parametrize(
    ("text", "delay_s", "sd_s"),
    [
        ("0 ns", 0.0, 0.0),
        ("0.4 ns", 0.4e-9, 0.0),
        ("0.4 ns +- 0.02 ns", 0.4e-9, 0.02e-9),
        ("400ps±20ps", 0.4e-9, 0.02e-9),
        ("4e-10 s +/- 20 ps", 0.4e-9, 0.02e-9),
        ("0.4 ns +− 0 s", 0.4e-9, 0.0),
    ],
)
def test_delay_is_read_with_its_standard_deviation(text: str, delay_s: float, sd_s: float) -> None:
    stated = parse_delay(text)
    assert (stated.delay_s, stated.sd_s) == pytest.approx((delay_s, sd_s), rel=1e-12)
    assert not stated.is_free


def test_free_is_a_delay_of_which_nothing_is_known() -> None:
    assert parse_delay(" Free ") == StatedDelay(sd_s=math.inf)
    assert parse_delay("free").is_free


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", '\'\' is not a time with unit; expected "0.4 ns", "0.4 ns +- 0.02 ns" or free'),
        ("0.4", "'0.4' is not a time with unit"),
        ("0.4 ns 0.02 ns", "is not a time with unit"),
        ("0,4 ns", "'0,4 ns' is not a time with unit"),
        ("0.4 +- 0.02 ns", "'0.4' is not a time with unit"),
        ("0.4 ns +-", "'' is not a time with unit"),
        ("1 GHz", "'1 GHz' is not a time with unit"),
        ("-0.4 ns", "'-0.4 ns' is negative"),
        ("0.4 ns +- -0.02 ns", "'-0.02 ns' is negative"),
        ("1 ns +- 1 ns +- 1 ns", "has more than one ±"),
        ("inf s", "is not a time with unit"),
    ],
)
def test_a_delay_that_is_none_is_refused(text: str, words: str) -> None:
    with pytest.raises(UsageError, match=r"^--delay: ") as caught:
        parse_delay(text)
    assert words in str(caught.value)
