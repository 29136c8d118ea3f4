"""The benchmark: its bound against algebra and brute force, its rational fits on clean data, and what it prints."""

from __future__ import annotations

import importlib
import math
import sys
from collections.abc import Callable, Iterator
from operator import itemgetter
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

import fitamp

SCRIPTS = Path(__file__).resolve().parent.parent / "scripts"
TRUTH = {"dc_gain": 100.0, "pole1_hz": 1e4, "pole2_hz": 5e6, "zero_time_s": 1e-8}
RELATIVE_ONLY = fitamp.NoiseLevels(error_channel=0.0, return_channel=0.0, relative=1e-3)


@pytest.fixture
def script(monkeypatch: pytest.MonkeyPatch) -> Iterator[Callable[[str], ModuleType]]:
    """Importer of modules in scripts/, which are forgotten after the test."""
    known = set(sys.modules)
    monkeypatch.setattr(sys, "path", [str(SCRIPTS), *sys.path])
    yield importlib.import_module
    for name in set(sys.modules) - known:
        if name.partition(".")[0] in {"benchmark", "benchmarking"}:
            del sys.modules[name]


@pytest.fixture
def bound(script: Callable[[str], ModuleType]) -> ModuleType:
    """The module that computes the bound."""
    return script("benchmarking.bound")


@pytest.fixture
def benchmark(script: Callable[[str], ModuleType]) -> ModuleType:
    """The script as a module."""
    return script("benchmark")


def test_bound_of_gain_alone_is_the_mean_of_n_complex_readings(bound: ModuleType) -> None:
    # n readings T0·(1 + e)·shape, e complex with standard deviation r: 2n real ones of r/√2 each, so T0·r/√(2n).
    freq_hz = np.geomspace(1e2, 1e7, 40)
    found = bound.cramer_rao(freq_hz, TRUTH, RELATIVE_ONLY, [itemgetter("dc_gain")], free=("dc_gain",))
    assert found[0] == pytest.approx(100.0 * 1e-3 / math.sqrt(2 * 40), rel=1e-6)


def test_bound_of_delay_alone_and_with_a_prior(bound: ModuleType) -> None:
    # ln T moves by −jω per second of delay: information Σ ω²·2/r²; a prior adds 1/sd².
    freq_hz = np.geomspace(1e2, 1e7, 40)
    truth, delay = {**TRUTH, "delay_s": 1e-9}, [itemgetter("delay_s")]
    information = float(((2 * math.pi * freq_hz) ** 2).sum()) * 2 / 1e-3**2
    plain = bound.cramer_rao(freq_hz, truth, RELATIVE_ONLY, delay, free=("delay_s",))
    assert plain[0] == pytest.approx(information**-0.5, rel=1e-4)
    prior = bound.GaussianPrior(weights={"delay_s": 1.0}, sd=information**-0.5)
    told = bound.cramer_rao(freq_hz, truth, RELATIVE_ONLY, delay, free=("delay_s",), priors=(prior,))
    assert told[0] == pytest.approx((2 * information) ** -0.5, rel=1e-4)


def test_zero_on_pole_2_leaves_the_split_and_no_pole_2(bound: ModuleType) -> None:
    # A pole and a zero on one another cancel wherever they are: no sweep can say where.
    truth = {**TRUTH, "zero_time_s": 1 / (2 * math.pi * TRUTH["pole2_hz"])}
    found = bound.cramer_rao(
        np.geomspace(1e2, 1e7, 40),
        truth,
        RELATIVE_ONLY,
        [itemgetter("pole2_hz"), lambda t: t["zero_time_s"] - 1 / (2 * math.pi * t["pole2_hz"]), itemgetter("dc_gain")],
    )
    assert found[0] == np.inf
    assert 0 < found[1] < 1e-2 * truth["zero_time_s"]
    assert 0 < found[2] < 100.0 * 1e-3


def test_maximum_likelihood_scatters_as_the_bound_says(bound: ModuleType) -> None:
    # Brute force: 500 small sweeps with all three kinds of noise, fitted by scipy with the true weights. The scatter of
    # 500 is itself known to 1/√1000 = 3 %; four of these.
    from scipy.optimize import least_squares

    freq_hz, rng = np.geomspace(1e3, 1e6, 15), np.random.default_rng(5)
    noise = fitamp.NoiseLevels(error_channel=2e-5, return_channel=5e-4, relative=2e-3)
    gain = bound.loop_gain(freq_hz, TRUTH)
    sd = np.abs(1 + gain) * np.sqrt(4e-10 * np.abs(gain) ** 2 + 25e-8 + 4e-6 * np.abs(gain / (1 + gain)) ** 2)

    def residual(logs: np.ndarray, reading: np.ndarray) -> np.ndarray:
        dc_gain, pole1_hz = np.exp(logs)
        model = dc_gain * (1 + 2j * np.pi * freq_hz * 1e-8) / ((1 + 1j * freq_hz / pole1_hz) * (1 + 1j * freq_hz / 5e6))
        weighted = (reading - model) / sd
        return np.concatenate([weighted.real, weighted.imag])

    start = np.log([100.0, 1e4])
    found = [
        np.exp(least_squares(residual, start, args=(fitamp.simulate_bench(gain, noise, rng),)).x) for _ in range(500)
    ]
    names = ("dc_gain", "pole1_hz")
    expected = bound.cramer_rao(freq_hz, TRUTH, noise, [itemgetter(name) for name in names], free=names)
    assert np.std(found, axis=0) == pytest.approx(expected, rel=0.12)


@pytest.mark.parametrize("name", ["left-zero", "right-zero", "pole2-above", "third-pole", "resonance"])
def test_rational_fits_are_right_without_noise(
    script: Callable[[str], ModuleType], bound: ModuleType, name: str
) -> None:
    # That they fail on noisy sweeps is then the noise, and not how they are called.
    rational, scenario = script("benchmarking.rational"), script("benchmarking.scenarios").SCENARIOS[name]
    gain = bound.loop_gain(scenario.freq_hz, scenario.truth)
    for fit in (rational.vector_fit_roots, rational.aaa_roots):
        found = fit(scenario.freq_hz, gain, real_poles=scenario.real_poles, pairs=scenario.pairs)
        assert found == pytest.approx({key: scenario.truth[key] for key in found}, rel=1e-5)


def test_third_pole_lies_at_3_times_the_top_and_scatters_as_the_prior_says(
    script: Callable[[str], ModuleType],
) -> None:
    scenario = script("benchmarking.scenarios").SCENARIOS["third-pole"]
    hertz = 1 / (2 * math.pi * scenario.truth["far_pole_s"]) - scenario.truth["pole1_hz"] - scenario.truth["pole2_hz"]
    assert hertz == pytest.approx(3 * scenario.freq_hz[-1], rel=1e-3)
    line = scenario.far_pole
    at_truth = line.intercept_s + line.slope * scenario.truth["zero_time_s"]
    assert at_truth == pytest.approx(scenario.truth["far_pole_s"], rel=1e-9)
    rng = np.random.default_rng(3)
    drawn = [scenario.draw(rng)["far_pole_s"] for _ in range(400)]
    assert np.std(drawn) == pytest.approx(line.sd_s, rel=0.15)


def printed(benchmark: ModuleType, capsys: pytest.CaptureFixture[str], *arguments: str) -> list[str]:
    """Lines that a run of the script printed."""
    assert benchmark.main([*arguments]) == 0
    seen = capsys.readouterr()
    assert seen.err == ""
    return str(seen.out).splitlines()


def without_times(lines: list[str]) -> list[list[str]]:
    """Words of a table's lines without the last two, milliseconds and cost."""
    return [line.split()[:-2] for line in lines]


def test_one_scenario_prints_a_row_for_every_method(benchmark: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    lines = printed(benchmark, capsys, "--runs", "2", "--scenario", "right-zero")
    # 1/√4 and 1/√2.
    assert lines[0] == "2 noisy sweeps a scenario, seed 1; chance leaves ±50% in RMSE/bound, ±0.71 in bias/bound"
    assert lines[2] == "right-zero: zero at 2 × pole 2, right half plane"
    assert lines[4].split() == ["T0", "p1", "p2", "τz"] * 3 + ["failed", "ms", "cost"]
    starts = ["fitamp", "lmfit dB, °", "lmfit log", "vector fit", "AAA"]
    assert [line[:11].strip() for line in lines[5:10]] == starts
    assert all(len(line) <= 100 for line in lines)
    own = lines[5].split()
    assert len(own) == 1 + 3 * 4 + 3
    # An efficient estimator is nowhere five bounds off.
    assert all(float(cell) < 5 for cell in own[1:5])
    assert own[-3] == "0%"


def test_the_same_seed_gives_the_same_table(benchmark: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    arguments = ("--runs", "2", "--scenario", "delay", "--seed", "7")
    first = without_times(printed(benchmark, capsys, *arguments))
    assert without_times(printed(benchmark, capsys, *arguments)) == first
    # A method's row does not depend on which others run; another seed's does.
    alone = without_times(printed(benchmark, capsys, *arguments, "--methods", "lmfit-log"))
    row = next(words for words in alone if words[:2] == ["lmfit", "log"])
    assert row in first
    other = printed(benchmark, capsys, *arguments[:-1], "8", "--methods", "lmfit-log")
    assert row not in without_times(other)


def test_markdown_has_one_row_a_method(benchmark: ModuleType, capsys: pytest.CaptureFixture[str]) -> None:
    arguments = ("--runs", "1", "--scenario", "pole1-below", "--methods", "lmfit-log", "aaa", "--markdown")
    lines = printed(benchmark, capsys, *arguments)
    assert lines[2] == "| scenario | method | worst error/bound | coverage | failed | cost |"
    assert lines[3] == "|---|---|---:|---:|---:|---:|"
    assert [line.split(" | ")[:2] for line in lines[4:]] == [["| pole1-below", "lmfit log"], ["| pole1-below", "AAA"]]
    assert lines[5] == "| pole1-below | AAA | – | – | 100 % | – |"


def test_what_a_method_raises_is_its_failure(
    benchmark: ModuleType, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    methods = importlib.import_module("benchmarking.methods")

    def raising(*_: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setitem(methods.METHODS, methods.Method.LMFIT_LOG, raising)
    lines = printed(benchmark, capsys, "--runs", "2", "--scenario", "left-zero", "--methods", "lmfit-log")
    assert lines[5].split()[:-2] == ["lmfit", "log", *["–"] * 12, "100%"]


def test_interrupting_leaves_one_line(
    benchmark: ModuleType, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    methods = importlib.import_module("benchmarking.methods")

    def interrupted(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setitem(methods.METHODS, methods.Method.AAA, interrupted)
    assert benchmark.main(["--runs", "2", "--methods", "aaa"]) == 130
    assert capsys.readouterr().err == "benchmark: interrupted\n"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--runs", "0"], "'0' is not a whole number of 1 or more"),
        (["--seed", "-1"], "'-1' is not a whole number of 0 or more"),
        (["--scenario", "nowhere"], "invalid choice: 'nowhere'"),
    ],
)
def test_unusable_options_are_refused(
    benchmark: ModuleType, capsys: pytest.CaptureFixture[str], arguments: list[str], message: str
) -> None:
    with pytest.raises(SystemExit, match="2"):
        benchmark.main(arguments)
    assert message in capsys.readouterr().err
