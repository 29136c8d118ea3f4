"""The script that holds plans against simulated campaigns: the tables, a small run, and that it can be repeated."""

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
    yield importlib.import_module("plan_check")
    del sys.modules["plan_check"]


def run(script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], *options: str) -> str:
    monkeypatch.setattr(sys, "argv", ["plan_check.py", *options])
    script.main()
    return capsys.readouterr().out


def test_sets_promise_what_was_found_while_the_method_was_designed(
    script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    out = run(script, monkeypatch, capsys, "--runs", "0")
    rows = {line[:14].strip(): [float(word) for word in line[16:].split()] for line in reversed(out.splitlines()[3:7])}
    # gm1, R1, C1, gm2, R2, CL, Cc, Rz.
    assert rows["one sweep"] == pytest.approx([0.12, 0.16, 0.07, 0.13, 0.16, 0.12, 0.12, 0.07], abs=0.006)
    assert max(rows["both"]) < 0.02


@pytest.mark.parametrize("options", [(), ("--centre",)])
def test_a_campaign_is_the_same_each_time(
    script: ModuleType, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], options: tuple[str, ...]
) -> None:
    monkeypatch.setattr(script, "PARTS", 3)
    wanted = ("--runs", "2", "--sweeps", "2", "--seed", "3", *options)
    first, second = (run(script, monkeypatch, capsys, *wanted) for _ in range(2))
    assert first == second
    assert "2 campaigns of " in first
    assert "by chance" in first
    rows = first.splitlines()[-12:]
    assert [row[:14].strip() for row in rows] == [
        "gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz", "zero time", "pole 2", "gm2·Rz", "phase margin"
    ]  # fmt: skip
