"""Verdict, advice and parasitics of a comparison that rests on the circuit, and what is said of the route."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, DELAY_S, DESIGN, NOMINAL, SPREADS, drawn, measured, noise_free

from fitamp.comparison import Comparison, Nulling, Route, compare
from fitamp.comparison.by_circuit import advise_by_circuit, judge_circuit, parasitics_by_circuit
from fitamp.comparison.circuit_zero import CircuitZero, zero_by_circuit
from fitamp.comparison.expectation import fit_with_design
from fitamp.design import Design, HalfPlane, Limit, Roots
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.fitting import WarningCode
from fitamp.report.as_json import comparison_as_dict
from fitamp.report.tables import comparison_text
from fitamp.sweep import Sweep

LIMITED = replace(DESIGN, limits={"zero_hz": Limit(low=90e6, high=200e6)})


@pytest.fixture(scope="module")
def healthy() -> Comparison:
    return compare(measured(NOMINAL, 81), LIMITED)


def found_in(sweep: Sweep, design: Design = LIMITED) -> CircuitZero:
    """The circuit's answer to a sweep."""
    found = zero_by_circuit(fit_with_design(sweep, design), design)
    assert isinstance(found, CircuitZero)
    return found


def notes_on_route(comparison: Comparison) -> list[str]:
    """What is said of the circuit that was set aside."""
    return [note.message for note in comparison.notes if note.code is WarningCode.CIRCUIT_SET_ASIDE]


def test_all_of_a_comparison_that_rests_on_the_circuit_is_from_it(healthy: Comparison) -> None:
    verdict = healthy.verdict
    assert verdict.route is Route.CIRCUIT
    assert healthy.elements is not None
    assert verdict.reason.startswith("by the circuit, zero time 1.2")
    assert healthy.row("zero_time_s").measured == verdict.zero_time_s
    # The circuit is exact, so that it measures the designed zero, 1.215 ns, as designed.
    assert healthy.row("zero_time_s").designed_as_measured == pytest.approx(1.215e-9)
    assert healthy.row("zero_time_s").inside is True
    assert notes_on_route(healthy) == []
    assert healthy.is_described


def test_the_route_is_in_text_and_json(healthy: Comparison) -> None:
    assert comparison_as_dict(healthy)["verdict"]["route"] == "circuit"
    assert "route: circuit; zero time and verdict rest on the elements of the exact circuit" in comparison_text(healthy)
    assert "route    circuit: " in str(healthy)


def test_a_design_by_roots_has_one_route_and_nothing_to_say_of_it() -> None:
    roots = Roots(dc_gain=12e3, pole1_hz=1.09e3, pole2_hz=39.9e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)
    comparison = compare(noise_free(NOMINAL.with_changes(C1=1e-16)), Design.from_roots(roots))
    assert comparison.verdict.route is Route.BEHAVIOUR
    assert comparison.elements is None
    assert notes_on_route(comparison) == []
    assert "route:" not in comparison_text(comparison)


def test_a_circuit_in_doubt_is_set_aside_with_one_note() -> None:
    freq_hz = np.geomspace(10, 200e6, 281)
    s = 1j * freq_hz / 30e6
    gain = measured(NOMINAL, 82, freq_hz=freq_hz).gain * (1 + s / 20.4 + (s / 1.02) ** 2) / (1 + s / 20 + s**2)
    comparison = compare(Sweep(freq_hz=freq_hz, gain=gain), LIMITED)
    assert comparison.verdict.route is Route.BEHAVIOUR
    assert comparison.verdict.nulling is Nulling.AS_DESIGNED
    assert comparison.verdict.reason.startswith("zero time 1.2")
    assert comparison.elements is not None
    (note,) = notes_on_route(comparison)
    assert note.startswith(
        "zero time and verdict rest on two poles and a zero, with the third pole as the design expects"
    )
    assert "not on the circuit's elements: what is there beside the amplifier" in note
    assert comparison_as_dict(comparison)["verdict"]["route"] == "behaviour"


def test_two_sets_of_elements_leave_the_verdict_open_where_their_zeros_do(monkeypatch: pytest.MonkeyPatch) -> None:
    # Two poles and a zero know nothing of the other set: alone they would decide.
    genuine = zero_by_circuit

    def split(*args: object) -> CircuitZero:
        found = genuine(*args)  # type: ignore[arg-type]  # passed through as given
        assert isinstance(found, CircuitZero)
        other = replace(found.estimate, other_valley=NOMINAL.with_changes(Rz=200.0))
        return replace(found, estimate=other, doubt="two sets of elements describe the sweep equally well")

    monkeypatch.setattr("fitamp.comparison.zero_by_circuit", split)
    comparison = compare(measured(NOMINAL, 81), LIMITED)
    assert comparison.verdict.route is Route.BEHAVIOUR
    assert comparison.verdict.nulling is Nulling.UNDECIDED
    # 1.8 pF·(200 Ω − 625 Ω) = −765 ps, by hand.
    low, high = comparison.verdict.zero_time_s.ci95
    assert low == pytest.approx(-765e-12, abs=20e-12)
    assert high == pytest.approx(1215e-12, abs=20e-12)
    assert comparison.row("zero_time_s").inside is None


def test_no_circuit_at_all_leaves_the_comparison_as_it_was(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fitamp.comparison.zero_by_circuit", lambda *_: "no circuit could be fitted: why")
    comparison = compare(measured(NOMINAL, 81), LIMITED)
    assert comparison.elements is None
    assert comparison.verdict.nulling is Nulling.AS_DESIGNED
    assert notes_on_route(comparison)[0].endswith("not on the circuit's elements: no circuit could be fitted: why")


def test_what_the_circuit_describes_is_described_though_two_poles_and_a_zero_do_not() -> None:
    # A mirror a third off its designed place, in the band.
    nominal = NOMINAL.with_changes(mirror_pole_hz=300e6)
    design = Design.from_elements(
        nominal, spreads=SPREADS | {"mirror_pole_hz": 0.2}, bench=BENCH, limits=LIMITED.limits
    )
    part = nominal.with_changes(mirror_pole_hz=200e6, Rz=0.0)
    comparison = compare(measured(part, 83), design)
    assert not comparison.fit.adequacy.adequate
    assert comparison.is_described
    assert comparison.verdict.route is Route.CIRCUIT
    assert comparison.verdict.nulling is Nulling.WRONG_SIDE
    assert comparison.row("zero_time_s").inside is False
    assert comparison.row("pole2_hz").inside is None


@pytest.mark.parametrize(
    ("low_ns", "high_ns", "nulling"),
    [
        (-1.2, -1.0, Nulling.WRONG_SIDE),
        (-0.1, 0.1, Nulling.AT_INFINITY),
        (0.3, 0.5, Nulling.TOO_LITTLE),
        (1.0, 1.3, Nulling.AS_DESIGNED),
        (2.0, 3.0, Nulling.TOO_MUCH),
        (0.7, 0.9, Nulling.UNDECIDED),
    ],
)
def test_the_verdict_is_on_the_circuits_interval(low_ns: float, high_ns: float, nulling: Nulling) -> None:
    # The limits 90 and 200 MHz are 1.768 and 0.796 ns; what counts as none is 0.1125 ns.
    sweep = measured(NOMINAL, 81)
    zero_time = Estimate(
        value=(low_ns + high_ns) / 2 * 1e-9,
        stderr=(high_ns - low_ns) / 3.92 * 1e-9,
        ci95=(low_ns * 1e-9, high_ns * 1e-9),
    )
    verdict = judge_circuit(replace(found_in(sweep), zero_time_s=zero_time), fit_with_design(sweep, LIMITED), LIMITED)
    assert verdict.nulling is nulling
    assert verdict.reason.startswith("by the circuit, ")
    assert ("reaches into too-little, as-designed" in verdict.reason) == (nulling is Nulling.UNDECIDED)


def test_no_resistor_helps_a_part_whose_zero_is_too_far_out_without_one() -> None:
    # Designed with 290 Ω, −603 ps; the part's gm2 of 4 mS gives −450 ps without any resistor.
    limits = {"zero_hz": Limit(low=230e6, high=300e6)}
    nominal = NOMINAL.with_changes(Rz=290.0)
    design = Design.from_elements(nominal, spreads=SPREADS | {"gm2": 0.5}, bench=BENCH, limits=limits)
    comparison = compare(measured(NOMINAL.with_changes(Rz=60.0, gm2=4e-3), 84), design)
    assert comparison.verdict.route is Route.CIRCUIT
    assert comparison.advice.rz_change_ohm.value == pytest.approx(-145, abs=15)
    assert comparison.advice.sentence.startswith("no resistor puts this part's zero at the designed place")


def test_other_broken_limits_are_named_beside_the_advice() -> None:
    limits = {**LIMITED.limits, "crossover_hz": Limit(low=30e6)}
    comparison = compare(measured(NOMINAL.with_changes(Rz=0.0), 85), replace(DESIGN, limits=limits))
    assert comparison.advice.sentence.startswith("raise Rz by 1.")
    assert comparison.advice.sentence.endswith("; crossover is outside the limits")


def test_an_unknown_change_advises_nothing() -> None:
    found = replace(found_in(measured(NOMINAL, 81)), rz_change_ohm=NOT_KNOWN)
    verdict = judge_circuit(found, fit_with_design(measured(NOMINAL, 81), LIMITED), LIMITED)
    advice = advise_by_circuit(found, verdict, ())
    assert advice.rz_change_ohm == NOT_KNOWN
    assert advice.sentence.startswith("no change of Rz can be advised; ")


def test_parasitics_cover_the_truth_on_dies() -> None:
    rng = np.random.default_rng(86)
    others = {name: spread for name, spread in SPREADS.items() if name not in ("CL", "C1")}
    loads, stages = 0, 0
    for seed in range(16):
        die = drawn(rng, others).with_changes(CL=5.5e-12, C1=240e-15)
        load_f = BENCH.load_f * (1 + BENCH.load_spread * rng.standard_normal())
        delay_s = DELAY_S + BENCH.delay_spread_s * rng.standard_normal()
        sweep = measured(die, seed, load_f=load_f, delay_s=delay_s, freq_hz=np.geomspace(10, 500e6, 141))
        found = parasitics_by_circuit(found_in(sweep), LIMITED)
        assert found is not None
        loads += _holds(found.load_f, 1.5e-12)
        stages += _holds(found.first_stage_f, 40e-15)
        assert "beyond the designed C1" in found.sentence
    # 14 or more of 16 hold in 96 of 100 such draws.
    assert loads >= 14
    assert stages >= 14


def _holds(estimate: Estimate, truth: float) -> bool:
    low, high = estimate.ci95
    assert low is not None
    assert high is not None
    return low <= truth <= high


def test_the_first_stage_is_told_only_where_the_sweep_tells_it() -> None:
    found = parasitics_by_circuit(found_in(measured(NOMINAL, 87, freq_hz=np.geomspace(10, 40e6, 121))), LIMITED)
    assert found is not None
    assert found.first_stage_f == NOT_KNOWN
    assert "third pole" not in found.sentence


def test_a_load_that_is_exact_by_the_design_is_told_by_pole_2() -> None:
    exact = Design.from_elements(NOMINAL, spreads=SPREADS | {"CL": 0.0}, bench=replace(BENCH, load_spread=0.0))
    assert parasitics_by_circuit(found_in(measured(NOMINAL, 88), exact), exact) is None
    comparison = compare(measured(NOMINAL, 88), exact)
    assert comparison.parasitic is not None
    assert comparison.parasitic.load_f.value is not None


def test_a_product_that_no_resistor_gives_with_the_designed_elements_is_noted() -> None:
    # Cc 50 % above its design without a resistor: −1.69 ns is gm2·Rz = −0.5 by the designed Cc/gm2 = 1.125 ns.
    part = NOMINAL.with_changes(Rz=0.0, Cc=1.5 * NOMINAL.Cc)
    comparison = compare(measured(part, 89), LIMITED)
    (message,) = [note.message for note in comparison.notes if note.code is WarningCode.PRODUCT_NEGATIVE]
    assert message.startswith("with gm2 and Cc as designed, gm2·Rz would be −0.5")
    assert comparison.verdict.route is Route.CIRCUIT
    assert "cannot be trusted" not in message
    assert comparison.verdict.gm2_rz.ci95[0] == 0.0
