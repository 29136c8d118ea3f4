"""Whether a verdict would be decided: distances to edges, and the share of parts that stays open, against draws."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from planned_parts import DESIGN, NOMINAL, OWN_SPREADS, added

from fitamp.design import Design, Limit
from fitamp.planning import Expected, Outlook, expected_precision
from fitamp.planning.outlook import outlook_of


def _outlook(design: Design, *, value_s: float, sd_s: float | None, reach_s: float = 0.3e-9) -> Outlook:
    zero = Expected(name="zero_time_s", unit="s", value=value_s, sd=sd_s, before=None)
    margin = Expected(name="phase_margin_deg", unit="deg", value=70.0, sd=2.0, before=None)
    return outlook_of(design, {"zero_time_s": zero, "phase_margin_deg": margin}, reach_s=reach_s)


def test_distances_are_counted_in_standard_deviations() -> None:
    outlook = _outlook(OWN_SPREADS, value_s=1.2e-9, sd_s=0.01e-9)
    # The window is 200 MHz to 90 MHz, 0.796 ns to 1.768 ns; nearest is 200 MHz.
    assert outlook.region == "as-designed"
    assert outlook.edge_sigma == pytest.approx((1.2e-9 - 1 / (2 * math.pi * 200e6)) / 0.01e-9)
    assert outlook.half_plane_sigma == pytest.approx(120.0)
    assert outlook.is_decidable


@pytest.mark.parametrize(
    ("value_s", "region", "decidable"),
    [
        (-1e-9, "wrong-side", True),
        (0.05e-9, "at-infinity", False),
        (0.4e-9, "too-little", True),
        (1.77e-9, "too-much", 0),
    ],
)
def test_the_region_is_where_the_zero_lies(value_s: float, region: str, decidable: bool) -> None:
    outlook = _outlook(OWN_SPREADS, value_s=value_s, sd_s=0.05e-9)
    assert outlook.region == region
    assert outlook.is_decidable == bool(decidable)


@pytest.mark.parametrize("sd_s", [0.02e-9, 0.1e-9, 0.5e-9])
def test_the_undecided_share_is_that_of_drawn_parts(sd_s: float) -> None:
    rng = np.random.default_rng(2)
    measured_s = 1.2e-9 + 0.3e-9 * rng.standard_normal(200_000) + sd_s * rng.standard_normal(200_000)
    edges_s = np.array([-0.1125e-9, 0.1125e-9, 1 / (2 * math.pi * 200e6), 1 / (2 * math.pi * 90e6)])
    is_open = (np.abs(measured_s[:, np.newaxis] - edges_s) < 1.96 * sd_s).any(axis=1)
    share = _outlook(OWN_SPREADS, value_s=1.2e-9, sd_s=sd_s).undecided_share
    assert share == pytest.approx(is_open.mean(), abs=4e-3)


def test_limits_are_looked_at_from_inside_and_outside() -> None:
    (inside,) = _outlook(OWN_SPREADS, value_s=1e-9, sd_s=1e-12).limits
    assert (inside.quantity, inside.low, inside.high) == ("phase_margin_deg", 65.0, 95.0)
    assert inside.sigma == pytest.approx(2.5)
    assert inside.is_decidable
    broken = replace(OWN_SPREADS, limits={"phase_margin_deg": Limit(low=71.0)})
    (outside,) = _outlook(broken, value_s=1e-9, sd_s=1e-12).limits
    assert outside.sigma == pytest.approx(-0.5)
    assert not outside.is_decidable


def test_an_unknown_zero_time_leaves_all_open() -> None:
    outlook = _outlook(OWN_SPREADS, value_s=1.2e-9, sd_s=None)
    assert (outlook.edge_sigma, outlook.half_plane_sigma, outlook.undecided_share) == (None, None, None)
    assert not outlook.is_decidable


def test_a_design_without_limits_has_the_window_of_its_spreads() -> None:
    outlook = expected_precision(replace(OWN_SPREADS, limits={}), [added(), added(10.0)]).outlook
    # Spreads alone let 5 % of parts out of their own window, and each edge has parts beside it.
    assert outlook.region == "as-designed"
    assert outlook.undecided_share is not None
    assert 0 < outlook.undecided_share < 0.02
    assert outlook.limits == ()


def test_a_zero_designed_at_infinity_is_judged_by_both_sides() -> None:
    nulled = Design.from_elements(NOMINAL.with_changes(Rz=625.0), spreads=DESIGN.spreads, bench=DESIGN.bench)
    outlook = expected_precision(nulled, [added(), added(10.0)]).outlook
    assert outlook.region == "as-designed"
    assert outlook.half_plane_sigma == pytest.approx(0.0, abs=1e-9)
    assert outlook.is_decidable
