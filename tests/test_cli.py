"""The command line: exit codes, one line of error, one object of JSON, output whole or not at all."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import pytest

from fitamp import __version__, read_sweep
from fitamp.cli import COLUMNS_HELP, main, run
from fitamp.importers.quantity import UNITS_OF

ROOT = Path(__file__).resolve().parent.parent
DESIGN = ROOT / "data_examples" / "line_buffer.toml"
PART_A = ROOT / "data_examples" / "part_a_healthy.csv"
PART_B = ROOT / "data_examples" / "part_b_resistor_missing.csv"
PICTURES = {"loop.png", "loop.svg", "s-plane.png", "s-plane.svg"}
FIT_OUTPUT = PICTURES | {"fit.json", "fit.txt"}
COMPARE_OUTPUT = PICTURES | {
    "zero-path.png",
    "zero-path.svg",
    "comparison.json",
    "comparison.txt",
    "comparison.csv",
}
ELEMENTS_OUTPUT = {f"{name}.{form}" for name in ("elements", "blame", "lines", "what-if") for form in ("png", "svg")}
ELEMENTS_OUTPUT |= {"elements.json", "elements.txt", "elements.csv"}

Captured = pytest.CaptureFixture[str]


def called(capsys: Captured, *arguments: str | Path) -> tuple[int, str, str]:
    """Exit code, standard output and standard error of a command."""
    code = main([str(argument) for argument in arguments])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def refused(capsys: Captured, code: int, *arguments: str | Path) -> str:
    """The one line of a command that fails with `code` and prints nothing else, but the place if it is `read`."""
    found, out, err = called(capsys, *arguments)
    assert found == code
    assert out == ""
    assert err.startswith("fitamp: ")
    assert err.endswith("\n")
    line, *place = err.splitlines(keepends=True)
    assert len(place) in ((0, 2) if arguments[:1] == ("read",) else (0,))
    assert all(text.startswith("    ") for text in place)
    return line


def names_in(folder: Path) -> set[str]:
    """Everything below a folder, hidden things included."""
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*")}


# What the commands print


def test_read_says_what_was_understood(capsys: Captured) -> None:
    code, out, err = called(capsys, "read", PART_A, PART_B)
    assert (code, err) == (0, "")
    assert "241 used, 0 left out" in out
    assert "10.00 Hz to 200.0 MHz" in out
    assert "inverted" in out
    assert out.index(PART_A.name) < out.index(PART_B.name)


def test_read_draws_the_sweep_on_request(capsys: Captured) -> None:
    _, plain, _ = called(capsys, "read", PART_A)
    code, drawn, err = called(capsys, "read", PART_A, "--plot")
    assert (code, err) == (0, "")
    assert drawn.startswith(plain)
    assert drawn[len(plain) :].split("\n")[1] == "|T| (dB)"


def test_fit_prints_parameters_and_margins(capsys: Captured) -> None:
    code, out, err = called(capsys, "fit", PART_A)
    assert (code, err) == (0, "")
    for words in ("gain-bandwidth", "pole 1", "pole 2", "zero time τz", "phase margin", "noise: "):
        assert words in out


def test_compare_prints_the_verdict_first(capsys: Captured) -> None:
    code, out, err = called(capsys, "compare", PART_B, "--design", DESIGN)
    assert (code, err) == (0, "")
    assert out.startswith("WRONG-SIDE: ")
    assert "what to do: raise Rz by" in out


@pytest.mark.parametrize(
    ("arguments", "schema"),
    [
        (["read", PART_A], "fitamp/read/1"),
        (["fit", PART_A], "fitamp/fit/1"),
        (["compare", PART_A, "--design", DESIGN], "fitamp/compare/1"),
    ],
)
def test_json_on_stdout_is_one_object_and_nothing_else(
    capsys: Captured, arguments: Sequence[str | Path], schema: str
) -> None:
    code, out, err = called(capsys, *arguments, "--json", "-")
    assert (code, err) == (0, "")
    record: dict[str, Any] = json.loads(out)
    assert record["schema"] == schema


def test_json_to_a_file_comes_beside_the_table(capsys: Captured, tmp_path: Path) -> None:
    path = tmp_path / "new folder" / "a.json"
    code, out, _ = called(capsys, "fit", PART_A, "--json", path)
    assert code == 0
    assert "zero time" in out
    assert json.loads(path.read_text(encoding="utf-8"))["schema"] == "fitamp/fit/1"
    assert names_in(tmp_path) == {"new folder", "new folder/a.json"}


def test_columns_trace_and_sign_reach_the_reader(capsys: Captured) -> None:
    _, out, _ = called(capsys, "read", PART_A, "--columns", "f=1:Hz mag=2:dB phase=3:deg", "--sign", "inverted")
    assert "inverted" in out
    part_d = PART_A.with_name("part_d_too_much.s2p")
    _, out, _ = called(capsys, "read", part_d, "--trace", "S11", "--sign", "as-read")
    assert "-42.100" in out


def parameters_of(capsys: Captured, *arguments: str | Path) -> dict[str, Any]:
    """Record of a command that ends well."""
    code, out, err = called(capsys, *arguments, "--json", "-")
    assert (code, err) == (0, "")
    record: dict[str, Any] = json.loads(out)
    return record


def test_a_bad_point_is_left_out_and_listed_unless_all_are_kept(capsys: Captured, tmp_path: Path) -> None:
    sweep = read_sweep(PART_A)
    gain = sweep.gain.copy()
    gain[150] *= 1.3
    rows = zip(sweep.freq_hz, gain, strict=True)
    file = tmp_path / "spoilt.csv"
    file.write_text("f (Hz),re,im\n" + "".join(f"{f:.9g},{t.real:.9g},{t.imag:.9g}\n" for f, t in rows), "utf-8")
    commands: list[list[str | Path]] = [["fit", file], ["compare", file, "--design", DESIGN]]
    for command in commands:
        (point,) = parameters_of(capsys, *command)["sweep"]["left_out"]
        assert point["f_hz"] == pytest.approx(sweep.freq_hz[150], rel=1e-6)
        assert point["reason"].endswith("σ off its neighbours")
        _, out, _ = called(capsys, *command, "--keep-all", "--json", "-")
        assert json.loads(out)["sweep"]["left_out"] == []


def test_stated_noise_reaches_fit_and_comparison(capsys: Captured) -> None:
    commands: list[list[str | Path]] = [["fit", PART_A], ["compare", PART_A, "--design", DESIGN]]
    for command in commands:
        record = parameters_of(capsys, *command, "--noise", "relative=0.1% error=2e-5 return = 3e-5 ratio=1e-9")
        noise = {"error_channel": 2e-5, "return_channel": 3e-5, "relative": 1e-3, "ratio": 1e-9, "source": "given"}
        assert record["noise"] == noise
    # The user's noise is taken at its word, in the fit and in what is said of the delay.
    code, out, err = called(capsys, *commands[1], "--noise", "error=2e-6 return=2e-6 relative=1e-4", "--json", "-")
    assert code == 4
    assert "times as large as the scatter allows" in err
    assert "delay-contradicted" not in {note["code"] for note in json.loads(out)["warnings"]}


def test_a_stated_delay_reaches_the_fit(capsys: Captured) -> None:
    # Part a was made with a cable of 0.41 ns and τz = 1.02·1.8 pF·(1365 Ω − 1/(0.96·1.6 mS)) = 1.3108 ns; its third
    # pole, near 0.25 ns, must not go into the delay.
    stated = parameters_of(capsys, "fit", PART_A, "--delay", "0.4 ns +- 20 ps")["parameters"]
    assert stated["zero_time_s"]["value"] == pytest.approx(1.3108e-9, abs=4 * stated["zero_time_s"]["stderr"])
    assert stated["zero_time_s"]["stderr"] < 0.01e-9
    assert stated["delay_s"]["value"] == pytest.approx(0.41e-9, abs=0.02e-9)
    held = parameters_of(capsys, "fit", PART_A, "--delay", "0.41 ns")["parameters"]
    assert (held["delay_s"]["value"], held["delay_s"]["stderr"]) == (0.41e-9, None)
    assert held["zero_time_s"]["stderr"] < stated["zero_time_s"]["stderr"]
    free = parameters_of(capsys, "fit", PART_A, "--delay", "free")
    assert free == parameters_of(capsys, "fit", PART_A)


def test_a_stated_delay_takes_the_place_of_the_design_files(capsys: Captured) -> None:
    compare: list[str | Path] = ["compare", PART_A, "--design", DESIGN]
    assert parameters_of(capsys, *compare, "--delay", "0.4ns ± 0.02ns") == parameters_of(capsys, *compare)
    free = parameters_of(capsys, *compare, "--delay", "free")
    assert free["verdict"]["nulling"] == "as-designed"
    assert "delay-not-stated" in {note["code"] for note in free["warnings"]}
    # The sweep has 0.41 ns: none at all is contradicted, and no verdict is given.
    code, out, _ = called(capsys, *compare, "--delay", "0 ns", "--json", "-")
    record = json.loads(out)
    assert (code, record["verdict"]["nulling"]) == (4, "undecided")
    assert "delay-contradicted" in {note["code"] for note in record["warnings"]}


@pytest.mark.parametrize("arguments", [["--help"], ["compare", "--help"], ["--version"]])
def test_help_and_version_end_well(capsys: Captured, arguments: list[str]) -> None:
    with pytest.raises(SystemExit, match=r"^0$"):
        main(arguments)
    out = capsys.readouterr().out
    assert __version__ in out if arguments == ["--version"] else "usage: fitamp" in out


def test_help_on_columns_lists_the_keys_and_units_that_the_reader_takes() -> None:
    with_units = "; ".join(f"{quantity} {', '.join(units)}" for quantity, units in UNITS_OF.items() if units)
    *first, last = (quantity for quantity, units in UNITS_OF.items() if not units)
    assert COLUMNS_HELP.endswith(f": {with_units}; {', '.join(first)} and {last} without unit")


def test_read_shows_the_good_files_and_a_line_for_each_bad_one(capsys: Captured, tmp_path: Path) -> None:
    bad, missing = tmp_path / "bad.csv", tmp_path / "missing.csv"
    bad.write_text("f (Hz),|T| (dB),phase (deg)\n10,80,0\n20,OVL,0\n", encoding="utf-8")
    code, out, err = called(capsys, "read", PART_A, bad, missing, PART_B)
    assert code == 3
    assert out.index(PART_A.name) < out.index(PART_B.name)
    lines = [line for line in err.splitlines() if line.startswith("fitamp: ")]
    assert [str(path) in line for path, line in zip((bad, missing), lines, strict=True)] == [True, True]
    assert err.splitlines()[1:3] == ["    3 | 20,OVL,0", "      |    ^^^"]

    code, out, _ = called(capsys, "read", PART_A, bad, missing, "--json", "-")
    record = json.loads(out)
    assert (code, record["schema"]) == (3, "fitamp/read/1")
    assert [sweep["sweep"]["file"] for sweep in record["sweeps"]] == [str(PART_A)]
    assert [error["file"] for error in record["errors"]] == [str(bad), str(missing)]
    assert [f"fitamp: {error['message']}" for error in record["errors"]] == lines
    assert json.loads(called(capsys, "read", PART_A, "--json", "-")[1])["errors"] == []


def test_read_of_a_bad_file_shows_its_line_with_a_mark(capsys: Captured, tmp_path: Path) -> None:
    bad = tmp_path / "bad.csv"
    bad.write_text("f (Hz),|T| (dB),phase (deg)\n10,80,0\n20,\tx\u202e,0\n", encoding="utf-8")
    code, out, err = called(capsys, "read", bad)
    assert (code, out) == (3, "")
    assert err.splitlines()[1:] == ["    3 | 20,\\tx\\u202e,0", "      |      ^^^^^^^"]
    assert called(capsys, "fit", bad)[2] == err.splitlines(keepends=True)[0]


def test_one_of_several_sweeps_is_chosen_or_all_are_averaged(capsys: Captured, tmp_path: Path) -> None:
    file = tmp_path / "runs.csv"
    sweep = read_sweep(PART_A)
    rows = [f"{f!r},{t.real!r},{t.imag!r}" for f, t in zip(sweep.freq_hz.tolist(), sweep.gain.tolist(), strict=True)]
    again = [
        f"{f!r},{t.real!r},{t.imag!r}"
        for f, t in zip(sweep.freq_hz.tolist(), (sweep.gain * 1.001).tolist(), strict=True)
    ]
    file.write_text("\n".join(["f (Hz),re,im", *rows, "f (Hz),re,im", *again, ""]), encoding="utf-8")
    assert "choose one, as in --sweep 2, or average them with --repeats" in refused(capsys, 3, "fit", file)
    code, out, _ = called(capsys, "read", file, "--sweep", "2")
    assert code == 0
    assert "2 of 2, from line 244" in " ".join(out.split())
    assert called(capsys, "read", file, "--repeats")[0] == 0
    assert "sweep 3 is not there; the file holds 2 sweeps" in refused(capsys, 2, "fit", file, "--sweep", "3")
    assert "'0' is not a whole number from 1" in refused(capsys, 2, "fit", file, "--sweep", "0")
    assert "give one of the two" in refused(capsys, 2, "fit", file, "--sweep", "1", "--repeats")


def test_read_of_bad_files_only_has_nothing_to_show(capsys: Captured, tmp_path: Path) -> None:
    missing = [tmp_path / "a.csv", tmp_path / "b.csv"]
    code, out, err = called(capsys, "read", *missing)
    assert (code, out, err.count("\n")) == (3, "", 2)
    code, out, err = called(capsys, "read", *missing, "--json", "-")
    record = json.loads(out)
    assert (code, err.count("\n")) == (3, 2)
    assert (record["schema"], record["sweeps"], len(record["errors"])) == ("fitamp/error/1", [], 2)
    assert record["error"] == {"message": "none of the 2 files can be read", "exit_code": 3}
    path = tmp_path / "out.json"
    assert called(capsys, "read", *missing, "--json", path)[0] == 3
    assert not path.exists()


def test_template_prints_or_writes_a_design_file(capsys: Captured, tmp_path: Path) -> None:
    code, out, err = called(capsys, "template")
    assert (code, err) == (0, "")
    path = tmp_path / "chip.toml"
    code, said, err = called(capsys, "template", "--out", path)
    assert (code, said, err) == (0, f"design file to fill in: {path}\n", "")
    assert path.read_text(encoding="utf-8") == out
    assert "exists already" in refused(capsys, 2, "template", "--out", path)
    assert called(capsys, "template", "--out", path, "--force")[0] == 0
    assert called(capsys, "compare", PART_A, "--design", path)[0] == 0


# Exit codes


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ([], "COMMAND"),
        (["mend"], "invalid choice: 'mend'"),
        (["fit"], "FILE"),
        (["fit", str(PART_A), "--colour"], "unrecognized arguments: --colour"),
        (["fit", str(PART_A), "--sign", "sideways"], "invalid choice: 'sideways'"),
        (["compare", str(PART_A)], "--design"),
        (["fit", str(PART_A), "--columns", "nonsense"], "columns"),
        (["fit", str(PART_A), "--noise", "loud"], "'loud' is not one of error, return, relative, ratio with ="),
        (["fit", str(PART_A), "--delay", "0.4"], "'0.4' is not a time with unit; expected \"0.4 ns\""),
        (["compare", str(PART_A), "--design", str(DESIGN), "--noise", "error=0"], "no level above 0 in 'error=0'"),
        (["compare", str(PART_A), "--design", str(DESIGN), "--delay", "-1 ns"], "'-1 ns' is negative"),
    ],
)
def test_a_command_put_together_wrongly_is_usage(capsys: Captured, arguments: list[str], words: str) -> None:
    assert words in refused(capsys, 2, *arguments)


def test_existing_output_is_refused_before_any_work(capsys: Captured, tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine", encoding="utf-8")
    there = tmp_path / "mine.txt"
    # The file to read does not even exist: what is there is looked at first.
    for command in (["fit", "missing.csv"], ["compare", "missing.csv", "--design", "missing.toml"]):
        assert "exists already; choose another name or give --force" in refused(capsys, 2, *command, "--out", tmp_path)
        assert "exists already" in refused(capsys, 2, *command, "--json", there)
    assert "exists already" in refused(capsys, 2, "read", "missing.csv", "--json", there)
    assert there.read_text(encoding="utf-8") == "mine"
    assert names_in(tmp_path) == {"mine.txt"}


def test_the_force_that_a_refusal_advises_is_there(capsys: Captured, tmp_path: Path) -> None:
    path = tmp_path / "a.json"
    path.write_text("old", encoding="utf-8")
    commands: list[list[str | Path]] = [["read", PART_A], ["fit", PART_A], ["compare", PART_A, "--design", DESIGN]]
    for command in commands:
        code, _, err = called(capsys, *command, "--json", path, "--force")
        assert (code, err) == (0, "")
    assert json.loads(path.read_text(encoding="utf-8"))["schema"] == "fitamp/compare/1"


def test_a_missing_file_is_unusable_input(capsys: Captured, tmp_path: Path) -> None:
    for command in (["read"], ["fit"]):
        assert "missing.csv" in refused(capsys, 3, *command, tmp_path / "missing.csv")
    assert "missing.toml" in refused(capsys, 3, "compare", PART_A, "--design", tmp_path / "missing.toml")


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("empty.csv", b""),
        ("words.csv", b"f (Hz),|T| (dB),phase (deg)\n10,eighty,0\n"),
        ("binary.csv", bytes(range(256)) * 4),
        ("broken.s1p", b"# Hz S RI R 50\n1 2\n"),
        ("picture.png", b"\x89PNG\r\n\x1a\n"),
    ],
)
def test_a_broken_file_is_unusable_input(capsys: Captured, tmp_path: Path, name: str, content: bytes) -> None:
    path = tmp_path / name
    path.write_bytes(content)
    commands: list[list[str | Path]] = [["read", path], ["fit", path], ["compare", path, "--design", DESIGN]]
    for command in commands:
        assert name in refused(capsys, 3, *command)


@pytest.mark.parametrize(
    "content",
    ["", "[elements]\n", "gm2 = 1.6 mS", '[elements]\ngm2 = "1,6 mS"\n', "[[elements]]\n", "\x00"],
)
def test_a_broken_design_is_unusable_input(capsys: Captured, tmp_path: Path, content: str) -> None:
    path = tmp_path / "broken.toml"
    path.write_text(content, encoding="utf-8")
    assert "broken.toml" in refused(capsys, 3, "compare", PART_A, "--design", path)


def test_too_few_points_give_no_trustworthy_result(capsys: Captured, tmp_path: Path) -> None:
    path = tmp_path / "few.csv"
    path.write_text("".join(PART_A.read_text(encoding="utf-8").splitlines(keepends=True)[:9]), encoding="utf-8")
    err = refused(capsys, 4, "fit", path, "--out", tmp_path / "out")
    assert "6 usable points, a fit needs 12" in err
    refused(capsys, 4, "compare", path, "--design", DESIGN, "--out", tmp_path / "out")
    assert names_in(tmp_path) == {"few.csv"}


@pytest.mark.parametrize(
    ("code", "arguments"),
    [
        (2, ["fit", "--json", "-"]),
        (2, ["mend", "--json=-"]),
        (2, ["fit", PART_A, "--json", "-", "--columns", "nonsense"]),
        (3, ["read", "missing.csv", "--json", "-"]),
        (3, ["fit", "missing.csv", "--js", "-"]),
        (3, ["compare", PART_A, "--design", "missing.toml", "--json", "-"]),
    ],
)
def test_an_error_is_one_object_of_json_as_well(capsys: Captured, code: int, arguments: Sequence[str | Path]) -> None:
    found, out, err = called(capsys, *arguments)
    assert found == code
    assert err.count("\n") == 1
    error = {"message": err.removeprefix("fitamp: ").rstrip("\n"), "exit_code": code}
    assert json.loads(out) == {"schema": "fitamp/error/1", "error": error}


def test_an_empty_name_is_called_empty(capsys: Captured) -> None:
    assert refused(capsys, 3, "read", "") == (
        "fitamp: the name of the sweep file is empty; name one CSV or Touchstone file\n"
    )
    assert "the name of the design file is empty" in refused(capsys, 3, "compare", PART_A, "--design", "")
    for option in ("--json", "--out"):
        assert f"argument {option}: the name is empty" in refused(capsys, 2, "fit", PART_A, option, "")


def test_a_hostile_file_name_stays_one_inert_line(capsys: Captured, tmp_path: Path) -> None:
    err = refused(capsys, 3, "fit", tmp_path / "a\x1b[31m\nb[red].csv")
    assert r"a\x1b[31m\nb[red].csv" in err


# Output folders


def test_fit_leaves_its_files_and_nothing_else(capsys: Captured, tmp_path: Path) -> None:
    code, out, err = called(capsys, "fit", PART_A, "--out", tmp_path / "out")
    assert (code, err) == (0, "")
    assert names_in(tmp_path) == {"out"} | {f"out/{name}" for name in FIT_OUTPUT}
    assert "pictures and numbers: " in out
    record = json.loads((tmp_path / "out" / "fit.json").read_text(encoding="utf-8"))
    assert record["schema"] == "fitamp/fit/1"
    assert out.startswith((tmp_path / "out" / "fit.txt").read_text(encoding="utf-8"))


def test_compare_leaves_its_files_and_nothing_else(capsys: Captured, tmp_path: Path) -> None:
    out = tmp_path / "out"
    code, printed, err = called(capsys, "compare", PART_B, "--design", DESIGN, "--out", out, "--json", "-")
    assert (code, err) == (0, "")
    assert names_in(tmp_path) == {"out"} | {f"out/{name}" for name in COMPARE_OUTPUT}
    record = json.loads((out / "comparison.json").read_text(encoding="utf-8"))
    assert record == json.loads(printed)
    lines = (out / "comparison.csv").read_text(encoding="utf-8").splitlines()
    assert lines[0] == "quantity,designed,designed_as_measured,measured,stderr,deviation,sigma,low,high,inside"
    assert [line.split(",")[0] for line in lines[1:]] == [row["quantity"] for row in record["comparison"]]
    zero = dict(zip(lines[0].split(","), lines[5].split(","), strict=True))
    assert zero["quantity"] == "zero_time_s"
    assert float(zero["measured"]) == record["verdict"]["zero_time_s"]["value"]
    assert zero["inside"] == "no"
    assert (out / "loop.png").read_bytes().startswith(b"\x89PNG")
    assert b"<svg" in (out / "zero-path.svg").read_bytes()


def test_demo_runs_on_every_part(capsys: Captured, tmp_path: Path) -> None:
    # Two of the parts, and two sweeps of the stepped one, so that the test stays short.
    folder = tmp_path / "examples"
    stepped = folder / "part_f_stepped"
    stepped.mkdir(parents=True)
    for path in (DESIGN, PART_A, PART_B):
        shutil.copy(path, folder)
    for name in ("base.csv", "rz_plus_500.csv"):
        shutil.copy(DESIGN.parent / "part_f_stepped" / name, stepped)
    (stepped / "steps.csv").write_text("file,rz_added_ohm\nbase.csv,0\nrz_plus_500.csv,500\n", encoding="utf-8")
    out = tmp_path / "out"
    code, printed, err = called(capsys, "demo", "--examples", folder, "--out", out)
    assert (code, err) == (0, "")
    assert "as-designed: " in printed
    assert "wrong-side: " in printed
    parts = {PART_A.stem, PART_B.stem}
    assert "part_f_stepped\n  too-little: " in printed
    estimated = {"part_f_stepped"} | {f"part_f_stepped/{name}" for name in ELEMENTS_OUTPUT}
    assert names_in(out) == parts | {f"{part}/{name}" for part in parts for name in COMPARE_OUTPUT} | estimated
    assert "exists already" in refused(capsys, 2, "demo", "--examples", folder, "--out", out)


def test_demo_without_examples_says_where_they_are(capsys: Captured, tmp_path: Path) -> None:
    assert "name their folder with --examples" in refused(capsys, 2, "demo", "--examples", tmp_path)


# Faults of our own


@pytest.mark.parametrize("fault", [ZeroDivisionError("by\nnothing"), MemoryError("no room")])
def test_a_fault_of_ours_is_one_line_and_leaves_nothing(
    capsys: Captured, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, fault: Exception
) -> None:
    def broken(*_: object, **__: object) -> None:
        raise fault

    monkeypatch.setattr("fitamp.plots.save_figures", broken)
    arguments = ["fitamp", "fit", str(PART_A), "--out", str(tmp_path / "out"), "--json", "-"]
    monkeypatch.setattr(sys, "argv", arguments)
    with pytest.raises(SystemExit, match=r"^1$"):
        run()
    captured = capsys.readouterr()
    assert json.loads(captured.out)["error"]["exit_code"] == 1
    assert captured.err.startswith(f"fitamp: internal fault: {type(fault).__name__}: ")
    assert captured.err.count("\n") == 1
    assert names_in(tmp_path) == set()


def test_an_interruption_leaves_nothing(capsys: Captured, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("fitamp.plots.save_figures", interrupted)
    code, out, err = called(capsys, "compare", PART_A, "--design", DESIGN, "--out", tmp_path / "out")
    assert code == 130
    assert out == ""
    assert err == "fitamp: interrupted; nothing half-written is left\n"
    assert names_in(tmp_path) == set()


# The real process


def process(*arguments: str | Path, **environment: str) -> subprocess.CompletedProcess[bytes]:
    """`python -m fitamp` with these arguments, in the checkout."""
    return subprocess.run(
        [sys.executable, "-m", "fitamp", *(str(argument) for argument in arguments)],
        capture_output=True,
        check=False,
        cwd=ROOT,
        env=os.environ | environment,
    )


def test_the_process_helps() -> None:
    done = process("--help", PYTHONIOENCODING="utf-8")
    assert done.returncode == 0
    assert done.stderr == b""
    for command in ("read", "fit", "compare", "template", "demo"):
        assert command in done.stdout.decode("utf-8")


def test_the_process_compares_in_a_legacy_code_page() -> None:
    # cp1252 has µ and ±, but neither Ω nor τ: they may be lost, the result may not.
    done = process("compare", PART_B, "--design", DESIGN, PYTHONIOENCODING="cp1252")
    assert done.returncode == 0
    assert done.stderr == b""
    text = done.stdout.decode("cp1252")
    assert text.startswith("WRONG-SIDE: ")
    assert "± " in text


def test_the_process_prints_whole_json_in_a_legacy_code_page() -> None:
    done = process("compare", PART_B, "--design", DESIGN, "--json", "-", PYTHONIOENCODING="cp1252")
    assert done.returncode == 0
    assert done.stderr == b""
    assert "kΩ" in json.loads(done.stdout)["advice"]["sentence"]


def test_the_process_fails_in_one_line(tmp_path: Path) -> None:
    done = process("fit", tmp_path / "missing.csv", PYTHONIOENCODING="utf-8")
    assert done.returncode == 3
    assert done.stdout == b""
    lines = done.stderr.decode("utf-8").splitlines()
    assert len(lines) == 1
    assert lines[0].startswith("fitamp: ")
