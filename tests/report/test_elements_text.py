"""Text and CSV on estimated elements: verdict first, nothing wider than 100 columns, no name that steers a terminal."""

from __future__ import annotations

import csv
import io
import re

import pytest
from estimated_parts import AWKWARD_PARTS, awkward_findings
from rich.cells import cell_len

from fitamp.findings import ElementFindings
from fitamp.report.elements_text import elements_csv, elements_text


@pytest.mark.parametrize("name", AWKWARD_PARTS)
def test_no_line_is_wider_than_100_columns_and_none_steers(name: str) -> None:
    text = elements_text(awkward_findings(name))
    assert max(cell_len(line) for line in text.splitlines()) <= 100
    assert all(character.isprintable() for character in text.replace("\n", ""))


def test_a_hostile_name_is_shown_and_not_obeyed() -> None:
    text = elements_text(awkward_findings("hostile name"))
    assert r"[red]$x_1$[/red]\x1b[31m\n\u202e:smile:.csv" in text


def test_verdict_advice_and_what_moved_come_first(stepped_example: ElementFindings) -> None:
    text = " ".join(elements_text(stepped_example).split())
    parts = ("TOO-LITTLE: zero time 62", "what to do: raise Rz by 319", "elements: off by more than", "gm2·Rz: 1.45")
    places = [text.index(part) for part in parts]
    assert places == sorted(places)
    assert places[0] == 0


def test_every_number_stands_with_where_it_comes_from(stepped_example: ElementFindings) -> None:
    lines = elements_text(stepped_example).splitlines()
    (gm2,) = [line for line in lines if line.startswith("gm2 ") and "measured" in line]
    assert gm2.split()[:3] == ["gm2", "1.600", "mS"]
    assert "−16.0 %" in gm2
    assert gm2.endswith("100 %, measured")
    (bench,) = [line for line in lines if line.startswith("bench load ") and "DESIGN" in line]
    assert bench.endswith("MOSTLY DESIGN")
    assert sum(line.endswith("the same") for line in lines) == 5
    (pole2,) = [line for line in lines if line.startswith("pole 2 ") and "30.0 … 90.0 MHz" in line]
    assert pole2.endswith(" NO")
    assert any(line.startswith("bench load *") for line in lines)


def test_blame_in_the_table_adds_up(stepped_example: ElementFindings) -> None:
    lines = elements_text(stepped_example).splitlines()
    start = next(index for index, line in enumerate(lines) if line.startswith("what moved it"))
    end = next(index for index, line in enumerate(lines) if line.startswith("in all"))
    # The phase margin's column is the last: a share with its error, or, of all others together, without.
    *shares, whole = (
        float(re.findall(r"([+−]?[0-9.]+)(?: ± [0-9.]+)? °$", line)[0].replace("−", "-"))
        for line in lines[start + 2 : end + 1]
    )
    assert len(shares) > 5
    assert whole == pytest.approx(-8.131, abs=0.01)
    assert sum(shares) == pytest.approx(whole, abs=0.02)


def test_a_part_that_stands_apart_is_named_in_its_row() -> None:
    lines = elements_text(awkward_findings("another part")).splitlines()
    (row,) = [line for line in lines if line.startswith("step3.csv")]
    assert row.endswith("ANOTHER, left out")
    assert any(line.startswith("note (part-changed): step3.csv does not show the same part") for line in lines)
    doubtful = elements_text(awkward_findings("inadequate"))
    assert doubtful.count("perhaps ANOTHER") == 2
    assert doubtful.startswith("UNDECIDED: no verdict can be leaned on")


def test_a_loop_without_crossover_says_none() -> None:
    lines = elements_text(awkward_findings("no crossover")).splitlines()
    (row,) = [line for line in lines if line.startswith("crossover")]
    assert row.split()[:3] == ["crossover", "–", "none"]


def test_the_csv_has_every_number_in_full(stepped_example: ElementFindings) -> None:
    rows = list(csv.DictReader(io.StringIO(elements_csv(stepped_example))))
    estimate = stepped_example.estimate
    assert [row["element"] for row in rows] == [one.name for one in (*estimate.elements, *estimate.bench)]
    for row in rows:
        one = estimate.element(row["element"])
        assert float(row["value"]) == one.estimate.value
        assert float(row["informed"]) == one.informed
    held = list(csv.DictReader(io.StringIO(elements_csv(awkward_findings("shorted")))))
    by_name = {row["element"]: row for row in held}
    assert by_name["bench_load_f"]["held"] == "yes"
    assert (by_name["bench_delay_s"]["designed"], by_name["bench_load_f"]["stderr"]) == ("", "")
