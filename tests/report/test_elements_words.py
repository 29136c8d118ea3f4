"""Sentences on estimated elements: what is measured, what was handed back, what moved, and by how much."""

from __future__ import annotations

from dataclasses import replace

import pytest
from estimated_parts import awkward_findings

from fitamp.elements import Condition, EstimatedElement
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.findings import ElementFindings
from fitamp.report.elements_words import (
    added_words,
    blame_sentence,
    element_text,
    from_data_words,
    is_told,
    line_sentence,
    load_sentence,
    moved_sentence,
    parasitic_sentences,
    percent,
    resistor_sentence,
    short_names,
    sweeps_name,
)


def element(informed: float, *, stderr: float = 1e-13, held: bool = False) -> EstimatedElement:
    """A capacitor of 4 pF that was designed with 5 %."""
    estimate = Estimate.gaussian(4.2e-12, stderr, quantile=1.96)
    return EstimatedElement(
        name="CL", unit="F", designed=4e-12, estimate=estimate, informed=informed, spread=0.05, held=held
    )


@pytest.mark.parametrize(
    ("informed", "words"),
    [
        (1.0, "100 %, measured"),
        (0.95, "95 %, measured"),
        (0.8, "80 %, part design"),
        (0.4, "40 %, MOSTLY DESIGN"),
        (0.01, "1 %, DESIGN ONLY"),
    ],
)
def test_what_the_design_handed_back_is_never_called_measured(informed: float, words: str) -> None:
    assert from_data_words(element(informed)) == words
    assert is_told(element(informed)) is (informed >= 0.5)


def test_errors_wider_than_the_designs_tell_nothing() -> None:
    # As after sweeps that contradict one another.
    assert from_data_words(element(0.99, stderr=1e-12)) == "NOT TOLD"
    assert not is_told(element(0.99, stderr=1e-12))
    assert from_data_words(replace(element(1.0), estimate=NOT_KNOWN)) == "NOT TOLD"
    assert element_text(replace(element(1.0), estimate=NOT_KNOWN)) == "undetermined"
    held = replace(element(0.0, held=True), estimate=Estimate(value=4e-12, stderr=None, ci95=(None, None)))
    assert (from_data_words(held), element_text(held), is_told(held)) == ("held, no spread", "4.000 pF", False)


@pytest.mark.parametrize(
    ("deviation", "words"),
    [(-0.16, "−16.0 %"), (0.178, "+17.8 %"), (0.0007, "+0.07 %"), (9.0, "× 10"), (None, "–"), (-1.0, "−100.0 %")],
)
def test_deviations_are_signed_percents_and_large_ones_factors(deviation: float | None, words: str) -> None:
    assert percent(deviation) == words


@pytest.mark.parametrize(
    ("condition", "words"),
    [
        (Condition(), "nothing"),
        (Condition(load_added_f=5e-12), "+5.00 pF"),
        (Condition(rz_added_ohm=-400.0), "−400 Ω"),
        (Condition(load_added_f=1e-12, rz_added_ohm=500.0), "+1.00 pF, +500 Ω"),
    ],
)
def test_what_was_added_is_said_with_its_sign(condition: Condition, words: str) -> None:
    assert added_words(condition) == words


def test_names_lose_the_folder_that_all_share() -> None:
    assert short_names(["run/a.csv", "run/more/b.csv"]) == ("a.csv", "more/b.csv")
    assert short_names(["run/a.csv"]) == ("run/a.csv",)
    assert short_names(["/somewhere/a.csv", "run/b.csv"]) == ("/somewhere/a.csv", "run/b.csv")


def test_the_stepped_example_says_what_is_true_of_it(stepped_example: ElementFindings) -> None:
    # Made with gm2 16 % low, Rz 1080 of 1300 ohms (16.9 % low), and CL 21 % high; all else within its spread.
    sentence = moved_sentence(stepped_example)
    assert sentence.startswith("off by more than their spreads: CL +1")
    assert sentence.endswith(", Rz −16.9 %, gm2 −16.0 %")
    found = [one for one in stepped_example.blame.quantities if one.quantity.value in {"zero_time_s", "pole2_hz"}]
    assert blame_sentence(found) == "the zero was moved by Rz and gm2; pole 2 by gm2 and CL"
    assert [line_sentence(line, stepped_example).rpartition(": ")[2] for line in stepped_example.lines] == [
        "they agree",
        "they agree",
    ]
    load, first_stage = parasitic_sentences(stepped_example)
    assert load.endswith("beyond the designed and the bench's 2.00 pF")
    assert first_stage.startswith("first stage 18.1 ± 1.0 fF")
    assert sweeps_name(stepped_example) == "5 sweeps in part_f_stepped"
    assert load_sentence(stepped_example).startswith("65° are kept up to 8.42")
    assert load_sentence(stepped_example).endswith("pF more than on the bench")
    words = resistor_sentence(stepped_example)
    assert words == "65° are kept with Rz from 587 Ω; Rz = 1.399 kΩ restores the designed zero and gives 71.3°"


def test_a_line_far_from_the_joint_fit_is_said_to_disagree(stepped_example: ElementFindings) -> None:
    line = stepped_example.lines[1]
    other = replace(line, meaning=Estimate.gaussian(2.2e-12, 1e-15, quantile=1.96))
    assert line_sentence(other, stepped_example).endswith("by the joint fit: THEY DISAGREE")
    unknown = line_sentence(replace(line, meaning=NOT_KNOWN), stepped_example)
    assert unknown.startswith("Cc undetermined by the line")
    assert "agree" not in unknown


def test_single_sweeps_name_what_they_do_not_tell() -> None:
    assert moved_sentence(awkward_findings("single")).endswith("; NOT MEASURED, the design's own: R1, R2")
    assert moved_sentence(awkward_findings("shorted")).startswith("off by more than its spread: Rz −100.0 %;")
    without = moved_sentence(awkward_findings("no resistor designed"))
    assert without.startswith("off by more than its spread: Rz 6")
    assert " Ω instead of none; " in without


def test_what_does_not_exist_is_not_promised() -> None:
    nowhere = awkward_findings("no crossover")
    assert load_sentence(nowhere) == "without a crossover there is no phase margin to lose"
    assert resistor_sentence(nowhere).startswith("Rz = 1.3")
    far = awkward_findings("far off")
    assert load_sentence(far).endswith("pF LESS than on the bench")
    assert resistor_sentence(far).startswith("60° are not kept with the part's Rz")
    unasked = replace(far, loads=None, wanted_deg=None)
    assert load_sentence(unasked).startswith("no phase margin is wanted")
    loads = far.loads
    assert loads is not None
    none_keeps = replace(far, loads=replace(loads, keeps=False, low_f=None, high_f=None, room_f=None))
    assert load_sentence(none_keeps) == "no load keeps 60°"
    any_keeps = replace(far, loads=replace(loads, keeps=True, low_f=None, high_f=None, room_f=None))
    assert load_sentence(any_keeps) == "60° are kept with any load"


def test_what_is_within_its_errors_was_not_moved() -> None:
    blamed = awkward_findings("hostile name").blame.quantities
    assert "as designed, within the errors" in blame_sentence(blamed)
