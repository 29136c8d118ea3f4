"""Terminations as people write them."""

from __future__ import annotations

import math

import numpy as np
import pytest

from fitamp.errors import UsageError
from fitamp.loopgain import Termination


@pytest.mark.parametrize(
    ("text", "ohm", "farad", "told"),
    [
        ("50 Ohm", 50.0, 0.0, "50.00 Ω"),
        ("1 MOhm || 2 pF", 1e6, 2e-12, "1.000 MΩ across 2.000 pF"),
        ("2 pF ∥ 1 MΩ", 1e6, 2e-12, "1.000 MΩ across 2.000 pF"),
        ("2 pF", math.inf, 2e-12, "open, 2.000 pF"),
        ("open", math.inf, 0.0, "open"),
        ("0 Ohm", 0.0, 0.0, "0 Ω"),
    ],
)
def test_terminations_are_read_and_told(text: str, ohm: float, farad: float, told: str) -> None:
    found = Termination.parse(text)
    assert found.resistance_ohm == ohm
    assert found.capacitance_f == pytest.approx(farad, rel=1e-12)
    assert not found.is_loop
    assert str(found) == told


def test_loop_itself_is_read_and_told() -> None:
    assert Termination.parse("Loop").is_loop
    assert str(Termination.parse("loop")) == "the loop itself"


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("50", r"termination '50': '50' has no unit; expected Ω, as in .*; expected \"50 Ohm\", \"1 MOhm"),
        ("50 Ohm || 1 kOhm", "has two parts in Ω"),
        ("shut", "'shut' is not a number with unit"),
        ("", "is not a number with unit"),
        ("-3 Ohm", "a termination of -3 ohm and 0 F is none"),
    ],
)
def test_what_is_no_termination_is_refused(text: str, told: str) -> None:
    with pytest.raises(UsageError, match=told):
        Termination.parse(text)


def test_reflection_of_a_match_an_open_port_and_a_short() -> None:
    freq_hz = np.array([1e3, 1e6])
    assert Termination.parse("50 Ohm").reflection(freq_hz, 50.0).tolist() == [0, 0]
    assert Termination.parse("open").reflection(freq_hz, 50.0).tolist() == [1, 1]
    assert Termination.parse("0 Ohm").reflection(freq_hz, 50.0).tolist() == [-1, -1]
    # A capacitance of 1/(ω·50 Ω) at 1 MHz: (1 − j)/(1 + j) = −j.
    found = Termination(capacitance_f=1 / (2 * np.pi * 1e6 * 50)).reflection(freq_hz, 50.0)
    assert found[1] == pytest.approx(-1j)
