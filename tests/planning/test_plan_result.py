"""Parts of a plan that stand alone."""

from __future__ import annotations

import pytest
from planned_parts import OWN_SPREADS, added

from fitamp.errors import UsageError
from fitamp.planning import Expected, LimitOutlook, Wanted, expected_precision
from fitamp.planning.result import is_met


def test_shares_need_a_value() -> None:
    assert Expected(name="zero_time_s", unit="s", value=-2.0, sd=0.1, before=0.4).relative == 0.05
    assert Expected(name="Rz", unit="Ω", value=0.0, sd=0.1, before=None).relative is None
    assert Expected(name="Rz", unit="Ω", value=1.0, sd=None, before=None).relative is None


@pytest.mark.parametrize(
    "size", [{}, {"relative": 0.1, "absolute": 1.0}, {"relative": 0.0}, {"absolute": float("inf")}]
)
def test_a_wish_is_one_number_above_zero(size: dict[str, float]) -> None:
    with pytest.raises(UsageError, match="gm2: expected one standard deviation above 0, relative or absolute"):
        Wanted(name="gm2", **size)


def test_a_wish_is_met_at_its_very_number() -> None:
    assert is_met(0.01, 0.01)
    assert not is_met(0.0101, 0.01)
    assert not is_met(None, 0.01)


def test_a_stage_knows_its_numbers_by_name() -> None:
    stage = expected_precision(OWN_SPREADS, [added()])
    assert stage.of("bench_load_f").unit == "F"
    with pytest.raises(KeyError, match="gm3"):
        stage.of("gm3")


def test_a_limit_at_the_edge_is_open() -> None:
    assert not LimitOutlook(quantity="pole2_hz", low=1.0, high=None, sigma=1.0).is_decidable
    assert LimitOutlook(quantity="pole2_hz", low=1.0, high=None, sigma=-3.0).is_decidable
    assert not LimitOutlook(quantity="pole2_hz", low=1.0, high=None, sigma=None).is_decidable
