"""Plans: what is chosen, in which order, what is wanted and met, what was taken, refusals."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations, pairwise

import numpy as np
import pytest
from planned_parts import DESIGN, NOMINAL, OWN_SPREADS, added

from fitamp.design import Design, HalfPlane, Roots
from fitamp.elements import ElementEstimate, estimate_elements
from fitamp.errors import UsageError
from fitamp.noise import simulate_bench
from fitamp.planning import (
    DEFAULT_NOISE,
    Criterion,
    Plan,
    PlannedSweep,
    Wanted,
    affordable_sweeps,
    expected_precision,
    plan,
)
from fitamp.planning.campaign import designed_die
from fitamp.sweep import NoiseLevels, Origin, Sweep

LIST = tuple(added(load, rz) for rz in (0.0, -400.0, 500.0) for load in (0.0, 5.0, 20.0))


@pytest.mark.parametrize(
    ("steps", "expected"),
    [
        # Relative standard deviations found while the method was designed, with an independent sketch of the same
        # circuit and bench, where every element is known to 20 % beforehand.
        ([(0, 0)], {"gm1": 0.12, "R1": 0.16, "C1": 0.07, "gm2": 0.13, "R2": 0.16, "CL": 0.12, "Cc": 0.12, "Rz": 0.07}),
        ([(0, 0), (5, 0), (10, 0), (20, 0)], {"CL": 0.002}),
        ([(0, 0), (0, -400), (0, 400)], {"Cc": 0.0005, "gm1": 0.002}),
    ],
)
def test_sets_promise_what_was_found_by_a_sketch(steps: list[tuple[float, float]], expected: dict[str, float]) -> None:
    stage = expected_precision(DESIGN, [added(*step) for step in steps])
    for name, share in expected.items():
        assert stage.of(name).relative == pytest.approx(share, rel=0.15), name  # the sketch's numbers are rounded


def test_loads_and_resistances_together_tell_every_element() -> None:
    steps = [added(load) for load in (0.0, 5.0, 10.0, 20.0)] + [added(0.0, rz) for rz in (-400.0, 400.0)]
    shares = [one.relative for one in expected_precision(DESIGN, steps).elements]
    assert all(share is not None and share < 0.02 for share in shares)
    assert sum(share is not None and share < 0.001 for share in shares) >= 5


@pytest.mark.parametrize("count", [1, 2, 3])
def test_the_choice_is_the_best_of_all_sets(count: int) -> None:
    def volume(sweeps: tuple[PlannedSweep, ...]) -> float:
        die = designed_die(DESIGN, DEFAULT_NOISE)
        return float(np.linalg.slogdet(die.covariance([die.triangle(one) for one in sweeps]))[1])

    chosen = plan(DESIGN, LIST, count=count, plain_first=False)
    assert chosen.is_exhaustive
    assert volume(chosen.sweeps) == pytest.approx(min(volume(sweeps) for sweeps in combinations(LIST, count)), rel=1e-9)
    with_plain = plan(DESIGN, LIST, count=count)
    assert with_plain.sweeps[0].added == "nothing added"
    assert volume(with_plain.sweeps) == pytest.approx(
        min(volume(sweeps) for sweeps in combinations(LIST, count) if LIST[0] in sweeps), rel=1e-9
    )


def test_stages_are_what_the_sweeps_so_far_tell() -> None:
    found = plan(OWN_SPREADS, LIST, count=3, parts_drawn=3)
    assert [len(stage.sweeps) for stage in found.stages] == [0, 1, 2, 3]
    assert found.sweeps == found.last.sweeps == found.stages[3].sweeps
    for stage in found.stages:
        alone = expected_precision(OWN_SPREADS, stage.sweeps)
        assert [one.sd for one in alone.elements] == [one.sd for one in stage.elements]
    assert found.further is not None
    assert found.further.sweeps[:3] == found.sweeps
    assert found.everything.of("gm2").sd < found.further.of("gm2").sd < found.last.of("gm2").sd  # type: ignore[operator]


def test_further_sweeps_never_tell_less_of_anything() -> None:
    stages = plan(OWN_SPREADS, LIST, count=len(LIST)).stages
    for before, after in pairwise(stages):
        for old, new in zip((*before.elements, *before.quantities), (*after.elements, *after.quantities), strict=True):
            if old.sd is not None:
                assert new.sd is not None
                assert new.sd <= old.sd * (1 + 1e-9), new.name


def test_as_few_as_meet_what_is_wanted() -> None:
    found = plan(OWN_SPREADS, LIST, wanted=[Wanted(name="gm2", relative=0.005), Wanted(name="CL", relative=0.03)])
    assert found.criterion is Criterion.WANTED
    assert found.missed == found.out_of_reach == ()
    assert dict(found.wanted) == pytest.approx({"gm2": 0.005 * NOMINAL.gm2, "CL": 0.03 * NOMINAL.CL})
    fewer = len(found.sweeps) - 1
    assert fewer >= 1
    for sweeps in combinations(LIST, fewer):
        stage = expected_precision(OWN_SPREADS, sweeps)
        shares = stage.of("gm2").relative, stage.of("CL").relative
        assert LIST[0] not in sweeps or None in shares or shares[0] > 0.005 or shares[1] > 0.03  # type: ignore[operator]


def test_what_no_sweep_tells_is_said() -> None:
    found = plan(OWN_SPREADS, LIST, wanted=[Wanted(name="CL", relative=0.001), Wanted(name="gm2", relative=0.01)])
    # The bench's load is known to 5 % of 2 pF only.
    assert found.missed == found.out_of_reach == ("CL",)
    assert len(found.sweeps) == 3
    missed = plan(OWN_SPREADS, LIST, count=1, wanted=[Wanted(name="gm2", relative=0.01)])
    assert missed.missed == ("gm2",)
    assert missed.out_of_reach == ()


def test_quantities_can_be_wanted_in_their_unit() -> None:
    found = plan(OWN_SPREADS, LIST, wanted=[Wanted(name="zero_time_s", absolute=2e-12)])
    assert found.last.of("zero_time_s").sd is not None
    assert found.last.of("zero_time_s").sd <= 2e-12  # type: ignore[operator]


def test_the_mean_variance_looks_at_the_worst() -> None:
    by_variance = plan(DESIGN, LIST, count=2, criterion=Criterion.VARIANCE, plain_first=False)

    def mean_variance(sweeps: tuple[PlannedSweep, ...]) -> float:
        shares = [one.relative for one in expected_precision(DESIGN, sweeps).elements]
        return float(np.mean(np.square(np.array(shares, dtype=float))))

    assert mean_variance(by_variance.sweeps) == pytest.approx(
        min(mean_variance(sweeps) for sweeps in combinations(LIST, 2)), rel=1e-9
    )


def test_precision_over_parts_is_worse_than_at_the_centre_and_repeats() -> None:
    first, again, other = (
        plan(OWN_SPREADS, LIST, count=2, parts_drawn=8, seed=seed).last.of("gm2") for seed in (1, 1, 2)
    )
    assert (first.over_parts, first.worst) == (again.over_parts, again.worst)
    assert first.worst != other.worst
    assert first.sd is not None
    assert first.over_parts is not None
    assert first.worst is not None
    assert 0.9 * first.sd < first.over_parts < first.worst < 3 * first.sd
    centre = plan(OWN_SPREADS, LIST, count=2, parts_drawn=0).last.of("gm2")
    assert (centre.sd, centre.over_parts, centre.worst) == (first.sd, None, None)


def test_over_parts_is_the_mean_of_promises_made_at_each() -> None:
    die = designed_die(OWN_SPREADS, DEFAULT_NOISE)
    rng = np.random.default_rng(1)
    shares = []
    for _ in range(5):
        values = die.drawn(rng, least_rz_ohm=400.0).values
        there = replace(OWN_SPREADS, elements=die.circuit.elements(values))
        load_f = die.circuit.physical(values)["bench_load_f"]
        bench = replace(OWN_SPREADS.bench, load_f=load_f, load_spread=OWN_SPREADS.bench.load_spread)
        shares.append(expected_precision(replace(there, bench=bench), [LIST[0], LIST[5]]).of("Cc").relative)
    found = plan(OWN_SPREADS, [LIST[0], LIST[5]], count=2, parts_drawn=5, seed=1).last.of("Cc")
    assert found.over_parts == pytest.approx(
        NOMINAL.Cc * float(np.sqrt(np.mean(np.square(np.array(shares, dtype=float))))), rel=1e-3
    )


def test_noise_that_is_not_stated_is_usual_and_said() -> None:
    assumed = plan(OWN_SPREADS, LIST, count=1)
    assert assumed.noise == DEFAULT_NOISE
    assert assumed.noise.source == "assumed"
    stated = NoiseLevels(error_channel=2e-4, return_channel=2e-4, relative=1e-2)
    noisy, quiet = (plan(DESIGN, LIST, count=4, noise=noise).last.of("gm2").sd for noise in (stated, None))
    assert noisy is not None
    assert quiet is not None
    # Ten times the noise, ten times the error, where sweeps tell all.
    assert noisy / quiet == pytest.approx(10, rel=0.1)


def _estimate(design: Design, sweeps: list[PlannedSweep], *, gm2: float = 1.6e-3) -> ElementEstimate:
    part = NOMINAL.with_changes(gm2=gm2)
    rng = np.random.default_rng(4)
    taken, conditions = [], [sweep.condition for sweep in sweeps]
    for number, sweep in enumerate(sweeps):
        seen = part.with_changes(
            CL=part.CL + design.bench.load_f + sweep.condition.load_added_f, Rz=part.Rz + sweep.condition.rz_added_ohm
        )
        gain = simulate_bench(seen.transfer().evaluate(sweep.freq_hz), DEFAULT_NOISE, rng)
        origin = Origin(file=f"step{number}.csv", form="simulated")
        taken.append(Sweep(freq_hz=sweep.freq_hz, gain=gain, origin=origin))
    return estimate_elements(taken, design, conditions=conditions, noise=DEFAULT_NOISE)


def test_with_sweeps_taken_the_plan_is_for_the_part_that_they_show() -> None:
    have = _estimate(OWN_SPREADS, [added(), added(10.0)], gm2=1.8e-3)
    found = plan(OWN_SPREADS, LIST[1:], count=2, have=have)
    assert found.taken == 2
    assert found.last.of("gm2").value == pytest.approx(1.8e-3, rel=0.02)
    assert found.noise.source == "as in the sweeps taken"
    assert found.noise.relative == pytest.approx(DEFAULT_NOISE.relative)
    # Before any further sweep it is as sure as the estimate says.
    for one in found.stages[0].elements:
        assert one.before == one.sd == pytest.approx(have.element(one.name).estimate.stderr, rel=0.02)
    # And no plain sweep is asked for again.
    assert "nothing added" not in [sweep.added for sweep in found.sweeps]


def test_sweeps_that_contradict_one_another_are_a_caution() -> None:
    have = _estimate(OWN_SPREADS, [added(), added(10.0)])
    assert plan(OWN_SPREADS, LIST[3:4], have=have).cautions == ()
    # The third is of another part.
    other = _estimate(OWN_SPREADS, [added(20.0)], gm2=2.2e-3)
    conditions = [*have.conditions, *other.conditions]
    mixed = estimate_elements(
        [*have.sweeps, *other.sweeps], OWN_SPREADS, conditions=conditions, noise=DEFAULT_NOISE, keep_all=True
    )
    assert any("do not show the same part" in caution for caution in plan(OWN_SPREADS, LIST[3:4], have=mixed).cautions)


def test_sweeps_taken_count_as_much_as_planned_ones() -> None:
    have = _estimate(OWN_SPREADS, [added(), added(10.0)])
    after = plan(OWN_SPREADS, [added(0.0, -400.0)], count=1, have=have).last
    planned = expected_precision(OWN_SPREADS, [added(), added(10.0), added(0.0, -400.0)])
    for one in planned.elements:
        assert after.of(one.name).relative == pytest.approx(one.relative, rel=0.1)
        # What was added to the sweeps taken may be wrong as well.
        assert after.of(one.name).by_loads == pytest.approx(one.by_loads, rel=0.1, abs=0.02 * (one.value or 0.0))


ROOTS = Roots(dc_gain=12000, pole1_hz=1.1e3, pole2_hz=60e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"count": 0}, "0 sweeps cannot be chosen from 9; choose 1 to 9"),
        ({"count": 10}, "10 sweeps cannot be chosen from 9"),
        ({"candidates": []}, "there is no sweep to choose from"),
        ({"candidates": [added(0.0, -2000.0)]}, r"−2 kΩ leaves −700 Ω in series with Cc, less than none"),
        ({"criterion": Criterion.WANTED}, "nothing is wanted"),
        ({"wanted": [Wanted(name="gm3", relative=0.1)]}, "gm3 is not among what a plan knows: gm1, R1"),
        ({"wanted": [Wanted(name="gm2", relative=0.1)] * 2}, "gm2 is wanted twice"),
        ({"wanted": [Wanted(name="rz_change_ohm", relative=0.1)]}, "rz_change_ohm may be 0, .* wanted in Ω"),
        ({"design": Design.from_roots(ROOTS)}, "the design gives roots"),
        ({"design": "mychip.toml"}, "a plan takes a design: read it with read_design"),
        ({"under_test": ["gm9"]}, "no element is named gm9"),
    ],
)
def test_what_does_not_belong_together_is_refused(options: dict[str, object], message: str) -> None:
    arguments: dict[str, object] = {"design": OWN_SPREADS, "candidates": LIST} | options
    with pytest.raises(UsageError, match=message):
        plan(**arguments)  # type: ignore[arg-type]  # arguments that are wrong on purpose


def test_what_is_under_test_is_settled_by_the_estimate() -> None:
    have = _estimate(OWN_SPREADS, [added()])
    with pytest.raises(UsageError, match="settled by the estimate"):
        plan(OWN_SPREADS, LIST, have=have, under_test=["CL"])


def test_a_resistor_that_is_not_there_can_be_planned_for() -> None:
    bare = Design.from_elements(NOMINAL.with_changes(Rz=0.0), spreads=DESIGN.spreads, bench=DESIGN.bench)
    found: Plan = plan(bare, [added(), added(10.0), added(0.0, 400.0)])
    resistor = found.last.of("Rz")
    assert resistor.relative is None
    assert resistor.sd is not None
    assert resistor.sd < 10.0


def test_the_usual_list_is_taken_where_none_is_given() -> None:
    assert plan(OWN_SPREADS).candidates == affordable_sweeps(OWN_SPREADS)
    assert len(plan(replace(OWN_SPREADS)).sweeps) == 3
