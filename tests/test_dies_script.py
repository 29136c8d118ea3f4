"""The script that judges simulated dies: its regions, what it makes and counts, and that a run can be repeated."""

from __future__ import annotations

import importlib
import math
import sys
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

import fitamp
from fitamp import Nulling
from fitamp.comparison import Route

SCRIPTS = Path(__file__).resolve().parent.parent / "scripts"
NS = 1e-9


@pytest.fixture
def script(monkeypatch: pytest.MonkeyPatch) -> Iterator[Callable[[str], ModuleType]]:
    """Modules of the script, which are forgotten after the test."""
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    yield importlib.import_module
    for name in list(sys.modules):
        if name.partition(".")[0] in {"dies", "judging"}:
            del sys.modules[name]


@pytest.fixture
def dies(script: Callable[[str], ModuleType]) -> ModuleType:
    """The script as a module."""
    return script("dies")


@pytest.fixture
def judged(script: Callable[[str], ModuleType]) -> ModuleType:
    """What judges one die."""
    return script("judging.judged")


@pytest.fixture
def making(script: Callable[[str], ModuleType]) -> ModuleType:
    """What makes one die."""
    return script("judging.making")


def test_regions_tile_the_line_as_the_limits_say(judged: ModuleType) -> None:
    # 1/(2π·200 MHz) = 0.7958 ns, 1/(2π·90 MHz) = 1.7684 ns, a tenth of Cc/gm2 = 1.8 pF/1.6 mS is 0.1125 ns.
    places = {-2.0: "wrong-side", -0.11: "at-infinity", 0.11: "at-infinity", 0.12: "too-little", 0.79: "too-little"}
    places |= {-0.12: "wrong-side", 0.80: "as-designed", 1.76: "as-designed", 1.77: "too-much", 9.0: "too-much"}
    for zero_time_ns, region in places.items():
        assert a_die(judged, zero_time_s=zero_time_ns * NS).region == region


def a_die(judged: ModuleType, **changes: object) -> Any:
    """A die whose verdict is right and whose interval is narrow, with some things changed."""
    usual: dict[str, object] = {"product": 1.8, "zero_time_s": 0.9 * NS, "verdict": Nulling.AS_DESIGNED}
    usual |= {"estimate_s": 0.9 * NS, "stderr_s": 0.01 * NS, "low_s": 0.88 * NS, "high_s": 0.92 * NS}
    return judged.Judged(**(usual | {"expected_s": 0.01 * NS, "route": Route.CIRCUIT} | changes))


def test_a_small_zero_counts_for_either_half_plane(judged: ModuleType) -> None:
    small = a_die(judged, zero_time_s=0.1 * NS, verdict=Nulling.WRONG_SIDE)
    assert (small.is_wrong, small.is_wrong_half_plane) == (True, False)
    right = a_die(judged, zero_time_s=-0.2 * NS, verdict=Nulling.TOO_LITTLE)
    assert (right.is_wrong, right.is_wrong_half_plane) == (True, True)
    assert a_die(judged, verdict=Nulling.WRONG_SIDE).is_wrong_half_plane
    assert not a_die(judged, zero_time_s=-0.2 * NS, verdict=Nulling.AT_INFINITY).is_wrong_half_plane
    assert not a_die(judged, verdict=Nulling.UNDECIDED).is_wrong


def test_distance_is_that_of_the_truth_from_the_region_named(judged: ModuleType) -> None:
    edge_s = 1 / (2 * math.pi * 200e6)
    off = a_die(judged, zero_time_s=edge_s - 0.02 * NS)
    assert off.errors_off == pytest.approx(2.0)
    assert not off.is_clear
    assert a_die(judged, zero_time_s=edge_s + 0.04 * NS).is_clear
    # gm2·Rz within a quarter of 1 is not counted; and no route excuses itself by being less certain.
    assert not a_die(judged, zero_time_s=0.4 * NS, product=1.2).is_clear
    assert a_die(judged, zero_time_s=edge_s + 0.04 * NS, stderr_s=0.1 * NS).is_clear
    assert a_die(judged, zero_time_s=edge_s + 0.04 * NS, stderr_s=None).is_clear


def test_an_open_interval_holds_all_on_its_side(judged: ModuleType) -> None:
    assert a_die(judged, low_s=None, high_s=None).covers
    assert a_die(judged, high_s=None).covers
    assert not a_die(judged, low_s=0.91 * NS, high_s=None).covers


def test_errors_count_from_the_truth(judged: ModuleType) -> None:
    assert a_die(judged, estimate_s=0.92 * NS).pull == pytest.approx(2.0)
    assert a_die(judged, stderr_s=None).pull is None
    assert a_die(judged, estimate_s=None).pull is None


def test_a_die_differs_by_its_seed_and_delay_alone_leaves_its_elements(judged: ModuleType) -> None:
    one, again, other, delayed = (
        judged.compare_die(1, lot=judged.Lot.RESISTORS, seed=seed, delay_s=delay_s, delay_sd_s=delay_s / 20)
        for seed, delay_s in ((1, 0.0), (1, 0.0), (2, 0.0), (1, 0.4 * NS))
    )
    assert replace(one, seconds=0.0) == replace(again, seconds=0.0)
    assert one.compared.zero_time_s != other.compared.zero_time_s
    assert one.compared.zero_time_s == delayed.compared.zero_time_s
    # The second of the five resistors is missing: τz = −Cc/gm2.
    for route, said in ((Route.CIRCUIT, one.compared), (Route.BEHAVIOUR, one.behaviour)):
        assert (said.product, said.region, said.verdict) == (0.0, Nulling.WRONG_SIDE, Nulling.WRONG_SIDE)
        assert said.route is route


def test_zeros_near_a_limit_lie_within_six_standard_errors_of_each_on_both_sides(making: ModuleType) -> None:
    # The standard error is that at the limit; on the way to the zero it changes by less than a tenth.
    edges, seen = making.edges_s(), set()
    for index in range(24):
        rng = np.random.default_rng([1, index])
        die = making.made(making.Lot.LIMITS, index, rng, delay_s=0.0, delay_sd_s=0.0)
        nearest = min(range(len(edges)), key=lambda i: abs(die.zero_time_s - edges[i]))
        distance_s = die.zero_time_s - edges[nearest]
        assert abs(distance_s) < 6.6 * making.expected_stderr_s(die, making.design(0.0, 0.0))
        seen.add((nearest, distance_s > 0))
    assert seen == {(i, side) for i in range(4) for side in (True, False)}


def test_what_is_expected_of_the_zero_time_is_what_estimates_scatter_by(judged: ModuleType, making: ModuleType) -> None:
    # 16 pulls over the expected error have a root mean square of 1 ± 0.18.
    found = [
        judged.compare_die(index, lot=making.Lot.LIMITS, seed=5, delay_s=0.4 * NS, delay_sd_s=0.02 * NS).compared
        for index in range(16)
    ]
    pulls = [(die.estimate_s - die.zero_time_s) / die.expected_s for die in found]
    assert 0.55 < np.sqrt(np.mean(np.square(pulls))) < 1.45


def test_a_fit_that_fails_is_counted_and_not_decided(
    judged: ModuleType, script: Callable[[str], ModuleType], monkeypatch: pytest.MonkeyPatch
) -> None:
    def failing(*_: object) -> None:
        raise fitamp.FitError("no")

    monkeypatch.setattr(fitamp, "compare", failing)
    found = judged.compare_die(0, lot=judged.Lot.RESISTORS, seed=1, delay_s=0.0, delay_sd_s=0.0).compared
    assert (found.verdict, found.route, found.is_decided, found.covers) == (None, None, False, True)
    row = script("judging.tables").table([found]).splitlines()[1].split()
    assert row == ["as-designed", *["0"] * 6, "1", "100.0%", "–"]


def printed(dies: ModuleType, capsys: pytest.CaptureFixture[str], *arguments: str) -> list[str]:
    """Lines that a run of the script printed, without the times."""
    assert dies.main([*arguments]) == 0
    seen = capsys.readouterr()
    assert seen.err == ""
    return [line for line in str(seen.out).splitlines() if not line.startswith("median time")]


def test_a_run_prints_the_same_with_any_number_of_jobs(
    dies: ModuleType, judged: ModuleType, capsys: pytest.CaptureFixture[str]
) -> None:
    alone = printed(dies, capsys, "--dies", "3", "--near", "2", "--jobs", "1")
    assert printed(dies, capsys, "--dies", "3", "--near", "2", "--jobs", "2") == alone
    heads = [line.split() for line in alone if line.startswith("true region")]
    # Two lots, two delays, two routes.
    assert heads == [["true", "region", *judged.REGIONS, "undecided", "no", "fit", "covered", "bias"]] * 8
    rows = [words for words in map(str.split, alone) if words and words[0] in judged.REGIONS]
    assert len(rows) == 8 * 5
    assert sum(int(cell) for row in rows for cell in row[1:-2]) == 4 * (3 + 2)
    assert alone.count("wrong half plane: 0 of 3") == 4
    assert alone.count("wrong half plane: 0 of 2") == 4
    assert alone.count("two poles and a zero alone") == 4


def test_a_lot_of_none_is_left_out(dies: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    lines = printed(dies, capsys, "--dies", "1", "--near", "0", "--jobs", "1")
    assert not any("of a limit" in line for line in lines)
    assert sum(line.startswith("1 dies: resistor intact") for line in lines) == 2


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
        (["--dies", "few"], "'few' is not a whole number of 0 or more"),
        (["--jobs", "0"], "'0' is not a whole number of 1 or more"),
        (["--seed", "-1"], "'-1' is not a whole number of 0 or more"),
    ],
)
def test_unusable_options_are_refused(
    dies: ModuleType, capsys: pytest.CaptureFixture[str], arguments: list[str], message: str
) -> None:
    with pytest.raises(SystemExit, match="2"):
        dies.main(arguments)
    assert message in capsys.readouterr().err
