"""The verdict on simulated noisy parts: every answer is reached, and none is confidently wrong."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, DELAY_S, DESIGN, FREQ_HZ, NOISE, NOMINAL, SPREADS, drawn, measured

from fitamp.amplifier import Elements
from fitamp.comparison import Nulling, compare
from fitamp.comparison.expectation import fit_with_design
from fitamp.comparison.parasitic import parasitics
from fitamp.comparison.verdict import advise, judge_nulling
from fitamp.design import Bench, Design, HalfPlane, Limit, Roots
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.noise import simulate_bench
from fitamp.sweep import Sweep

LIMITS = {"zero_hz": Limit(low=90e6, high=200e6)}
EVERY = {
    Nulling.AS_DESIGNED: 1300.0,
    Nulling.TOO_LITTLE: 850.0,
    Nulling.TOO_MUCH: 2600.0,
    Nulling.WRONG_SIDE: 0.0,
    Nulling.AT_INFINITY: 625.0,
}


@pytest.mark.parametrize("overlap_f", [0.0, 5e-15], ids=["no Cgd", "Cgd"])
@pytest.mark.parametrize("mirror_pole_hz", [None, 300e6], ids=["no mirror", "mirror"])
@pytest.mark.parametrize("nulling", EVERY)
def test_every_verdict_is_reached_from_a_noisy_part(
    nulling: Nulling, mirror_pole_hz: float | None, overlap_f: float
) -> None:
    nominal = NOMINAL.with_changes(mirror_pole_hz=mirror_pole_hz, Cgd=overlap_f)
    # A mirror pole known to 1 % leaves every verdict within reach.
    spreads = SPREADS | {"mirror_pole_hz": 0.01, "Cgd": 0.2}
    design = Design.from_elements(nominal, spreads=spreads, bench=BENCH, limits=LIMITS)
    part = nominal.with_changes(Rz=EVERY[nulling])
    assert compare(measured(part, 35), design).verdict.nulling is nulling


@pytest.mark.parametrize("resistor_ohm", [0.0, 250.0, 625.0], ids=["no resistor", "right half plane", "infinity"])
def test_a_design_without_lead_is_as_designed_when_built_so(resistor_ohm: float) -> None:
    elements = NOMINAL.with_changes(Rz=resistor_ohm)
    design = Design.from_elements(elements, spreads=SPREADS, bench=BENCH)
    assert design.half_plane is (HalfPlane.INFINITY if resistor_ohm == 625 else HalfPlane.RIGHT)
    assert compare(measured(elements, 36), design).verdict.nulling is Nulling.AS_DESIGNED


LEFT_ROOTS = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=50e6, pole3_hz=700e6, zero_hz=120e6, half_plane=HalfPlane.LEFT)
NO_ZERO = replace(LEFT_ROOTS, zero_hz=None, half_plane=HalfPlane.INFINITY)


@pytest.mark.parametrize(
    ("designed", "built", "nulling"),
    [
        (LEFT_ROOTS, LEFT_ROOTS, Nulling.AS_DESIGNED),
        (LEFT_ROOTS, replace(LEFT_ROOTS, zero_hz=75e6), Nulling.TOO_MUCH),
        (LEFT_ROOTS, replace(LEFT_ROOTS, zero_hz=240e6), Nulling.TOO_LITTLE),
        (LEFT_ROOTS, replace(LEFT_ROOTS, half_plane=HalfPlane.RIGHT), Nulling.WRONG_SIDE),
        (LEFT_ROOTS, NO_ZERO, Nulling.AT_INFINITY),
        (replace(LEFT_ROOTS, pole3_hz=None), replace(LEFT_ROOTS, pole3_hz=None), Nulling.AS_DESIGNED),
        (replace(LEFT_ROOTS, delay_s=1e-9), replace(LEFT_ROOTS, delay_s=1e-9), Nulling.AS_DESIGNED),
        (replace(LEFT_ROOTS, half_plane=HalfPlane.RIGHT),) * 2 + (Nulling.AS_DESIGNED,),
        (NO_ZERO, NO_ZERO, Nulling.AS_DESIGNED),
        (NO_ZERO, LEFT_ROOTS, Nulling.TOO_MUCH),
        (NO_ZERO, replace(LEFT_ROOTS, half_plane=HalfPlane.RIGHT), Nulling.TOO_LITTLE),
    ],
)
def test_designs_given_by_roots(designed: Roots, built: Roots, nulling: Nulling) -> None:
    gain = simulate_bench(built.transfer().evaluate(FREQ_HZ), NOISE, np.random.default_rng(37))
    design = Design.from_roots(designed, bench=Bench(delay_s=0.0))
    assert compare(Sweep(freq_hz=FREQ_HZ, gain=gain), design).verdict.nulling is nulling


def test_a_far_third_pole_is_never_taken_for_the_wrong_side() -> None:
    # gm2·Rz = 1: the zero is gone, and what is left of it is the third pole's lag. Pole 3 lies at 24 times the top of
    # the band, where no residual shows it.
    part = NOMINAL.with_changes(Rz=1 / NOMINAL.gm2)
    freq_hz = np.geomspace(10, 60e6, 121)
    pole3_hz = abs(part.with_changes(CL=part.CL + BENCH.load_f).transfer().poles_hz[2])
    assert pole3_hz > 20 * freq_hz[-1]
    seen = Counter(
        judge_nulling(fit_with_design(measured(part, seed, freq_hz=freq_hz), DESIGN), DESIGN).nulling
        for seed in range(20)
    )
    assert seen[Nulling.WRONG_SIDE] == 0
    assert seen[Nulling.AT_INFINITY] > 10


def test_a_zero_on_pole_2_is_never_taken_for_the_third_poles_zero() -> None:
    # Where the zero covers pole 2 to a fraction of a percent, the sweep is that of a pole 1 and a third pole: it fits
    # a nulled zero just as well, with "pole 2" at 300 MHz. 2683 Ω is where they meet, by bisection on the exact roots.
    rng = np.random.default_rng(40)
    seen: Counter[Nulling] = Counter()
    for seed in range(8):
        part = NOMINAL.with_changes(Rz=2683 * (1 + 0.001 * rng.standard_normal()))
        verdict = judge_nulling(fit_with_design(measured(part, seed), DESIGN), DESIGN)
        seen[verdict.nulling] += 1
    assert set(seen) <= {Nulling.TOO_MUCH, Nulling.UNDECIDED}


def test_a_pole_2_four_times_too_far_out_is_not_believed() -> None:
    fit = fit_with_design(measured(NOMINAL, 30), DESIGN)
    far = Estimate.lognormal(335e6, 0.01, quantile=1.96)
    fit = replace(fit, parameters=replace(fit.parameters, pole2_hz=far))
    verdict = judge_nulling(fit, DESIGN)
    assert verdict.nulling is Nulling.UNDECIDED
    assert "pole 2 shows at 335.0 MHz, designed was 39.90 MHz" in verdict.reason
    assert "repeat the sweep with a known extra load" in verdict.reason
    assert verdict.zero_time_s == verdict.gm2_rz == NOT_KNOWN
    assert advise(verdict, DESIGN, DESIGN.zero_time_s, fit=fit, rows=()).rz_change_ohm == NOT_KNOWN
    found = parasitics(fit, DESIGN)
    assert found is not None
    assert found.load_f == NOT_KNOWN


def test_no_die_of_a_lot_is_put_into_the_wrong_half_plane() -> None:
    # 60 dies, every element off by 6 %, the bench by its spreads; resistor intact, missing, nulling, or 2.2 times.
    rng = np.random.default_rng(39)
    made: dict[str, Counter[Nulling]] = {"intact": Counter(), "missing": Counter(), "null": Counter(), "2.2": Counter()}
    pulls = []
    for seed in range(60):
        die = drawn(rng, dict.fromkeys(SPREADS, 0.06))
        kind = list(made)[seed % 4]
        die = die.with_changes(Rz={"intact": die.Rz, "missing": 0.0, "null": 1 / die.gm2, "2.2": 2.2 * die.Rz}[kind])
        load_f = BENCH.load_f * (1 + BENCH.load_spread * rng.standard_normal())
        delay_s = DELAY_S + BENCH.delay_spread_s * rng.standard_normal()
        verdict = judge_nulling(fit_with_design(measured(die, seed, load_f=load_f, delay_s=delay_s), DESIGN), DESIGN)
        made[kind][verdict.nulling] += 1
        pulls.append(pull(die, verdict.zero_time_s.value, verdict.zero_time_s.stderr))
    assert set(made["intact"]) <= {Nulling.AS_DESIGNED}
    assert set(made["missing"]) == {Nulling.WRONG_SIDE}
    assert set(made["null"]) <= {Nulling.AT_INFINITY, Nulling.UNDECIDED}
    assert set(made["2.2"]) <= {Nulling.TOO_MUCH, Nulling.UNDECIDED}
    # And the errors are as large as stated: 60 pulls have a spread of 1 ± 0.09.
    assert 0.7 < np.std(pulls) < 1.3
    assert np.abs(pulls).max() < 4


def pull(die: Elements, value: float | None, stderr: float | None) -> float:
    """How many standard errors the zero time is off the die's own."""
    assert value is not None
    assert stderr is not None
    return (value - die.zero_time_s) / stderr
