"""Plans in sentences."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest
from planned import DESIGN, plan_of, plan_with_everything, plan_with_wishes

from fitamp.planning import Expected
from fitamp.report.plan_words import (
    NO_ELEMENT,
    adding_sentences,
    and_list,
    limit_sentences,
    notes,
    precision,
    shift,
    summary,
    verdict_sentence,
    way_sentence,
)
from fitamp.sweep import NoiseLevels


@pytest.mark.parametrize(
    ("share", "words"),
    [(0.0053, "0.53 %"), (0.05, "5.0 %"), (0.123, "12 %"), (0.0996, "10 %"), (1.5, "150 %"), (3e-5, "0.0030 %")],
)
def test_shares_have_two_digits(share: float, words: str) -> None:
    assert precision(Expected(name="gm2", unit="S", value=2e-3, sd=share * 2e-3, before=None), share * 2e-3) == words


def test_what_may_be_zero_has_its_unit() -> None:
    def one(name: str, unit: str, value: float) -> Expected:
        return Expected(name=name, unit=unit, value=value, sd=None, before=None)

    assert precision(one("Rz", "Ω", 0.0), 12.3) == "12 Ω"
    assert precision(one("load_parasitic_f", "F", 1e-13), 1e-13) == "100 fF"
    assert precision(one("phase_margin_deg", "deg", 60.0), 0.25) == "0.25 °"
    assert precision(one("gm2", "S", 1e-3), None) == "–"


def test_wrong_additions_have_a_sign() -> None:
    one = Expected(name="gm2", unit="S", value=2e-3, sd=1e-6, before=None)
    assert shift(one, 2e-3) == "+1.0 %"
    assert shift(one, -1e-3) == "−0.50 %"
    assert shift(one, None) == "–"


def test_lists_read_as_people_write_them() -> None:
    assert and_list(["a"]) == "a"
    assert and_list(["a", "b"]) == "a and b"
    assert and_list(["a", "b", "c"]) == "a, b and c"


def test_the_summary_says_sweeps_band_and_what_they_fix() -> None:
    words = summary(plan_of())
    assert words.startswith("3 sweeps, nothing added, ")
    assert ", 1 kHz to 200 MHz in 281 points, will fix " in words
    assert re.search(r"gm2 to 0\.0\d\d %", words)
    loads_alone = summary(plan_of(2, with_resistances=False, parts_drawn=0))
    assert loads_alone.startswith("2 sweeps, nothing added and +20 pF, 1 kHz")
    # Loads alone do not tell Cc from gm1: only their ratio shows, by which the gain crosses.
    assert re.search(r"and tell little of gm1 \d\.\d % and Cc \d\.\d %$", loads_alone)
    assert summary(plan_of(1)).startswith("one sweep, nothing added, 1 kHz")
    assert summary(replace(plan_of(1), taken=2)).startswith("one more sweep, nothing added")
    assert summary(replace(plan_of(), taken=2)).startswith("3 more sweeps, ")


def test_the_summary_of_wishes_is_about_them() -> None:
    words = summary(plan_with_wishes())
    assert ", 16 averages each, will fix gm2 to " in words
    assert re.search(r"Cc to .* % and load parasitic to .* fF$", words)


def test_bands_are_said_where_they_differ() -> None:
    plan = plan_with_everything()
    words = summary(plan)
    bands = {sweep.band for sweep in plan.sweeps}
    assert all(band in words for band in bands)


def test_each_further_sweep_has_its_sentence() -> None:
    second, third, left = adding_sentences(plan_of())
    assert second.startswith("the second, ")
    # From 3.4 % by the design and one sweep; both ends of the step are in the table as well.
    plan = plan_of()
    before, after = plan.stages[1].of("gm2"), plan.stages[2].of("gm2")
    assert f"gm2 from {precision(before, before.sd)} to {precision(after, after.sd)}" in second
    assert third.startswith("the third, ")
    assert re.match(r"the best of those left, .*, would (bring|add little)", left)
    many = list(adding_sentences(plan_of(9)))
    assert not any(words.startswith("the best of those left") for words in many)
    # What adds little is said once.
    assert many[-1].endswith(" and the ninth, " + plan_of(9).sweeps[-1].added + " add little: " + NO_ELEMENT)
    assert sum(words.count("little") for words in many) == 1


def test_the_verdict_is_decided_or_not() -> None:
    words = verdict_sentence(plan_of())
    assert re.match(r"zero time 1\.2150 ± 0\.000\d ns, \d+ σ inside as-designed: decided; 0\.\d+ % of parts", words)
    plan = plan_of()
    outlook = replace(plan.last.outlook, edge_sigma=1.5, undecided_share=0.3)
    doubtful = replace(plan, stages=(*plan.stages[:-1], replace(plan.last, outlook=outlook)))
    assert "1.5 σ inside as-designed: NOT decided; 30 % of parts" in verdict_sentence(doubtful)
    unknown = replace(outlook, edge_sigma=None, undecided_share=None)
    nothing = replace(plan, stages=(*plan.stages[:-1], replace(plan.last, outlook=unknown)))
    assert verdict_sentence(nothing) == "the zero time stays unknown, and with it the verdict"


def test_limits_are_named_with_their_distance() -> None:
    (margin,) = limit_sentences(plan_of())
    assert re.match(r"phase margin 76\.9\d+ ± 0\.00\d+ °, over 999 σ inside its limits: decided", margin)


def test_the_way_says_for_whom_and_by_what() -> None:
    words = way_sentence(plan_of())
    assert words.startswith("for a part at the design's centre; 3 of 9 sweeps, chosen for the smallest joint interval")
    assert "D-optimal" in words
    assert words.endswith("all sets of that size were looked at")
    assert "for what is wanted" in way_sentence(plan_with_wishes())
    assert "exchanges" in way_sentence(replace(plan_of(), is_exhaustive=False))
    assert way_sentence(replace(plan_of(), taken=1)).startswith("for the part as the sweeps taken show it")


def test_notes_say_what_the_numbers_rest_on() -> None:
    found = list(notes(plan_of()))
    for part in (
        "noise levels are usual ones, assumed",
        "a spread of 20 % is assumed for Rz",
        "what is added counts as exact",
        "the bench's load, 2.00 ± 0.09 pF",
        "the bench's delay is not stated",
    ):
        assert sum(part in note for note in found) == 1, part
    assert not any("--resistances" in note for note in found)
    assert any("--resistances" in note for note in notes(plan_of(2, with_resistances=False, parts_drawn=0)))
    given = replace(plan_of(), noise=NoiseLevels(error_channel=1e-5, return_channel=1e-5, relative=1e-3))
    assert not any("assumed; state" in note for note in notes(given))


def test_an_estimate_that_cannot_be_leaned_on_is_said_first() -> None:
    doubtful = replace(plan_of(), taken=2, cautions=("step2.csv does not show the same part", "and more"))
    first, *others = notes(doubtful)
    assert first.endswith("the plan leans on them: step2.csv does not show the same part")
    assert not any("and more" in note for note in others)


def test_wishes_that_are_missed_come_first() -> None:
    assert DESIGN.elements is not None
    first, second = list(notes(plan_with_wishes()))[:2]
    assert re.match(r"Cc is wanted to 0\.010 %, but these sweeps give 0\.0\d+ %", first)
    assert re.match(r"load parasitic is wanted to 1\.0 fF, but all 9 sweeps together give \d+ fF", second)
