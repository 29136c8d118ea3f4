"""Verdict, limits and advice from estimated elements, on the stepped example, whose true elements are known."""

from __future__ import annotations

from dataclasses import replace

import pytest

from fitamp.comparison.by_elements import advise_on_elements, element_rows, judge_elements
from fitamp.comparison.result import Advice, Nulling
from fitamp.design import Limit
from fitamp.elements import ElementEstimate, RestoringResistor, blame, restoring_resistor
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.findings import ElementFindings
from fitamp.fitting.result import LABELS

# The example's part, as scripts/make_examples.py makes it, and its design.
GM2, CC, RZ = 0.84 * 1.6e-3, 1.03 * 1.8e-12, 1080.0
DESIGNED_ZERO_S = 1.8e-12 * (1300 - 1 / 1.6e-3)


def with_zero(estimate: ElementEstimate, zero_time: Estimate) -> ElementEstimate:
    """The same with another zero time."""
    return replace(estimate, derived=replace(estimate.derived, zero_time_s=zero_time))


def advised(findings: ElementFindings, estimate: ElementEstimate, restoring: RestoringResistor | None = None) -> Advice:
    """Advice on a changed estimate."""
    return advise_on_elements(
        estimate,
        judge_elements(estimate),
        element_rows(estimate),
        blame=findings.blame,
        restoring=restoring or findings.restoring,
        restored_margin_deg=findings.restored_margin_deg,
    )


def test_the_verdict_is_on_the_true_zero(stepped_example: ElementFindings) -> None:
    verdict = judge_elements(stepped_example.estimate)
    # τz = Cc·(Rz − 1/gm2) by hand: 624 ps, where the limits ask for 1/(2π·200 MHz) = 796 ps at least.
    assert verdict.nulling is Nulling.TOO_LITTLE
    assert verdict.zero_time_s.value == pytest.approx(CC * (RZ - 1 / GM2), abs=4 * (verdict.zero_time_s.stderr or 0.0))
    assert verdict.gm2_rz.value == pytest.approx(GM2 * RZ, abs=4 * (verdict.gm2_rz.stderr or 0.0))
    assert "gives less lead than the window 796 ps to 1.77 ns, from the limits on the zero" in verdict.reason


@pytest.mark.parametrize(
    ("zero_time_s", "stderr_s", "nulling", "words"),
    [
        (1.2e-9, 1e-12, Nulling.AS_DESIGNED, "lies in the window"),
        (3.0e-9, 1e-12, Nulling.TOO_MUCH, "lies beyond the window"),
        (-1.0e-9, 1e-12, Nulling.WRONG_SIDE, "in the other half plane than designed"),
        (0.0, 1e-12, Nulling.AT_INFINITY, "neither helps nor harms"),
        (0.8e-9, 1e-10, Nulling.UNDECIDED, "reaches into too-little, as-designed; sweeps with an added resistance"),
    ],
)
def test_every_region_has_its_verdict(
    stepped_example: ElementFindings, zero_time_s: float, stderr_s: float, nulling: Nulling, words: str
) -> None:
    zero_time = Estimate.gaussian(zero_time_s, stderr_s, quantile=1.96)
    verdict = judge_elements(with_zero(stepped_example.estimate, zero_time))
    assert verdict.nulling is nulling
    assert words in verdict.reason


def test_what_is_not_trusted_gets_no_verdict_and_no_advice(stepped_example: ElementFindings) -> None:
    estimate = stepped_example.estimate
    doubtful = replace(estimate, other_valley=estimate.amplifier)
    verdict = judge_elements(doubtful)
    assert verdict.nulling is Nulling.UNDECIDED
    assert verdict.reason.startswith("no verdict can be leaned on before this is explained: ")
    assert {row.inside for row in element_rows(doubtful)} == {None}
    assert advised(stepped_example, doubtful).sentence == "change nothing yet; first settle what the notes say"
    unknown = judge_elements(with_zero(estimate, NOT_KNOWN))
    assert (unknown.nulling, unknown.reason.partition(";")[0]) == (
        Nulling.UNDECIDED,
        "the sweeps do not determine the zero",
    )


def test_rows_hold_the_exact_circuit_against_the_limits(stepped_example: ElementFindings) -> None:
    rows = {row.quantity: row for row in element_rows(stepped_example.estimate)}
    # 30 MHz is the least that pole 2 may be, and the weak second stage with its pad leaves 28.6 MHz.
    assert rows["pole2_hz"].inside is False
    assert rows["pole2_hz"].measured.value == pytest.approx(28.6e6, rel=2e-3)
    assert rows["zero_time_s"].inside is False
    assert all(rows[name].inside is True for name in ("dc_gain", "crossover_hz", "phase_margin_deg"))
    assert rows["pole1_hz"].inside is None
    assert rows["phase_margin_deg"].deviation == pytest.approx(
        (rows["phase_margin_deg"].measured.value or 0.0) - (rows["phase_margin_deg"].designed or 0.0)
    )
    assert rows["zero_time_s"].designed == pytest.approx(DESIGNED_ZERO_S)


@pytest.mark.parametrize(("limit", "inside"), [(Limit(low=20.0), True), (Limit(high=40.0), False)])
def test_a_phase_that_never_reaches_180_degrees_has_an_unlimited_gain_margin(
    stepped_example: ElementFindings, limit: Limit, inside: bool
) -> None:
    estimate = stepped_example.estimate
    design = replace(estimate.design, limits={**estimate.design.limits, "gain_margin_db": limit})
    (row,) = [row for row in element_rows(replace(estimate, design=design)) if row.quantity == "gain_margin_db"]
    assert row.measured.value is None
    assert row.inside is inside


def test_the_advice_restores_the_designed_zero_of_this_part(stepped_example: ElementFindings) -> None:
    advice = stepped_example.advice
    # Cc·(Rz − 1/gm2) solved for Rz with the part's own Cc and gm2, by hand.
    assert advice.rz_change_ohm.value == pytest.approx(DESIGNED_ZERO_S / CC + 1 / GM2 - RZ, abs=1.5)
    assert advice.sentence.startswith("raise Rz by 319")
    assert "(phase margin then 71." in advice.sentence
    # The true deviations: gm2 16 % low, CL 21 % high.
    moved = "moved there by gm2 (−16.0 %) and most likely by CL (+1"
    assert f"{LABELS['pole2_hz']} is outside its limits, {moved}" in advice.sentence


def test_a_zero_at_its_place_does_not_hide_another_broken_limit(stepped_example: ElementFindings) -> None:
    right = with_zero(stepped_example.estimate, Estimate.gaussian(DESIGNED_ZERO_S, 1e-13, quantile=1.96))
    sentence = advised(stepped_example, right).sentence
    assert sentence.startswith("Rz needs no change, but pole 2 is outside its limits")
    unlimited = replace(right, design=replace(right.design, limits={}))
    assert advised(stepped_example, unlimited).sentence.startswith("nothing has to change; the exact nominal place")


def test_where_no_resistor_helps_that_is_said(stepped_example: ElementFindings) -> None:
    found = stepped_example.restoring
    impossible = replace(found, rz_ohm=Estimate.gaussian(-50.0, 1.0, quantile=1.96))
    assert advised(stepped_example, stepped_example.estimate, impossible).sentence.startswith("no resistor puts this")


def test_blame_and_resistor_are_those_of_the_estimate(stepped_example: ElementFindings) -> None:
    assert restoring_resistor(stepped_example.estimate) == stepped_example.restoring
    ours = stepped_example.blame.quantities
    assert [one.contributions for one in blame(stepped_example.estimate).quantities] == [
        one.contributions for one in ours
    ]
