"""Parasitic capacitance from the fitted poles: exact on exact data, covered by its interval on dies."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, DELAY_S, DESIGN, FREQ_HZ, NOMINAL, SPREADS, drawn, measured, noise_free

from fitamp.comparison import Parasitic, compare
from fitamp.comparison.expectation import fit_with_design
from fitamp.comparison.parasitic import parasitics
from fitamp.design import Bench, Design, HalfPlane, Roots
from fitamp.estimate import Estimate, Known
from fitamp.sweep import Sweep


def parasitic_of(sweep: Sweep, design: Design = DESIGN) -> Parasitic:
    """Parasitics of a sweep; a design with elements always has an answer."""
    found = parasitics(fit_with_design(sweep, design), design)
    assert found is not None
    return found


@pytest.mark.parametrize("resistor_ohm", [0.0, 500.0, 1300.0, 2600.0])
@pytest.mark.parametrize("extra_f", [0.5e-12, -0.5e-12, 3e-12])
def test_extra_load_is_found_whatever_the_resistor(resistor_ohm: float, extra_f: float) -> None:
    # The fit may pull the third pole within its prior, by far less than 1e-3 of half a picofarad.
    part = NOMINAL.with_changes(Rz=resistor_ohm, CL=NOMINAL.CL + extra_f)
    found = parasitic_of(noise_free(part))
    assert found.load_f.value == pytest.approx(extra_f, rel=1e-3)
    assert found.load_total_f.value == pytest.approx(NOMINAL.CL + extra_f + BENCH.load_f, rel=1e-4)


def test_load_is_found_through_a_mirror_pole_and_an_overlap() -> None:
    nominal = NOMINAL.with_changes(mirror_pole_hz=300e6, Cgd=5e-15, delay_s=0.2e-9)
    design = Design.from_elements(nominal, spreads=SPREADS | {"mirror_pole_hz": 0.02}, bench=BENCH)
    found = parasitic_of(noise_free(nominal.with_changes(CL=4.5e-12)), design)
    # With an overlap the far zero moves a little with the load; its designed place is taken.
    assert found.load_f.value == pytest.approx(0.5e-12, rel=0.01)


def test_load_interval_covers_the_truth_on_dies() -> None:
    rng = np.random.default_rng(51)
    others = {name: spread for name, spread in SPREADS.items() if name != "CL"}
    covered, pulls = 0, []
    for seed in range(40):
        die = drawn(rng, others).with_changes(CL=4.5e-12)
        load_f = BENCH.load_f * (1 + BENCH.load_spread * rng.standard_normal())
        delay_s = DELAY_S + BENCH.delay_spread_s * rng.standard_normal()
        found = parasitic_of(measured(die, seed, load_f=load_f, delay_s=delay_s)).load_f
        assert found.value is not None
        assert found.stderr is not None
        covered += abs(found.value - 0.5e-12) <= 1.96 * found.stderr
        pulls.append((found.value - 0.5e-12) / found.stderr)
    assert 0.88 * 40 <= covered <= 40
    # Intervals that are far too wide would cover as well: 40 pulls have a spread of 1 ± 0.11.
    assert 0.7 < np.std(pulls) < 1.35


def test_uncertainty_of_the_load_is_that_of_the_elements_by_hand() -> None:
    # In the limit of large gain b = a2/a1 ≈ (C1·CL + Cc·(C1 + CL))/(gm2·Cc), so CL = (b·gm2 - C1)/(1 + C1/Cc): 8 % of
    # gm2 weigh 8 % of b·gm2 = CL·(1 + C1/Cc) + C1. With every other spread at nothing, that is all there is.
    only_gm2 = dict.fromkeys(SPREADS, 1e-6) | {"gm2": 0.08}
    design = Design.from_elements(NOMINAL, spreads=only_gm2, bench=Bench(load_f=BENCH.load_f, delay_s=BENCH.delay_s))
    found = parasitic_of(noise_free(NOMINAL), design).load_total_f
    ratio = 1 + NOMINAL.C1 / NOMINAL.Cc
    assert found.stderr == pytest.approx(0.08 * (6e-12 + NOMINAL.C1 / ratio), rel=0.05)


def test_first_stage_parasitic_where_the_band_shows_the_third_pole() -> None:
    # The third pole lies at 660 MHz: a sweep to 500 MHz shows it.
    freq_hz = np.geomspace(10, 500e6, 161)
    part = NOMINAL.with_changes(C1=NOMINAL.C1 + 60e-15)
    pulls = []
    for seed in range(12):
        found = parasitic_of(measured(part, seed, freq_hz=freq_hz)).first_stage_f
        assert found.known is Known.MEASURED
        assert found.value is not None
        assert found.stderr is not None
        assert found.stderr < 20e-15
        pulls.append((found.value - 60e-15) / found.stderr)
    assert np.abs(pulls).max() < 3


def test_first_stage_parasitic_is_exact_on_exact_data() -> None:
    part = NOMINAL.with_changes(C1=NOMINAL.C1 + 60e-15, CL=4.5e-12)
    sweep = noise_free(part, freq_hz=np.geomspace(10, 1e9, 161))
    found = parasitic_of(sweep)
    # The prior still expects the designed C1 and pulls a little.
    assert found.first_stage_f.value == pytest.approx(60e-15, rel=0.02)
    assert "the third pole puts" in found.sentence


def test_first_stage_parasitic_covers_the_truth_on_dies() -> None:
    rng = np.random.default_rng(52)
    freq_hz = np.geomspace(10, 500e6, 121)
    covered = 0
    for seed in range(16):
        die = drawn(rng, {name: SPREADS[name] for name in ("gm1", "gm2", "R1", "R2", "Cc")})
        die = die.with_changes(C1=260e-15)
        low, high = parasitic_of(measured(die, seed, freq_hz=freq_hz)).first_stage_f.ci95
        assert low is not None
        assert high is not None
        covered += low <= 60e-15 <= high
    assert covered >= 14


@pytest.mark.parametrize("resistor_ohm", [0.0, 1300.0])
def test_first_stage_parasitic_is_undetermined_where_the_band_ends_early(resistor_ohm: float) -> None:
    part = NOMINAL.with_changes(C1=NOMINAL.C1 + 60e-15, Rz=resistor_ohm)
    found = parasitic_of(measured(part, 53, freq_hz=np.geomspace(10, 40e6, 121)))
    assert found.first_stage_f.known is Known.UNDETERMINED
    assert found.first_stage_f.value is None
    assert "third pole" not in found.sentence


def test_without_pole_2_there_is_no_load_to_tell() -> None:
    fit = fit_with_design(measured(NOMINAL, 54), DESIGN)
    bound = Estimate(value=None, stderr=None, ci95=(5e6, None), known=Known.LOWER_BOUND)
    found = parasitics(replace(fit, parameters=replace(fit.parameters, pole2_hz=bound)), DESIGN)
    assert found is not None
    assert found.load_f.known is found.load_total_f.known is Known.UNDETERMINED
    assert found.sentence == "the load capacitance cannot be told: pole 2 is not determined by this band"


def test_the_sentence_says_what_is_assumed_and_when_it_is_nothing() -> None:
    nothing = parasitic_of(measured(NOMINAL, 55)).sentence
    assert "which is no more than the uncertainty" in nothing
    assert "taking gm2, Cc, C1, R1 and R2 as designed" in nothing
    much = parasitic_of(measured(NOMINAL.with_changes(CL=8e-12), 55)).sentence
    assert "no more than the uncertainty" not in much
    assert "beyond the designed 4.00 pF and the bench's 2.00 pF" in much


def test_a_design_by_roots_has_no_elements_to_blame() -> None:
    roots = Roots(dc_gain=12e3, pole1_hz=1.09e3, pole2_hz=39.9e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)
    sweep = Sweep(freq_hz=FREQ_HZ, gain=roots.transfer().evaluate(FREQ_HZ))
    assert compare(sweep, Design.from_roots(roots)).parasitic is None
