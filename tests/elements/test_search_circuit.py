"""Starts, valleys and noise of the search for a circuit."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from stepped_parts import BASE, DESIGN, FREQ_HZ, NOISE, NOMINAL, STEPS, drawn, exact_sweep, swept

from fitamp.design import Bench
from fitamp.elements import ElementNoteCode, estimate_elements
from fitamp.elements.search import floored
from fitamp.elements.solving import least_resistor_ohm

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))


def test_a_pole_2_that_two_pairs_of_capacitors_explain_has_two_valleys() -> None:
    # Pole 2 and pole 3 hold C1 + CL and C1·CL, the same with C1 and CL exchanged; without priors on the two nothing
    # tells which is which.
    sweep = swept(NOMINAL, [BASE], seed=1, bench_load_f=0.0)
    estimate = estimate_elements(sweep, BARE, under_test=["C1", "CL"])
    other = estimate.other_valley
    assert other is not None
    assert not estimate.is_trustworthy
    pairs = sorted([(part.C1, part.CL) for part in (estimate.amplifier, other)])
    assert pairs[0][0] == pytest.approx(NOMINAL.C1, rel=0.5)
    assert pairs[0][1] == pytest.approx(NOMINAL.CL, rel=0.5)
    assert pairs[1][0] / pairs[1][1] == pytest.approx(pairs[0][1] / pairs[0][0], rel=0.5)
    (note,) = (note for note in estimate.notes if note.code is ElementNoteCode.TWO_VALLEYS)
    assert "a sweep with an added load or resistance tells them apart" in note.message


def test_an_added_load_leaves_one_valley() -> None:
    sweeps = swept(NOMINAL, STEPS[:2], seed=1, bench_load_f=0.0)
    estimate = estimate_elements(sweeps, BARE, conditions=STEPS[:2], under_test=["C1", "CL"])
    assert estimate.other_valley is None
    assert estimate.element("CL").estimate.value == pytest.approx(NOMINAL.CL, rel=0.01)


@pytest.mark.parametrize("resistor_ohm", [0.0, 300.0, 625.0, 3500.0])
def test_every_resistor_is_found_from_the_design_of_one(resistor_ohm: float) -> None:
    die = NOMINAL.with_changes(Rz=resistor_ohm)
    sweep = exact_sweep(die, bench_load_f=0.0)
    estimate = estimate_elements(sweep, BARE)
    # From one sweep Rz and 1/gm2 are known as their difference; without noise the priors choose, near the design.
    assert estimate.zero_time_s.value == pytest.approx(die.zero_time_s, abs=1e-6 * NOMINAL.Cc / NOMINAL.gm2)
    assert estimate.element("Rz").estimate.value == pytest.approx(resistor_ohm, abs=0.01 * NOMINAL.Rz)


def test_noise_is_estimated_about_the_circuit() -> None:
    estimate = estimate_elements(swept(drawn(1), STEPS, seed=2), DESIGN, conditions=STEPS)
    for one in estimate.solution.sweeps:
        assert one.noise.relative == pytest.approx(NOISE.relative, rel=0.35)
        assert one.noise.source == "estimated from the sweep"


def test_a_computed_sweep_is_as_sure_as_a_lumped_circuit_can_be() -> None:
    estimate = estimate_elements(exact_sweep(NOMINAL, bench_load_f=0.0), BARE)
    noise = estimate.solution.sweeps[0].noise
    assert noise.relative == 1e-6
    assert noise.source == "floor of a lumped circuit"
    assert floored(NOISE) is NOISE


def test_no_sweep_may_have_a_negative_resistance() -> None:
    estimate = estimate_elements(swept(drawn(1), STEPS, seed=2), DESIGN, conditions=STEPS)
    assert least_resistor_ohm(estimate.solution.sweeps) == 400.0
    assert least_resistor_ohm(estimate.solution.sweeps[:2]) == 0.0


def test_a_range_step_is_taken_over_from_its_fit() -> None:
    sweeps = swept(drawn(1), STEPS, seed=2)
    sweeps[2] = replace(sweeps[2], gain=sweeps[2].gain * np.where(FREQ_HZ > 3e5, 1.03, 1.0))
    estimate = estimate_elements(sweeps, DESIGN, conditions=STEPS)
    assert [one.factor is not None for one in estimate.solution.sweeps] == [False, False, True, False, False]
    assert estimate.element("CL").estimate.value == pytest.approx(drawn(1).CL, abs=0.3e-12)
    assert estimate.element("gm2").estimate.value == pytest.approx(drawn(1).gm2, rel=0.02)


def test_a_resonance_beside_the_amplifier_is_taken_over_from_its_fit() -> None:
    # A pair of poles and one of zeros at 12 MHz, as of a package: no circuit of the model has them.
    f = 1j * FREQ_HZ / 12e6
    pair = (1 + 0.05 * f + f**2) / (1 + 0.08 * f + f**2)
    sweeps = swept(drawn(1), STEPS, seed=2)
    sweeps[1] = replace(sweeps[1], gain=sweeps[1].gain * pair)
    estimate = estimate_elements(sweeps, DESIGN, conditions=STEPS)
    taken = [one.factor is not None for one in estimate.solution.sweeps]
    assert taken == [False, True, False, False, False]
    (note,) = (note for note in estimate.notes if note.code is ElementNoteCode.FACTOR_TAKEN_OVER)
    assert note.files == ("step1.csv",)
    factor = estimate.solution.sweeps[1].factor
    assert factor is not None
    assert np.abs(factor / pair - 1).max() < 0.02
    assert estimate.element("gm2").estimate.value == pytest.approx(drawn(1).gm2, rel=0.02)
