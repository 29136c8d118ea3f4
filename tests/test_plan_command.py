"""`fitamp plan` from the command line: what is printed and written, what is taken from sweeps, one line of error."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from fitamp.cli import main
from fitamp.elements import read_steps

ROOT = Path(__file__).resolve().parent.parent
DESIGN = ROOT / "data_examples" / "line_buffer.toml"
PART_A = ROOT / "data_examples" / "part_a_healthy.csv"
STEPS = ROOT / "data_examples" / "part_f_stepped" / "steps.csv"
LIST = ("--loads", "0, 5 pF, 10 pF", "--resistances", "0, 500 Ohm, -400 Ohm", "--band", "1 kHz", "200 MHz")

Captured = pytest.CaptureFixture[str]


def called(capsys: Captured, *arguments: str | Path) -> tuple[int, str, str]:
    """Exit code, standard output and standard error of `fitamp plan`."""
    code = main(["plan", "--design", str(DESIGN), *map(str, arguments)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def test_the_answer_is_a_sentence(capsys: Captured) -> None:
    code, out, err = called(capsys, *LIST, "--sweeps", "2")
    assert (code, err) == (0, "")
    assert out.startswith("2 sweeps, nothing added and +10 pF with ")
    assert "1 kHz to 200 MHz in 281 points, will" in " ".join(out.split())
    assert "noise levels are usual ones, assumed" in out


def test_what_is_listed_reaches_the_plan(capsys: Captured) -> None:
    options = ("--points", "101", "--averages", "4", "--noise", "error=1e-5 return=2e-5 relative=5e-4", "--parts", "2")
    code, out, _ = called(capsys, *LIST, *options, "--band", "10 Hz", "1 GHz", "--sweeps", "1", "--json", "-")
    record = json.loads(out)
    assert code == 0
    assert record["schema"] == "fitamp/plan/1"
    candidates = record["choice"]["candidates"]
    assert len(candidates) == 18
    assert {(one["points"], one["averages"]) for one in candidates} == {(101, 4)}
    assert {one["f_max_hz"] for one in candidates} == {200e6, 1e9}
    assert {one["load_added_f"] for one in candidates} == {0.0, 5e-12, 10e-12}
    assert {one["rz_added_ohm"] for one in candidates} == {0.0, 500.0, -400.0}
    assert record["noise"]["relative"] == 5e-4
    assert record["noise"]["source"] == "given"
    assert record["parts_drawn"] == 2


def test_as_few_sweeps_as_meet_the_wishes(capsys: Captured) -> None:
    code, out, _ = called(capsys, *LIST, "--want", "gm2 0.5 %", "--want", "Cc 0.2 %", "--json", "-")
    record = json.loads(out)
    assert code == 0
    assert record["choice"]["criterion"] == "wanted"
    assert [(one["name"], one["met"]) for one in record["wanted"]] == [("gm2", True), ("Cc", True)]
    assert len(record["sweeps"]) == 2


def test_the_folder_has_picture_numbers_and_steps(capsys: Captured, tmp_path: Path) -> None:
    folder = tmp_path / "bench"
    code, out, _ = called(capsys, *LIST, "--out", folder, "--parts", "2")
    assert code == 0
    assert out.endswith(f"pictures and numbers: {folder}\n")
    assert {path.name for path in folder.iterdir()} == {
        "plan.json", "plan.txt", "plan.csv", "steps.csv", "plan.png", "plan.svg"
    }  # fmt: skip
    record = json.loads((folder / "plan.json").read_text(encoding="utf-8"))
    steps = read_steps(folder / "steps.csv")
    assert [step.condition.load_added_f for step in steps] == pytest.approx(
        [one["load_added_f"] for one in record["sweeps"]]
    )
    code, _, err = called(capsys, *LIST, "--out", folder)
    assert code == 2
    assert "exists already" in err


def test_one_sweep_taken_already_is_planned_on(capsys: Captured) -> None:
    code, out, _ = called(capsys, *LIST[:4], "--have", PART_A, "--sweeps", "2", "--json", "-")
    record = json.loads(out)
    assert code == 0
    assert record["sweeps_taken"] == 1
    assert record["part"] == "as the sweeps taken show it"
    assert record["noise"]["source"] == "as in the sweeps taken"
    # Its own band is taken, and nothing added is not asked for again.
    assert {(one["f_min_hz"], one["f_max_hz"]) for one in record["sweeps"]} == {(10.0, 200e6)}
    assert all(one["load_added_f"] or one["rz_added_ohm"] for one in record["choice"]["candidates"])


def test_what_is_under_test_has_no_prior(capsys: Captured) -> None:
    _, out, _ = called(capsys, *LIST, "--under-test", "CL, gm2", "--sweeps", "1", "--json", "-")
    first = json.loads(out)["stages"][0]["elements"]
    assert [name for name, one in first.items() if one["sd"] is None] == ["gm2", "CL", "Rz"]
    _, out, _ = called(capsys, *LIST[:4], "--under-test", "CL", "--have", PART_A, "--sweeps", "1", "--json", "-")
    assert json.loads(out)["stages"][0]["elements"]["CL"]["informed"] == 1.0


def test_the_sweeps_of_a_steps_file_are_planned_on(capsys: Captured) -> None:
    code, out, _ = called(capsys, "--loads", "0, 10 pF", "--have", STEPS, "--sweeps", "1", "--json", "-")
    record = json.loads(out)
    assert code == 0
    assert record["sweeps_taken"] == 5
    assert [one["load_added_f"] for one in record["sweeps"]] == [1e-11]
    # Five sweeps tell nearly all.
    assert record["stages"][0]["elements"]["gm2"]["informed"] > 0.99


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["--loads", "5"], 2, "--loads: '5' has no unit; expected F"),
        (["--loads", "0,5 pF"], 2, "--loads: in '0,5 pF' a comma stands between digits"),
        (["--resistances", "-2 kOhm"], 2, "−2 kΩ leaves −700 Ω in series with Cc"),
        (["--loads", "-1 pF"], 2, "the added load must be 0 F or more, but is -1e-12"),
        (["--band", "1 MHz", "1 kHz"], 2, "--band: 1 MHz to 1 kHz does not rise"),
        (["--points", "3"], 2, "a sweep has 6 to 100000 points, but 3 are asked for"),
        (["--averages", "0"], 2, "argument --averages: '0' is not a whole number from 1"),
        (["--sweeps", "9"], 2, "9 sweeps cannot be chosen from 4; choose 1 to 4"),
        (["--want", "gm3 1 %"], 2, "--want: gm3 is not among what a plan knows"),
        (["--noise", "loud"], 2, "--noise: 'loud' is not one of"),
        (["--have", "nowhere.csv"], 3, "nowhere.csv: no such file"),
        (["--loads", "0, 5 pF, 15 pF", "--have", STEPS], 2, "every sweep on the list is in"),
    ],
)
def test_what_cannot_be_planned_is_refused_in_one_line(
    capsys: Captured, arguments: list[str | Path], code: int, message: str
) -> None:
    found, out, err = called(capsys, *arguments)
    assert found == code
    assert out == ""
    assert err.startswith("fitamp: ")
    assert err.count("\n") == 1
    assert message in err


def test_a_design_by_roots_is_refused(capsys: Captured, tmp_path: Path) -> None:
    path = tmp_path / "roots.toml"
    path.write_text(
        '[designed]\ndc_gain = "82 dB"\npole1 = "1.1 kHz"\npole2 = "40 MHz"\nzero = "131 MHz"\nhalf_plane = "left"\n',
        encoding="utf-8",
    )
    code = main(["plan", "--design", str(path)])
    captured = capsys.readouterr()
    assert code == 2
    assert "the design gives roots" in captured.err
    assert captured.err.count("\n") == 1


def test_a_steps_file_is_known_by_its_header_and_a_sweep_by_having_none(capsys: Captured, tmp_path: Path) -> None:
    steps = tmp_path / "steps.csv"
    steps.write_text(f'# remark\nload_added_F;"file"\n0;{PART_A}\n', encoding="utf-8-sig")
    code, out, _ = called(capsys, "--have", steps, "--sweeps", "1", "--json", "-")
    assert code == 0
    assert json.loads(out)["sweeps_taken"] == 1
    empty = tmp_path / "empty.csv"
    empty.write_text("", encoding="utf-8")
    code, _, err = called(capsys, "--have", empty)
    assert code == 3
    assert err.count("\n") == 1
