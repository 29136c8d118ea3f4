"""Files as they should not be end in one line and the right exit code; odd ones that are sound are read exactly."""

from __future__ import annotations

import re
import tracemalloc
from collections.abc import Sequence
from pathlib import Path

import pytest
from make import BAD_DESIGNS, BAD_SWEEPS, ODD_SWEEPS, OPTIONS_OF_BAD, build, expected_lines, main

from fitamp import read_sweep
from fitamp.cli import main as fitamp
from fitamp.errors import SweepError
from fitamp.sweep import Sign, Sweep

EXPECTED = expected_lines()
PART = Path(__file__).resolve().parents[2] / "data_examples" / "part_a_healthy.csv"
# What no output may hold: it steers terminals, or turns text round.
STEERING = re.compile(r"[^\n\x20-\x7e\xa0-\uffff]|[\x80-\x9f\u200b-\u200f\u2028-\u202e]")

Captured = pytest.CaptureFixture[str]


def called(capsys: Captured, *arguments: str | Path) -> tuple[int, str, str]:
    """Exit code, standard output and standard error of a command."""
    code = fitamp([str(argument) for argument in arguments])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def contents(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*")}


def assert_is_expected(name: str, code: int, line: str, path: Path) -> None:
    """Hold exit code and line against those of the list."""
    expected_code, text = EXPECTED[name]
    pattern = re.escape(text).replace(r"\{file\}", re.escape(str(path))).replace(r"\{reason\}", ".+")
    assert re.fullmatch(f"fitamp: {pattern}", line), line
    assert code == expected_code


def test_every_refused_file_has_an_expected_line() -> None:
    assert set(EXPECTED) == set(BAD_SWEEPS) | set(BAD_DESIGNS)
    assert len(BAD_SWEEPS) + len(BAD_DESIGNS) + len(ODD_SWEEPS) > 200
    assert not set(OPTIONS_OF_BAD) - set(BAD_SWEEPS)


@pytest.mark.parametrize("name", BAD_SWEEPS)
def test_sweep_that_cannot_be_used_is_refused_in_one_line(capsys: Captured, tmp_path: Path, name: str) -> None:
    path = build(name, BAD_SWEEPS[name], tmp_path)
    before = contents(tmp_path)
    options = OPTIONS_OF_BAD.get(name, ())
    code, out, err = called(capsys, "fit", path, *options, "--out", tmp_path / "out")
    assert (out, err.count("\n")) == ("", 1)
    assert_is_expected(name, code, err.rstrip("\n"), path)
    assert not STEERING.search(err)
    assert contents(tmp_path) == before
    code, out, err = called(capsys, "read", path, *options)
    first, *place = err.splitlines()
    assert out == ""
    assert_is_expected(name, code, first, path)
    assert len(place) in {0, 2}
    assert all(len(line) <= 200 and not STEERING.search(line) for line in place)
    assert contents(tmp_path) == before


@pytest.mark.parametrize("name", BAD_DESIGNS)
def test_design_that_cannot_be_used_is_refused_in_one_line(capsys: Captured, tmp_path: Path, name: str) -> None:
    path = build(name, BAD_DESIGNS[name], tmp_path)
    before = contents(tmp_path)
    code, out, err = called(capsys, "compare", PART, "--design", path, "--out", tmp_path / "out")
    assert (out, err.count("\n")) == ("", 1)
    assert_is_expected(name, code, err.rstrip("\n"), path)
    assert not STEERING.search(err)
    assert contents(tmp_path) == before


def read_with(path: Path, options: Sequence[str]) -> Sweep:
    """Read as the command line would, but with the numbers at hand."""
    given = dict(zip(options[::2], options[1::2], strict=True))
    sweep = int(given["--sweep"]) if "--sweep" in given else None
    return read_sweep(path, columns=given.get("--columns"), trace=given.get("--trace"), sign=Sign.AS_READ, sweep=sweep)


@pytest.mark.parametrize("name", ODD_SWEEPS)
def test_odd_file_that_is_sound_is_read_exactly(capsys: Captured, tmp_path: Path, name: str) -> None:
    case = ODD_SWEEPS[name]
    path = build(name, case.content, tmp_path)
    before = contents(tmp_path)
    sweep = read_with(path, case.options)
    assert tuple(sweep.freq_hz.tolist()) == case.freq_hz
    assert tuple(sweep.gain.tolist()) == case.gain
    code, out, err = called(capsys, "read", path, "--sign", "as-read", *case.options)
    assert (code, err) == (0, "")
    assert not STEERING.search(out)
    assert contents(tmp_path) == before
    assert "<script" not in sweep._repr_html_()


def test_markup_and_formulas_are_shown_as_they_stand(capsys: Captured, tmp_path: Path) -> None:
    for name, shown in (
        ("markup_in_header.csv", "<script>alert(1)</script> re"),
        ("=cmd()[red]&amp;'$(x)`y`.csv", "=cmd()[red]&amp;'$(x)`y`.csv"),
        ("naïve 周波数 \N{RIGHT-TO-LEFT OVERRIDE}.csv", "naïve 周波数 \\u202e.csv"),
    ):
        path = build(name, ODD_SWEEPS[name].content, tmp_path)
        _, out, _ = called(capsys, "read", path, "--sign", "as-read")
        assert "".join(shown.split()) in "".join(out.split())


@pytest.mark.parametrize(("name", "most_mb"), [("huge.csv", 1), ("bomb.csv.gz", 20), ("many_lines.csv", 40)])
def test_file_that_is_too_large_is_refused_before_memory_goes(tmp_path: Path, name: str, most_mb: float) -> None:
    path = build(name, BAD_SWEEPS[name], tmp_path)
    tracemalloc.start()
    try:
        with pytest.raises(SweepError, match=r"that a sweep may have|no table of numbers does"):
            read_sweep(path)
        peak = tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()
    assert peak < most_mb * 1e6


def test_file_that_may_not_be_read_is_refused(
    capsys: Captured, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = build("a.csv", "freq_hz,re,im\n", tmp_path)

    def denied(_: Path, mode: str) -> object:
        raise PermissionError(13, f"Permission denied{mode[2:]}")

    monkeypatch.setattr(Path, "open", denied)
    code, out, err = called(capsys, "read", path)
    assert (code, out) == (3, "")
    assert err == f"fitamp: {path}: cannot be read (Permission denied); check the path and its permissions\n"


def test_corpus_can_be_written_to_look_at(capsys: Captured, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("make.BAD_SWEEPS", {"empty.csv": b""})
    assert main([str(tmp_path / "corpus")]) == 0
    assert capsys.readouterr().out.startswith("1 files in ")
    assert {"bad_sweeps/empty.csv", "odd_sweeps/german.csv", "bad_designs/deep.toml"} <= contents(tmp_path / "corpus")
    assert main([]) == 2
