"""The script that judges simulated dies: its regions, what it counts, and that a run can be repeated."""

from __future__ import annotations

import importlib
import math
import sys
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

import fitamp
from fitamp import Nulling

SCRIPTS = Path(__file__).resolve().parent.parent / "scripts"
NS = 1e-9


@pytest.fixture
def dies(monkeypatch: pytest.MonkeyPatch) -> Iterator[ModuleType]:
    """The script as a module, which is forgotten after the test."""
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    yield importlib.import_module("dies")
    del sys.modules["dies"]


def test_regions_tile_the_line_as_the_limits_say(dies: ModuleType) -> None:
    # 1/(2π·200 MHz) = 0.7958 ns, 1/(2π·90 MHz) = 1.7684 ns, a tenth of Cc/gm2 = 1.8 pF/1.6 mS is 0.1125 ns.
    places = {-2.0: "wrong-side", -0.11: "at-infinity", 0.11: "at-infinity", 0.12: "too-little", 0.79: "too-little"}
    places |= {-0.12: "wrong-side", 0.80: "as-designed", 1.76: "as-designed", 1.77: "too-much", 9.0: "too-much"}
    for zero_time_ns, region in places.items():
        assert a_die(dies, zero_time_s=zero_time_ns * NS).region == region


def a_die(dies: ModuleType, **changes: object) -> Any:
    """A die whose verdict is right and whose interval is narrow, with some things changed."""
    usual: dict[str, object] = {"product": 1.8, "zero_time_s": 0.9 * NS, "verdict": Nulling.AS_DESIGNED}
    usual |= {"stderr_s": 0.01 * NS, "low_s": 0.88 * NS, "high_s": 0.92 * NS, "seconds": 0.1}
    return dies.Die(**(usual | changes))


def test_a_small_zero_counts_for_either_half_plane(dies: ModuleType) -> None:
    small = a_die(dies, zero_time_s=0.1 * NS, verdict=Nulling.WRONG_SIDE)
    assert (small.is_wrong, small.is_wrong_half_plane) == (True, False)
    right = a_die(dies, zero_time_s=-0.2 * NS, verdict=Nulling.TOO_LITTLE)
    assert (right.is_wrong, right.is_wrong_half_plane) == (True, True)
    assert a_die(dies, verdict=Nulling.WRONG_SIDE).is_wrong_half_plane
    assert not a_die(dies, zero_time_s=-0.2 * NS, verdict=Nulling.AT_INFINITY).is_wrong_half_plane
    assert not a_die(dies, verdict=Nulling.UNDECIDED).is_wrong


def test_distance_is_that_of_the_truth_from_the_region_named(dies: ModuleType) -> None:
    edge_s = 1 / (2 * math.pi * 200e6)
    off = a_die(dies, zero_time_s=edge_s - 0.02 * NS)
    assert off.errors_off == pytest.approx(2.0)
    assert not off.is_clear
    assert a_die(dies, zero_time_s=edge_s + 0.04 * NS).is_clear
    # gm2·Rz within a quarter of 1 is not counted; a zero without a standard error is.
    assert not a_die(dies, zero_time_s=0.4 * NS, product=1.2).is_clear
    assert a_die(dies, zero_time_s=edge_s, stderr_s=None).is_clear


def test_an_open_interval_holds_all_on_its_side(dies: ModuleType) -> None:
    assert a_die(dies, low_s=None, high_s=None).covers
    assert a_die(dies, high_s=None).covers
    assert not a_die(dies, low_s=0.91 * NS, high_s=None).covers


def test_a_die_differs_by_its_seed_and_delay_alone_leaves_its_elements(dies: ModuleType) -> None:
    one, again, other, delayed = (
        dies.compare_die(1, seed=seed, delay_s=delay_s, delay_sd_s=delay_s / 20)
        for seed, delay_s in ((1, 0.0), (1, 0.0), (2, 0.0), (1, 0.4 * NS))
    )
    assert replace(one, seconds=0.0) == replace(again, seconds=0.0)
    assert one.zero_time_s != other.zero_time_s
    assert one.zero_time_s == delayed.zero_time_s
    # The second of the five resistors is missing: τz = −Cc/gm2.
    assert (one.product, one.region, one.verdict) == (0.0, Nulling.WRONG_SIDE, Nulling.WRONG_SIDE)


def test_a_fit_that_fails_is_counted_and_not_decided(dies: ModuleType, monkeypatch: pytest.MonkeyPatch) -> None:
    def failing(*_: object) -> None:
        raise fitamp.FitError("no")

    monkeypatch.setattr(fitamp, "compare", failing)
    found = dies.compare_die(0, seed=1, delay_s=0.0, delay_sd_s=0.0)
    assert (found.verdict, found.is_decided, found.covers) == (None, False, True)
    row = dies.table([found]).splitlines()[1].split()
    assert row == ["as-designed", *["0"] * 6, "1", "100.0%"]


def printed(dies: ModuleType, capsys: pytest.CaptureFixture[str], *arguments: str) -> list[str]:
    """Lines that a run of the script printed, without the times."""
    assert dies.main([*arguments]) == 0
    seen = capsys.readouterr()
    assert seen.err == ""
    return [line for line in str(seen.out).splitlines() if not line.startswith("median time")]


def test_a_run_prints_the_same_with_any_number_of_jobs(dies: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    alone = printed(dies, capsys, "--dies", "4", "--jobs", "1")
    assert printed(dies, capsys, "--dies", "4", "--jobs", "2") == alone
    heads = [line.split() for line in alone if line.startswith("true region")]
    assert heads == [["true", "region", *dies.REGIONS, "undecided", "no", "fit", "covered"]] * 2
    rows = [words for words in map(str.split, alone) if words and words[0] in dies.REGIONS]
    assert len(rows) == 2 * 5
    assert sum(int(cell) for row in rows for cell in row[1:-1]) == 2 * 4
    assert alone.count("wrong half plane: 0 of 4") == 2


def test_interrupting_leaves_one_line(
    dies: ModuleType, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(dies, "compare_die", interrupted)
    assert dies.main(["--dies", "2", "--jobs", "1"]) == 130
    assert capsys.readouterr().err == "dies: interrupted\n"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--dies", "0"], "'0' is not a whole number of 1 or more"),
        (["--jobs", "two"], "'two' is not a whole number of 1 or more"),
        (["--seed", "-1"], "'-1' is not a whole number of 0 or more"),
    ],
)
def test_unusable_options_are_refused(
    dies: ModuleType, capsys: pytest.CaptureFixture[str], arguments: list[str], message: str
) -> None:
    with pytest.raises(SystemExit, match="2"):
        dies.main(arguments)
    assert message in capsys.readouterr().err
