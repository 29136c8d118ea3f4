"""How a sweep was taken: what is refused."""

from __future__ import annotations

import math

import pytest

from fitamp.elements.condition import Condition
from fitamp.errors import UsageError


def test_nothing_is_added_unless_stated() -> None:
    condition = Condition()
    assert (condition.load_added_f, condition.rz_added_ohm, condition.temp_c, condition.note) == (0.0, 0.0, None, "")


def test_a_trim_code_may_take_resistance_away() -> None:
    assert Condition(rz_added_ohm=-400.0).rz_added_ohm == -400.0


@pytest.mark.parametrize("load_f", [-1e-12, math.nan, math.inf])
def test_an_added_load_is_a_capacitor(load_f: float) -> None:
    with pytest.raises(UsageError, match="added load must be 0 F or more"):
        Condition(load_added_f=load_f)


def test_an_added_resistance_is_finite() -> None:
    with pytest.raises(UsageError, match="added resistance must be finite"):
        Condition(rz_added_ohm=math.inf)


@pytest.mark.parametrize("temp_c", [-300.0, math.nan])
def test_a_temperature_is_possible(temp_c: float) -> None:
    with pytest.raises(UsageError, match=r"-273\.15 °C or more"):
        Condition(temp_c=temp_c)
