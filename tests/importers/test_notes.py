"""What a file says beside its numbers is kept with the sweep."""

from __future__ import annotations

from pathlib import Path

from bench_tables import cells, file_of, table

from fitamp.importers import read_sweep, read_sweeps
from fitamp.importers.notes import notes_among
from fitamp.importers.text import Line
from fitamp.sweep import Sweep

COLUMNS = ["freq_hz", "re", "im"]


def test_preamble_is_kept_without_header_marks_and_rules(tmp_path: Path) -> None:
    text = "Part; A7\n# drive 10 mV\n=====\n\n" + table(COLUMNS, cells("re im"), separator=";")
    sweep = read_sweep(file_of(tmp_path, text.replace("im\n", "im\n-----\n", 1)))
    assert sweep.origin.notes == ("Part; A7", "drive 10 mV")
    assert Sweep.from_frame(sweep.to_frame()) == sweep


def test_each_table_of_a_file_has_its_own_notes(tmp_path: Path) -> None:
    one = table(COLUMNS, cells("re im"), separator=",")
    first, second = read_sweeps(file_of(tmp_path, f"Run 1\n{one}\nRun 2\n# 27 °C\n{one}"))
    assert (first.origin.notes, second.origin.notes) == (("Run 1",), ("Run 2", "27 °C"))


def test_comments_above_the_data_of_a_touchstone_file(tmp_path: Path) -> None:
    rows = "\n".join(" ".join(row) for row in cells("re im"))
    sweep = read_sweep(
        file_of(tmp_path, f"! board 3\n# Hz S RI R 50 ! options\n!\n! f re im\n{rows}\n! end\n", "a.s1p")
    )
    assert sweep.origin.notes == ("board 3", "f re im")


def test_endless_preambles_are_cut() -> None:
    lines = [Line(number=number, text=f"{number} " + "x" * 300) for number in range(1, 200)]
    notes = notes_among(lines, without=[2])
    assert (len(notes), notes[-1]) == (101, "…")
    assert notes[1].startswith("3 x")
    assert {len(note) for note in notes[:-1]} == {200}
