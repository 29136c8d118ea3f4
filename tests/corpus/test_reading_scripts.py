"""The scripts that try the readers: they run, count, and stop at what they look for."""

from __future__ import annotations

import importlib
import re
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

SCRIPTS = Path(__file__).resolve().parents[2] / "scripts"


def script(name: str, monkeypatch: pytest.MonkeyPatch, *arguments: str) -> Iterator[ModuleType]:
    """A script as a module with its command line set, forgotten after the test."""
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    monkeypatch.setattr(sys, "argv", [name, *arguments])
    yield importlib.import_module(name)
    del sys.modules[name]


@pytest.fixture
def fuzz(monkeypatch: pytest.MonkeyPatch) -> Iterator[ModuleType]:
    yield from script("fuzz", monkeypatch, "--files", "60", "--seed", "4")


@pytest.fixture
def read_speed(monkeypatch: pytest.MonkeyPatch) -> Iterator[ModuleType]:
    yield from script("read_speed", monkeypatch, "--rows", "300", "--runs", "1")


def test_fuzz_counts_all_files_and_tells_the_memory(fuzz: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    assert fuzz.main() == 0
    out = capsys.readouterr().out
    assert sum(map(int, re.findall(r"(\d+) files: ", out))) == 60
    assert re.search(r"peak memory \d+ MB of ", out)


def test_fuzz_stops_at_an_exception_that_is_not_fitamps(
    fuzz: ModuleType, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(path: Path) -> object:
        raise KeyError(path.name)

    monkeypatch.setattr(fuzz, "kinds", lambda: [fuzz.Kind("a.csv", [b"1,2\n"], broken)])
    assert fuzz.main() == 1
    captured = capsys.readouterr()
    assert captured.out.startswith("file 0 of seed 4, as a.csv: b")
    assert "KeyError: 'a.csv'" in captured.err


def test_read_speed_prints_ratios(read_speed: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    read_speed.main()
    out = capsys.readouterr().out
    assert len(re.findall(r"\d\.\d\d     ratio", out)) == 2
    assert out.count("fitamp.read_sweep, told nothing") == 2
