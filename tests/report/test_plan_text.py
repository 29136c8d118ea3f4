"""Plans as text and tables."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pytest
from planned import all_plans, plan_of, plan_with_everything, plan_with_wishes
from rich.cells import cell_len

from fitamp.elements import read_steps
from fitamp.planning import Plan
from fitamp.report.plan_text import plan_table, plan_text, steps_table
from fitamp.report.plan_words import precision


@pytest.mark.parametrize("plan", all_plans())
def test_no_line_is_wider_than_100_columns_and_nothing_steers_a_terminal(plan: Plan) -> None:
    text = plan_text(plan)
    assert max(cell_len(line) for line in text.splitlines()) <= 100
    assert all(character.isprintable() or character == "\n" for character in text)


def test_the_answer_comes_first_and_every_stage_has_its_row() -> None:
    plan = plan_of()
    text = plan_text(plan)
    assert text.startswith("3 sweeps, nothing added, ")
    rows = [line for line in text.splitlines() if line[:3] in ("1  ", "2  ", "3  ")]
    assert len(rows) == 3
    for row, stage in zip(rows, plan.stages[1:], strict=True):
        cells = " ".join(precision(one, one.sd) for one in stage.elements)
        assert " ".join(row.split()).endswith(cells)
    for words in (
        "by the design alone",
        "over 4 parts",
        "worst of them",
        "next: ",
        "verdict: zero time",
        "advice on Rz",
    ):
        assert words in text


def test_without_draws_there_are_no_parts() -> None:
    text = plan_text(plan_with_wishes())
    assert "worst of them" not in text
    assert "over 0 parts" not in text
    assert "relative 0.001 (assumed)" in text


def test_what_is_not_added_cannot_be_wrong() -> None:
    assert "are +1 %" not in plan_text(plan_of(1))
    assert "if resistances" not in plan_text(plan_of(2, with_resistances=False, parts_drawn=0))


def test_the_csv_has_numbers_in_si_and_empty_cells_for_the_unknown() -> None:
    plan = plan_of()
    rows = list(csv.DictReader(io.StringIO(plan_table(plan))))
    assert [row["sweeps"] for row in rows] == ["0", "1", "2", "3", "4"]
    assert rows[0]["Rz_sd"] == ""
    assert float(rows[3]["gm2_sd"]) == pytest.approx(plan.last.of("gm2").sd, rel=1e-5)
    assert float(rows[2]["load_added_F"]) == plan.sweeps[1].condition.load_added_f


@pytest.mark.parametrize("plan", [plan_of(), plan_with_everything()])
def test_the_steps_file_is_read_back_as_planned(plan: Plan, tmp_path: Path) -> None:
    path = tmp_path / "steps.csv"
    path.write_text(steps_table(plan), encoding="utf-8")
    steps = read_steps(path)
    assert [step.path.name for step in steps] == [f"step{number}.csv" for number in range(1, len(plan.sweeps) + 1)]
    for step, sweep in zip(steps, plan.sweeps, strict=True):
        assert step.condition.load_added_f == pytest.approx(sweep.condition.load_added_f, rel=1e-12)
        assert step.condition.rz_added_ohm == pytest.approx(sweep.condition.rz_added_ohm, rel=1e-12)
        assert sweep.band in step.condition.note
