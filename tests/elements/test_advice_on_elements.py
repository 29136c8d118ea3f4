"""Loads that keep a margin, and the resistor that restores the designed zero."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from stepped_parts import BASE, DESIGN, NOMINAL, STEPS, drawn, swept

from fitamp.comparison import compare
from fitamp.design import Bench
from fitamp.elements import ElementEstimate, estimate_elements, load_range, restoring_resistor
from fitamp.errors import UsageError
from fitamp.margins import margins

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))
DIE = drawn(5)


@pytest.fixture(scope="module")
def stepped() -> ElementEstimate:
    return estimate_elements(swept(DIE, STEPS, 4, bench_load_f=0.0), BARE, conditions=STEPS)


def margin_at(load_f: float) -> float:
    found = margins(DIE.with_changes(CL=load_f).transfer()).phase_margin_deg
    assert found is not None
    return found


@pytest.mark.parametrize("wanted_deg", [75.0, 60.0, 45.0])
def test_at_the_end_of_the_range_the_part_has_the_margin(stepped: ElementEstimate, wanted_deg: float) -> None:
    found = load_range(stepped, phase_margin_deg=wanted_deg)
    assert found.keeps
    assert found.low_f is None
    assert found.high_f is not None
    assert found.high_f.value is not None
    assert found.high_f.stderr is not None
    # The part itself, not its estimate, has the wanted margin within what its elements leave open.
    low, high = (margin_at(found.high_f.value + sign * 3.5 * found.high_f.stderr) for sign in (-1, 1))
    assert high < wanted_deg < low
    assert found.room_f is not None
    assert found.room_f.value == pytest.approx(found.high_f.value - found.load_f)


def test_a_part_that_does_not_keep_the_margin_has_too_much_load(stepped: ElementEstimate) -> None:
    found = load_range(stepped, phase_margin_deg=85.0)
    assert not found.keeps
    assert found.high_f is not None
    assert found.high_f.value is not None
    assert found.high_f.value < found.load_f
    assert found.room_f is not None
    assert found.room_f.ci95[1] is not None
    assert found.room_f.ci95[1] < 0


def test_a_margin_that_no_load_keeps(stepped: ElementEstimate) -> None:
    found = load_range(stepped, phase_margin_deg=150.0)
    assert (found.keeps, found.low_f, found.high_f, found.room_f) == (False, None, None, None)


def test_one_sweep_knows_the_room_only_as_a_share_of_the_load() -> None:
    single = estimate_elements(swept(DIE, [BASE], 4, bench_load_f=0.0), BARE)
    found = load_range(single, phase_margin_deg=60.0)
    assert found.room_f is not None
    assert found.room_f.value is not None
    assert found.room_f.stderr is not None
    # Their quotient is known from the measured pole 2, both of them as well as CL is.
    load = single.element("CL").estimate
    assert load.stderr is not None
    assert found.room_f.stderr / found.room_f.value == pytest.approx(load.stderr / found.load_f, rel=0.1)


def test_a_margin_is_an_angle(stepped: ElementEstimate) -> None:
    with pytest.raises(UsageError, match="lies between -180 and 180 degrees, but 200 is wanted"):
        load_range(stepped, phase_margin_deg=200.0)


def test_the_restoring_resistor_puts_the_zero_of_the_part_at_the_designed_place(stepped: ElementEstimate) -> None:
    found = restoring_resistor(stepped)
    assert found.zero_time_s == NOMINAL.zero_time_s
    assert found.rz_ohm.value is not None
    assert found.rz_ohm.stderr is not None
    restored_s = DIE.with_changes(Rz=found.rz_ohm.value).zero_time_s
    assert abs(restored_s - NOMINAL.zero_time_s) < 3.5 * DIE.Cc * found.rz_ohm.stderr
    assert found.change_ohm.value == pytest.approx(found.rz_ohm.value - stepped.amplifier.Rz)


def test_the_simple_advice_of_a_comparison_agrees_within_its_own_error(stepped: ElementEstimate) -> None:
    sweep = swept(DIE, [BASE], 4, bench_load_f=0.0)[0]
    simple = compare(sweep, BARE).advice.rz_change_ohm
    full = restoring_resistor(stepped).change_ohm
    assert simple.value is not None
    assert simple.stderr is not None
    assert full.value is not None
    assert full.stderr is not None
    assert abs(simple.value - full.value) < 3 * np.hypot(simple.stderr, full.stderr)
    assert full.stderr < 0.1 * simple.stderr
