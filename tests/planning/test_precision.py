"""Standard deviations of elements and quantities: derivatives against differences, errors against an estimate's own."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from planned_parts import DESIGN, NOMINAL, OWN_SPREADS, added

from fitamp.amplifier import Elements
from fitamp.design import Design
from fitamp.elements import Condition, estimate_elements
from fitamp.margins import margins
from fitamp.noise import simulate_bench
from fitamp.planning import DEFAULT_NOISE, expected_precision
from fitamp.planning.campaign import Die, designed_die
from fitamp.planning.precision import QUANTITIES, measures, standard_deviations
from fitamp.sweep import Origin, Sweep

WITH_ALL = Design.from_elements(
    replace(NOMINAL, Cgd=20e-15, mirror_pole_hz=400e6), spreads=OWN_SPREADS.spreads, bench=OWN_SPREADS.bench
)


def _by_definition(die: Die, design: Design, name: str) -> float:
    """A quantity of a part, by the exact transfer function and the textbook's formulas."""
    part: Elements = die.circuit.loaded(die.values)
    seen = margins(part.transfer())
    without_mirror = replace(part, mirror_pole_hz=None).transfer()
    poles = sorted(abs(pole) for pole in without_mirror.poles_hz)
    zero_time_s = part.Cc * (part.Rz - 1 / part.gm2) - part.Cgd / part.gm2
    assert seen.crossover_hz is not None
    assert seen.phase_margin_deg is not None
    found = {
        "zero_time_s": zero_time_s,
        "gm2_rz": part.gm2 * part.Rz,
        "pole2_hz": poles[1],
        "gain_bandwidth_hz": without_mirror.dc_gain * poles[0],
        "crossover_hz": seen.crossover_hz,
        "phase_margin_deg": seen.phase_margin_deg,
        "load_parasitic_f": die.circuit.physical(die.values)["CL"] - NOMINAL.CL,
        # Rz + x with the designed zero time: Cc·(Rz + x − 1/gm2) − Cgd/gm2.
        "rz_change_ohm": (design.zero_time_s + part.Cgd / part.gm2) / part.Cc + 1 / part.gm2 - part.Rz,
    }
    return found[name]


@pytest.mark.parametrize("design", [OWN_SPREADS, WITH_ALL])
def test_derivatives_of_quantities_are_those_of_differences(design: Design) -> None:
    die = designed_die(design, DEFAULT_NOISE)
    # Not at the centre, where the advice is 0.
    die = replace(die, values=die.values + 0.03 * np.cos(np.arange(len(die.values))))
    for row in measures(die, design):
        if row.name not in QUANTITIES:
            continue
        assert row.value == pytest.approx(_by_definition(die, design, row.name), rel=1e-9)
        for index in range(len(die.values)):
            step = np.zeros(len(die.values))
            step[index] = 1e-5
            ends = [_by_definition(replace(die, values=die.values + sign * step), design, row.name) for sign in (1, -1)]
            assert row.slopes[index] == pytest.approx((ends[0] - ends[1]) / 2e-5, rel=1e-4, abs=1e-5 * row.scale)


def test_promises_are_the_errors_that_an_estimate_gives_itself() -> None:
    sweeps = [added(), added(10.0), added(0.0, -400.0), added(20.0, 500.0)]
    circuit = designed_die(OWN_SPREADS, DEFAULT_NOISE).circuit
    rng = np.random.default_rng(8)
    taken = []
    for number, sweep in enumerate(sweeps):
        gain = circuit.loaded(circuit.designed, sweep.condition).transfer().evaluate(sweep.freq_hz)
        taken.append(
            Sweep(
                freq_hz=sweep.freq_hz,
                gain=simulate_bench(gain, DEFAULT_NOISE, rng),
                origin=Origin(file=f"step{number}.csv", form="simulated"),
            )
        )
    conditions = [sweep.condition for sweep in sweeps]
    estimate = estimate_elements(taken, OWN_SPREADS, conditions=conditions, noise=DEFAULT_NOISE)
    stage = expected_precision(OWN_SPREADS, sweeps)
    stderrs = {one.name: one.estimate.stderr for one in (*estimate.elements, *estimate.bench)}
    derived = dict(estimate.derived.items())
    stderrs |= {name: derived[name].stderr for name in QUANTITIES if name in derived}
    stderrs["load_parasitic_f"] = estimate.parasitics.load_f.stderr
    for name, stderr in stderrs.items():
        # The estimate stands a few standard errors off, and weighs with what was measured.
        assert stage.of(name).sd == pytest.approx(stderr, rel=0.03), name


@pytest.mark.parametrize("wrong", ["loads", "resistances"])
def test_wrong_additions_shift_an_estimate_as_promised(wrong: str) -> None:
    sweeps = [added(), added(10.0), added(0.0, -400.0), added(20.0, 500.0)]
    circuit = designed_die(OWN_SPREADS, DEFAULT_NOISE).circuit
    taken = []
    for sweep in sweeps:
        # Truly 0.1 % more than stated; no noise, so that nothing else shifts.
        load_f = sweep.condition.load_added_f * (1.001 if wrong == "loads" else 1.0)
        rz_ohm = sweep.condition.rz_added_ohm * (1.001 if wrong == "resistances" else 1.0)
        part = circuit.loaded(circuit.designed, Condition(load_added_f=load_f, rz_added_ohm=rz_ohm))
        taken.append(Sweep(freq_hz=sweep.freq_hz, gain=part.transfer().evaluate(sweep.freq_hz)))
    conditions = [sweep.condition for sweep in sweeps]
    estimate = estimate_elements(taken, OWN_SPREADS, conditions=conditions, noise=DEFAULT_NOISE)
    stage = expected_precision(OWN_SPREADS, sweeps)
    for name in ("gm1", "C1", "gm2", "Cc", "Rz"):
        one, found = stage.of(name), estimate.element(name).estimate.value
        by = one.by_loads if wrong == "loads" else one.by_resistances
        assert one.value is not None
        assert found is not None
        assert by is not None
        assert (found / one.value - 1) / 1e-3 == pytest.approx(by / one.value, rel=0.03, abs=0.01), name


def test_nothing_added_cannot_be_wrong() -> None:
    stage = expected_precision(OWN_SPREADS, [added()])
    assert {(one.by_loads, one.by_resistances) for one in stage.elements} == {(0.0, 0.0)}
    held = Design.from_elements(
        NOMINAL, spreads={**OWN_SPREADS.spreads, "CL": 0.0, "Rz": 0.0}, under_test=(), bench=DESIGN.bench
    )
    gm2 = expected_precision(held, [added(10.0, 500.0)]).of("gm2")
    assert (gm2.by_loads, gm2.by_resistances) == (None, None)


def test_what_is_under_test_is_unknown_until_it_is_seen() -> None:
    nothing, one = (expected_precision(OWN_SPREADS, sweeps) for sweeps in ([], [added()]))
    assert nothing.of("Rz").sd is None
    assert nothing.of("gm2").relative == pytest.approx(0.08)
    assert nothing.of("zero_time_s").sd is None
    assert nothing.of("rz_change_ohm").sd is None
    assert nothing.of("load_parasitic_f").sd is None
    assert nothing.of("bench_delay_s").sd is None
    for name in ("Rz", "zero_time_s", "rz_change_ohm", "load_parasitic_f", "bench_delay_s"):
        assert one.of(name).sd is not None


def test_over_parts_the_zero_time_has_the_spread_that_its_elements_give_it() -> None:
    # τz = Cc·(Rz − 1/gm2), to first order in quadrature: 1.215 ns·6 %, 1.8 pF·1300 Ω·12 % and 1.8 pF/1.6 mS·8 %.
    before = expected_precision(OWN_SPREADS, []).of("zero_time_s").before
    assert before == pytest.approx(np.hypot(np.hypot(1.215e-9 * 0.06, 1.8e-12 * 156), 1.8e-12 * 50), rel=1e-9)


def test_what_is_held_is_certain() -> None:
    held = Design.from_elements(NOMINAL, spreads={**OWN_SPREADS.spreads, "CL": 0.0}, bench=DESIGN.bench)
    stage = expected_precision(held, [added()])
    load = stage.of("CL")
    assert (load.sd, load.informed) == (0.0, 0.0)
    assert stage.of("load_parasitic_f").sd is None


def test_a_loop_without_crossover_has_no_margin_to_know() -> None:
    quiet = Design.from_elements(NOMINAL.with_changes(gm1=1e-9), spreads=DESIGN.spreads, bench=DESIGN.bench)
    stage = expected_precision(quiet, [added()])
    assert stage.of("phase_margin_deg").value is None
    assert stage.of("phase_margin_deg").sd is None
    assert stage.of("pole2_hz").sd is not None


def test_the_prior_of_the_very_element_plays_no_part_in_its_parasitic() -> None:
    tight = Design.from_elements(NOMINAL, spreads={**DESIGN.spreads, "CL": 1e-6}, under_test=(), bench=DESIGN.bench)
    die = designed_die(tight, DEFAULT_NOISE)
    rows = measures(die, tight)
    sds, _ = standard_deviations(rows, die, [die.triangle(added())])
    by_name = dict(zip([row.name for row in rows], sds, strict=True))
    assert by_name["CL"] == pytest.approx(4e-18, rel=1e-3)
    assert by_name["load_parasitic_f"] is not None
    assert by_name["load_parasitic_f"] > 1e-13
