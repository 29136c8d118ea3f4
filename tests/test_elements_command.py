"""`fitamp elements`: exit codes, one line of error, one object of JSON, output whole or not at all."""

from __future__ import annotations

import json
import shutil
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fitamp import elements_command, read_design, read_sweep
from fitamp.cli import main
from fitamp.findings import findings_of

ROOT = Path(__file__).resolve().parent.parent
DESIGN = ROOT / "data_examples" / "line_buffer.toml"
PART = ROOT / "data_examples" / "part_f_stepped"
BASE, STEPS = PART / "base.csv", PART / "steps.csv"
NAMES = ("elements", "blame", "lines", "what-if")
OUTPUT = {f"{name}.{form}" for name in NAMES for form in ("png", "svg")} | {
    "elements.json",
    "elements.txt",
    "elements.csv",
}

Captured = pytest.CaptureFixture[str]


@pytest.fixture(autouse=True)
def few_samples(monkeypatch: pytest.MonkeyPatch) -> None:
    """Bands from few samples, so that the tests stay short."""
    monkeypatch.setattr(elements_command, "findings_of", partial(findings_of, samples=4))


def called(capsys: Captured, *arguments: str | Path) -> tuple[int, str, str]:
    """Exit code, standard output and standard error of the command with the example's design."""
    code = main(["elements", "--design", str(DESIGN), *(str(argument) for argument in arguments)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def refused(capsys: Captured, code: int, *arguments: str | Path) -> str:
    """The one line of a command that fails with `code` and prints nothing else."""
    found, out, err = called(capsys, *arguments)
    assert (found, out) == (code, "")
    assert err.startswith("fitamp: ")
    assert err.count("\n") == 1
    return err


def record_of(capsys: Captured, *arguments: str | Path) -> dict[str, Any]:
    """Record of a command that ends well."""
    code, out, err = called(capsys, *arguments, "--json", "-")
    assert (code, err) == (0, "")
    record: dict[str, Any] = json.loads(out)
    return record


def test_stepped_sweeps_give_every_element_and_all_files(capsys: Captured, tmp_path: Path) -> None:
    out, new = tmp_path / "out", tmp_path / "new.toml"
    code, printed, err = called(capsys, "--steps", STEPS, "--out", out, "--design-out", new)
    assert (code, err) == (0, "")
    assert printed.startswith("TOO-LITTLE: ")
    assert {path.name for path in out.iterdir()} == OUTPUT
    assert {path.name for path in tmp_path.iterdir()} == {"out", "new.toml"}
    record = json.loads((out / "elements.json").read_text(encoding="utf-8"))
    assert (record["schema"], record["through"]) == ("fitamp/elements/1", None)
    assert printed.startswith((out / "elements.txt").read_text(encoding="utf-8"))
    assert f"design file of the part as estimated: {new}" in printed
    assert (out / "what-if.png").read_bytes().startswith(b"\x89PNG")
    # Silicon is the next revision's starting point: gm2 is 16 % low on this part.
    again = read_design(new)
    assert again.elements is not None
    assert again.elements.gm2 == pytest.approx(0.84 * 1.6e-3, rel=3e-3)
    # The estimated part, held against its own design file, is as designed.
    assert main(["compare", str(BASE), "--design", str(new)]) == 0
    assert "what to do: " in capsys.readouterr().out


def test_files_without_steps_are_sweeps_with_nothing_added(capsys: Captured) -> None:
    code, printed, err = called(capsys, BASE)
    assert (code, err) == (0, "")
    assert "NOT MEASURED, the design's own: R1, R2, CL" in " ".join(printed.split())
    assert "line, " not in printed


def test_a_file_beside_the_steps_is_taken_once(capsys: Captured, tmp_path: Path) -> None:
    for name in ("base.csv", "rz_plus_500.csv"):
        shutil.copy(PART / name, tmp_path)
    steps = tmp_path / "steps.csv"
    steps.write_text("file,rz_added_ohm\nrz_plus_500.csv,500\n", encoding="utf-8")
    both = record_of(capsys, tmp_path / "base.csv", tmp_path / "rz_plus_500.csv", "--steps", steps)
    assert [sweep["condition"]["rz_added_ohm"] for sweep in both["sweeps"]] == [0, 500]
    assert both == record_of(capsys, tmp_path / "base.csv", "--steps", steps)
    # 500 ohms more tell Cc, which one sweep does not.
    assert both["elements"]["Cc"]["informed"] > 0.99
    twice = refused(capsys, 2, BASE, PART / ".." / "part_f_stepped" / "base.csv")
    assert "is named twice; a sweep counts once" in twice


def test_options_reach_the_estimate(capsys: Captured) -> None:
    record = record_of(capsys, BASE, "--margin-wanted", "60 deg", "--noise", "error=2e-5 return=2e-5 relative=1e-3")
    assert record["wanted"]["phase_margin_deg"] == 60
    assert record["sweeps"][0]["noise"]["relative"] == 1e-3
    free = record_of(capsys, BASE, "--delay", "free", "--under-test", "CL, gm2")
    assert free["bench"]["bench_delay_s"]["designed"] is None
    assert "delay-not-stated" in {warning["code"] for warning in free["warnings"]}
    assert set(free["design"]["under_test"]) >= {"CL", "gm2", "Rz"}
    assert free["elements"]["CL"]["spread"] is None


def test_a_through_sweep_is_said_once(capsys: Captured, tmp_path: Path) -> None:
    freq_hz = read_sweep(BASE).freq_hz
    through = tmp_path / "through.csv"
    rng = np.random.default_rng(3)
    gain = np.exp(-2j * np.pi * freq_hz * 0.41e-9) * (1 + 1e-3 * rng.standard_normal(len(freq_hz)))
    rows = (f"{f:.9g},{t.real:.9g},{t.imag:.9g}" for f, t in zip(freq_hz, gain, strict=True))
    through.write_text("\n".join(["f (Hz),re,im", *rows]) + "\n", encoding="utf-8")
    steps = tmp_path / "steps.csv"
    steps.write_text(
        "file,load_added_F\n"
        + "".join(f'"{PART / name}",{f}\n' for name, f in (("base.csv", 0), ("load_5p.csv", 5e-12))),
        encoding="utf-8",
    )
    record = record_of(capsys, "--steps", steps, "--through", through)
    assert record["through"]["delay_s"] == pytest.approx(0.41e-9, abs=4 * record["through"]["stderr_s"])
    assert record["bench"]["bench_delay_s"]["designed"] == record["through"]["delay_s"]
    _, printed, _ = called(capsys, "--steps", steps, "--through", through)
    assert printed.count("measured with a through sweep") == 1


def test_what_is_not_to_be_trusted_ends_with_4_and_is_shown_all_the_same(capsys: Captured, tmp_path: Path) -> None:
    # A load of 15 pF that the steps file states as 5 pF.
    for name in ("base.csv", "load_15p.csv", "rz_plus_500.csv"):
        shutil.copy(PART / name, tmp_path)
    steps = tmp_path / "steps.csv"
    steps.write_text("file,load_added_F,rz_added_ohm\nbase.csv,,\nload_15p.csv,5 pF,\n", encoding="utf-8")
    code, out, err = called(capsys, "--steps", steps, "--json", "-")
    record = json.loads(out)
    assert (code, record["trustworthy"], record["verdict"]["nulling"]) == (4, False, "undecided")
    assert err.startswith("fitamp: not trustworthy: the sweeps do not show the same part")
    assert err.count("\n") == 1


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ([], "no sweep is named; give sweep files, or --steps"),
        ([BASE, "--margin-wanted", "60"], "--margin-wanted: '60' has no unit; expected deg"),
        ([BASE, "--margin-wanted", "200 deg"], "a phase margin lies between -180 and 180 degrees"),
        ([BASE, "--under-test", "gm3"], "no element is named gm3"),
        ([BASE, "--delay", "0.4"], "'0.4' is not a time with unit"),
        ([BASE, "--noise", "loud"], "'loud' is not one of"),
        ([BASE, "--steps", ""], "the name is empty"),
        ([BASE, "--design-out", ""], "the name is empty"),
    ],
)
def test_a_command_put_together_wrongly_is_usage(capsys: Captured, arguments: list[str | Path], words: str) -> None:
    assert words in refused(capsys, 2, *arguments)


def test_existing_output_is_refused_before_any_work(capsys: Captured, tmp_path: Path) -> None:
    there = tmp_path / "mine.toml"
    there.write_text("mine", encoding="utf-8")
    for option, path in (("--out", tmp_path), ("--json", there), ("--design-out", there)):
        # The sweep does not even exist: what is there is looked at first.
        assert "exists already" in refused(capsys, 2, "missing.csv", option, path)
    assert there.read_text(encoding="utf-8") == "mine"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("file\nmissing.csv\n", "steps.csv, line 2: "),
        ("file,load\nbase.csv,5 pF\n", "steps.csv, line 1: unknown column 'load'"),
        ("file,load_added_F\nbase.csv,5 Ohm\n", "steps.csv, line 2: load_added_F"),
        ("", "steps.csv: is empty"),
    ],
)
def test_a_broken_steps_file_is_unusable_input(capsys: Captured, tmp_path: Path, text: str, words: str) -> None:
    steps = tmp_path / "steps.csv"
    steps.write_text(text, encoding="utf-8")
    assert words in refused(capsys, 3, "--steps", steps)


def test_files_that_cannot_be_used_are_one_line(capsys: Captured, tmp_path: Path) -> None:
    assert "missing.csv" in refused(capsys, 3, tmp_path / "missing.csv")
    assert "nowhere.csv: no such file; check the path of the steps file" in refused(
        capsys, 3, "--steps", tmp_path / "nowhere.csv"
    )
    hostile = refused(capsys, 3, tmp_path / "a\x1b[31m\nb[red].csv")
    assert r"a\x1b[31m\nb[red].csv" in hostile
    few = tmp_path / "few.csv"
    few.write_text("".join(BASE.read_text(encoding="utf-8").splitlines(keepends=True)[:9]), encoding="utf-8")
    assert "6 usable points" in refused(capsys, 4, few, "--out", tmp_path / "out")
    assert {path.name for path in tmp_path.iterdir()} == {"few.csv"}


def test_a_design_by_roots_has_no_elements(capsys: Captured, tmp_path: Path) -> None:
    design = tmp_path / "roots.toml"
    design.write_text(
        '[designed]\ndc_gain = "82 dB"\npole1 = "1.1 kHz"\npole2 = "40 MHz"\nzero = "131 MHz"\nhalf_plane = "left"\n',
        encoding="utf-8",
    )
    assert main(["elements", str(BASE), "--design", str(design)]) == 2
    assert "the design gives roots" in capsys.readouterr().err
