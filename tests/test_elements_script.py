"""The script that prints how sure element values are: small runs of it, and that it can be repeated."""

from __future__ import annotations

import importlib
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

SCRIPTS = Path(__file__).resolve().parent.parent / "scripts"


@pytest.fixture
def script(monkeypatch: pytest.MonkeyPatch) -> Iterator[ModuleType]:
    """The script as a module, which is forgotten after the test."""
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    yield importlib.import_module("elements")
    del sys.modules["elements"]


def run(script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], *options: str) -> str:
    monkeypatch.setattr(sys, "argv", ["elements.py", *options])
    script.main()
    return capsys.readouterr().out


def test_plans_print_the_precision_to_be_expected(
    script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    out = run(script, monkeypatch, capsys, "--single", "0", "--stepped", "0", "--timed", "0")
    rows = [line for line in out.splitlines() if line.startswith("one sweep")]
    # gm1, R1, C1, gm2, R2, CL, Cc, Rz, as found while the method was designed.
    numbers = [float(word) for word in rows[0].split()[2:]]
    assert numbers == pytest.approx([0.12, 0.16, 0.07, 0.13, 0.16, 0.12, 0.12, 0.07], abs=0.006)


def test_a_campaign_is_the_same_each_time(
    script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    options = ("--single", "2", "--stepped", "1", "--seed", "3", "--timed", "0")
    first, second = (run(script, monkeypatch, capsys, *options) for _ in range(2))
    assert first == second
    lines = first.splitlines()
    assert sum(line.startswith("zero time") for line in lines) == 2
    assert "2 single sweeps, seed 3" in first
    assert "1 parts in five steps, seed 3" in first
