"""Files of the command line to one sweep: repeats averaged, path delay stated or from a through sweep."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fitamp import read_design, simulate_bench, write_sweep
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.cli import main
from fitamp.errors import SweepError, UsageError
from fitamp.measured import Reading, measured
from fitamp.options import StatedDelay
from fitamp.sweep import Concern, NoiseLevels, Sign, Sweep

Captured = pytest.CaptureFixture[str]
FREQ_HZ: FloatArray = np.geomspace(10.0, 200e6, 121)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
DELAY_S = 0.5e-9
DESIGN = Path(__file__).resolve().parent.parent / "data_examples" / "line_buffer.toml"


def chip(delay_s: float = DELAY_S) -> ComplexArray:
    """The example design on its bench, behind cables of another delay."""
    design = read_design(DESIGN)
    stated_s = design.bench.delay_s or 0.0
    turned = np.exp(-2j * np.pi * FREQ_HZ * (delay_s - stated_s))
    return np.asarray(design.on_bench().evaluate(FREQ_HZ) * turned)


@pytest.fixture(scope="module")
def bench(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with three repeats, one of them once more but drifted, and through sweeps of both signs."""
    folder = tmp_path_factory.mktemp("bench")
    rng = np.random.default_rng(11)
    for name, factor in (("a", 1.0), ("b", 1.0), ("c", 1.0), ("drifted", 1.01)):
        gain = simulate_bench(chip(), NOISE, rng) * factor
        write_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain, sign=Sign.AS_READ), folder / f"{name}.csv")
    for name, delay_s, slope in (("through", DELAY_S, 0.0), ("early", -DELAY_S, 0.0), ("sagging", DELAY_S, 1 / 1e9)):
        noise = 1e-3 * (rng.standard_normal(121) + 1j * rng.standard_normal(121))
        gain = np.exp(-2j * np.pi * FREQ_HZ * delay_s) / (1 + slope * FREQ_HZ) + noise
        write_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain, sign=Sign.AS_READ), folder / f"{name}.csv")
    return folder


def files(bench: Path, *names: str) -> list[str]:
    return [str(bench / f"{name}.csv") for name in names]


def called(capsys: Captured, *arguments: str | Path) -> tuple[int, str, str]:
    code = main([str(argument) for argument in arguments])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def record_of(capsys: Captured, *arguments: str | Path) -> dict[str, Any]:
    code, out, err = called(capsys, *arguments, "--json", "-")
    assert (code, err) == (0, "")
    record: dict[str, Any] = json.loads(out)
    return record


def test_one_file_is_read_as_ever(bench: Path) -> None:
    found = measured(files(bench, "a"), Reading())
    assert found.sweep.origin.averaged == ()
    assert found.delay is None
    assert found.priors == {}


def test_a_stated_delay_frees_the_third_pole(bench: Path) -> None:
    found = measured(files(bench, "a"), Reading(), delay="0.5 ns +- 0.1 ns", noise="relative=1e-3")
    assert found.sweep.noise is not None
    assert found.delay == StatedDelay(delay_s=0.5e-9, sd_s=0.1e-9)
    assert found.priors["far_pole"].sd_s == np.inf
    assert measured(files(bench, "a"), Reading(), delay="free").priors == {}


def test_a_measured_delay_is_a_prior_with_its_error(bench: Path) -> None:
    found = measured(files(bench, "a"), Reading(), through=files(bench, "through")[0])
    prior = found.priors["delay"]
    assert prior.mean_s == pytest.approx(DELAY_S, abs=4 * prior.sd_s)
    assert 0 < prior.sd_s < 2e-12
    (said,) = (decision for decision in found.sweep.decisions if decision.concern is Concern.RESULT)
    assert said.topic == "delay"
    assert said.reason == f"measured with a through sweep {bench / 'through.csv'}"


def test_a_negative_delay_is_taken_out_of_the_sweep(bench: Path) -> None:
    plain = measured(files(bench, "a"), Reading()).sweep
    found = measured(files(bench, "a"), Reading(), through=files(bench, "early")[0])
    assert found.through is not None
    assert found.through.delay_s < 0
    assert found.priors["delay"].mean_s == 0.0
    # The path leads by 0.5 ns; without it the loop lags by as much more.
    turn = np.angle(found.sweep.gain[-1] / plain.gain[-1])
    assert turn == pytest.approx(2 * np.pi * FREQ_HZ[-1] * found.through.delay_s, rel=1e-9)
    assert found.sweep.decisions[-1].reason.endswith("and taken out of the sweep")


def test_the_design_takes_the_measured_delay_and_a_contradiction_is_said(bench: Path) -> None:
    design = read_design(DESIGN)
    found = measured(files(bench, "a"), Reading(), through=files(bench, "through")[0])
    sweep, taken = found.on_bench_of(design)
    assert taken.bench.delay_s == found.priors["delay"].mean_s
    assert taken.bench.load_f == design.bench.load_f
    assert sweep.decisions[-1].topic == "stated delay"
    assert sweep.decisions[-1].concern is Concern.CAUTION
    assert "states" in sweep.decisions[-1].reason
    assert measured(files(bench, "a"), Reading()).on_bench_of(design)[1] is design


def test_a_delay_that_is_stated_and_measured_is_a_usage_error(bench: Path) -> None:
    with pytest.raises(UsageError, match="--delay states what --through measures; give one of them"):
        measured(files(bench, "a"), Reading(), delay="0 ns", through=files(bench, "through")[0])


def test_a_loop_gain_for_a_through_sweep_is_refused(bench: Path) -> None:
    with pytest.raises(SweepError, match=r"b\.csv: this is no through sweep: its magnitude runs from"):
        measured(files(bench, "a"), Reading(), through=files(bench, "b")[0])


def test_fit_averages_its_files_and_says_so(bench: Path, capsys: Captured) -> None:
    code, out, _ = called(capsys, "fit", *files(bench, "a", "b", "c"))
    assert code == 0
    assert "repeats: average of 3 (" in out
    assert "(from 3 repeats)" in out.replace("\n", " ")
    record = record_of(capsys, "fit", *files(bench, "a", "b", "c"))
    assert record["noise"]["source"] == "from 3 repeats"
    assert [repeat["file"] for repeat in record["sweep"]["repeats"]] == files(bench, "a", "b", "c")
    assert all(len(repeat["sha256"]) == 64 for repeat in record["sweep"]["repeats"])
    assert record["through"] is None
    assert not [warning for warning in record["warnings"] if "repeats" in warning["code"]]


def test_a_drift_stands_among_the_warnings(bench: Path, capsys: Captured) -> None:
    record = record_of(capsys, "fit", *files(bench, "a", "b", "drifted"))
    (warning,) = (warning for warning in record["warnings"] if warning["code"] == "drift-of-repeats")
    assert warning["message"].startswith(f"{bench / 'drifted.csv'} departs from the others: most from ")
    _, out, _ = called(capsys, "compare", *files(bench, "a", "b", "drifted"), "--design", DESIGN, "--delay", "0.5 ns")
    assert "note (drift-of-repeats): " in out


def test_compare_with_a_through_sweep(bench: Path, capsys: Captured) -> None:
    through = files(bench, "through")[0]
    arguments: tuple[str | Path, ...] = ("compare", *files(bench, "a", "b"), "--design", DESIGN, "--through", through)
    record = record_of(capsys, *arguments)
    assert record["verdict"]["nulling"] == "as-designed"
    assert record["through"]["delay_s"] == pytest.approx(DELAY_S, abs=4 * record["through"]["stderr_s"])
    assert record["through"]["pure_delay"] is True
    assert {"stated-delay"} == {warning["code"] for warning in record["warnings"]} & {"stated-delay", "through-sweep"}
    _, out, _ = called(capsys, *arguments)
    # Long names are broken anywhere.
    assert f"ps(measuredwithathroughsweep{through})" in "".join(out.split())


def test_a_through_sweep_that_sags_is_said(bench: Path, capsys: Captured) -> None:
    record = record_of(capsys, "fit", *files(bench, "a"), "--through", *files(bench, "sagging"))
    (warning,) = (warning for warning in record["warnings"] if warning["code"] == "through-sweep")
    assert "departs from a pure delay: " in warning["message"]
    assert "magnitude −" in warning["message"]
    assert {one["kind"] for one in record["through"]["departures"]} >= {"magnitude"}


def test_read_shows_the_average_on_request(bench: Path, capsys: Captured) -> None:
    record = record_of(capsys, "read", "--repeats", *files(bench, "a", "b"))
    (shown,) = record["sweeps"]
    assert len(shown["sweep"]["repeats"]) == 2
    assert shown["sweep"]["noise"]["source"] == "from 2 repeats"
    _, out, _ = called(capsys, "read", "--repeats", *files(bench, "a", "drifted"))
    assert "drift of repeats" in out
    assert len(record_of(capsys, "read", *files(bench, "a", "b"))["sweeps"]) == 2


def test_repeats_in_one_file_are_averaged_on_request(tmp_path: Path, capsys: Captured) -> None:
    rng = np.random.default_rng(5)
    lines = ["run,frequency (Hz),magnitude (dB),phase (deg)"]
    for run in (1, 2):
        gain = simulate_bench(chip(), NOISE, rng)
        rows = zip(FREQ_HZ, 20 * np.log10(np.abs(gain)), np.degrees(np.angle(gain)), strict=True)
        lines += [f"{run},{f!r},{size!r},{phase!r}" for f, size, phase in (map(float, row) for row in rows)]
    path = tmp_path / "runs.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    record = record_of(capsys, "fit", "--repeats", path)
    assert record["noise"]["source"] == "from 2 repeats"
    assert record["sweep"]["points_used"] <= 121


def test_files_of_other_frequencies_are_refused_in_one_line(bench: Path, tmp_path: Path, capsys: Captured) -> None:
    other = tmp_path / "other.csv"
    write_sweep(Sweep(freq_hz=FREQ_HZ * 1.1, gain=chip(), sign=Sign.AS_READ), other)
    code, out, err = called(capsys, "fit", *files(bench, "a"), other)
    assert (code, out) == (3, "")
    assert err.endswith("repeats have the same frequencies\n")
    assert err.count("\n") == 1
