"""Sweeps that do not show the same part: told apart, named, left out where that is plain."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from stepped_parts import BASE, DESIGN, FREQ_HZ, STEPS, drawn, swept

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design import Bench
from fitamp.elements import Condition, ElementNoteCode, estimate_elements
from fitamp.sweep import Sweep

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))
DIE = drawn(5)
MORE_STEPS = (*STEPS, Condition(load_added_f=10e-12))


def with_one_changed(changed: Elements, which: int, conditions: tuple[Condition, ...], seed: int = 4) -> list[Sweep]:
    sweeps = swept(DIE, conditions, seed, bench_load_f=0.0)
    sweeps[which] = swept(changed, conditions, seed, bench_load_f=0.0)[which]
    return sweeps


def test_a_part_that_changed_is_named_with_what_changed_and_left_out() -> None:
    sweeps = with_one_changed(DIE.with_changes(CL=DIE.CL * 1.03), 2, MORE_STEPS)
    estimate = estimate_elements(sweeps, BARE, conditions=MORE_STEPS)
    (check,) = (check for check in estimate.checks if check.changed)
    assert check.file == "step2.csv"
    assert check.left_out
    assert check.suspect == "CL"
    assert check.suspect_change is not None
    assert check.suspect_change.value == pytest.approx(0.03 * DIE.CL, rel=0.1)
    assert not estimate.is_consistent
    assert estimate.is_trustworthy
    assert len(estimate.sweeps) == 6
    assert len(estimate.solution.sweeps) == 5
    (note,) = estimate.notes
    assert note.code is ElementNoteCode.PART_CHANGED
    assert note.files == ("step2.csv",)
    assert "step2.csv does not show the same part as the other sweeps: CL would have to be larger" in note.message
    # Without it the elements are those of the part.
    assert estimate.element("gm2").estimate.value == pytest.approx(DIE.gm2, rel=3e-3)


def test_a_resistor_that_was_not_added_shows_as_one() -> None:
    # Stated as −400 Ω, measured without.
    sweeps = swept(DIE, STEPS, 4, bench_load_f=0.0)
    sweeps[3] = swept(DIE, [BASE, *STEPS[1:3], BASE], 5, bench_load_f=0.0)[3]
    estimate = estimate_elements(sweeps, BARE, conditions=STEPS)
    check = estimate.checks[3]
    assert check.changed
    assert check.suspect == "Rz"


def test_where_it_is_not_plain_which_sweep_stands_apart_all_stay_with_wide_errors() -> None:
    # Of a line through added loads of 0, 5 and 15 pF one point is off: it may be either of two.
    sweeps = with_one_changed(DIE.with_changes(CL=DIE.CL * 1.03), 2, STEPS)
    estimate = estimate_elements(sweeps, BARE, conditions=STEPS)
    assert [check.changed for check in estimate.checks] == [False, True, True, False, False]
    assert not any(check.left_out for check in estimate.checks)
    assert not estimate.is_trustworthy
    note = estimate.notes[0]
    assert note.code is ElementNoteCode.PART_CHANGED
    assert "step1.csv or step2.csv" in note.message
    for name in ("gm2", "CL", "Cc", "Rz"):
        low, high = estimate.element(name).estimate.ci95
        assert low is not None
        assert high is not None
        assert low < getattr(DIE, name) < high


def test_two_sweeps_that_contradict_one_another_are_both_named() -> None:
    sweeps = with_one_changed(DIE.with_changes(gm1=DIE.gm1 * 1.1), 1, (BASE, BASE))
    estimate = estimate_elements(sweeps, BARE)
    assert [check.changed for check in estimate.checks] == [True, True]
    assert not estimate.is_trustworthy


def test_no_sweep_is_left_out_where_all_are_to_be_kept() -> None:
    sweeps = with_one_changed(DIE.with_changes(CL=DIE.CL * 1.03), 2, MORE_STEPS)
    estimate = estimate_elements(sweeps, BARE, conditions=MORE_STEPS, keep_all=True)
    (check,) = (check for check in estimate.checks if check.changed)
    assert check.file == "step2.csv"
    assert not check.left_out
    assert len(estimate.solution.sweeps) == 6
    assert not estimate.is_trustworthy


def test_an_unchanged_part_is_called_changed_no_more_often_than_promised() -> None:
    # Promised once in 10 000 estimates; the chances themselves are uniform, so that of 30 one or two are below 0.05.
    chances = []
    for seed in range(10):
        estimate = estimate_elements(
            swept(drawn(seed), STEPS[::2], 50 + seed, bench_load_f=0.0), BARE, conditions=STEPS[::2]
        )
        assert estimate.is_consistent
        chances += [check.change_chance for check in estimate.checks]
    low = sum(chance is not None and chance < 0.05 for chance in chances)
    assert 0 <= low <= 6
    assert 0.3 < np.mean([chance for chance in chances if chance is not None]) < 0.7


def test_a_sweep_that_no_circuit_describes_counts_for_less() -> None:
    sweeps = swept(DIE, STEPS, 4, bench_load_f=0.0)
    wavy = sweeps[4].gain * (1 + 0.01 * np.sin(3 * np.log(FREQ_HZ)))
    sweeps[4] = replace(sweeps[4], gain=wavy)
    estimate = estimate_elements(sweeps, BARE, conditions=STEPS)
    assert not estimate.checks[4].adequacy.adequate
    assert ElementNoteCode.CIRCUIT_INADEQUATE in {note.code for note in estimate.notes}
    assert not estimate.is_trustworthy
    weights = [one.inflation for one in estimate.solution.sweeps]
    assert weights[4] > 10
    assert max(weights[:4]) == 1.0
    for name in ELEMENT_NAMES:
        one = estimate.element(name).estimate
        assert one.value is not None
        assert one.stderr is not None
        assert abs(one.value - getattr(DIE, name)) < 4 * one.stderr
