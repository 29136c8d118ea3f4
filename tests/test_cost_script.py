"""The script that prints what an analysis costs: its lines, its profile, its refusals. Never a time."""

from __future__ import annotations

import importlib
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

SCRIPTS = Path(__file__).resolve().parent.parent / "scripts"


@pytest.fixture
def cost(monkeypatch: pytest.MonkeyPatch) -> Iterator[ModuleType]:
    """The script as a module, which is forgotten after the test."""
    known = set(sys.modules)
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    yield importlib.import_module("cost")
    for name in set(sys.modules) - known:
        if name.partition(".")[0] in {"cost", "benchmarking"}:
            del sys.modules[name]


def test_a_row_for_each_case_and_each_number_of_points(cost: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    assert cost.main(["--runs", "1", "--case", "left-zero", "design", "--points", "100", "300"]) == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[0] == "whole analysis over plain fit, medians of 1 sweeps of 281 points"
    assert lines[1].split() == ["case", "whole", "ms", "plain", "ms", "ratio"]
    assert [line.split()[0] for line in lines[2:5]] == ["left-zero", "design", "median"]
    for line in lines[2:4]:
        whole, plain, ratio = map(float, line.split()[1:])
        assert ratio == pytest.approx(whole / plain, rel=0.1)
    assert [line.split()[0] for line in lines[8:]] == ["100", "300"]


def test_a_profile_names_the_functions(cost: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    assert cost.main(["--runs", "1", "--case", "left-zero", "--profile"]) == 0
    printed = capsys.readouterr().out
    assert printed.startswith("left-zero: 1 sweeps")
    assert "(fit_sweep)" in printed


@pytest.mark.parametrize("arguments", [["--runs", "0"], ["--points", "20"], ["--case", "nothing"]])
def test_what_makes_no_sense_is_refused(
    cost: ModuleType, arguments: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as stopped:
        cost.main(arguments)
    assert stopped.value.code == 2
    assert "cost: error: " in capsys.readouterr().err
