"""`fitamp loop`: raw records to a sweep that reads back to the bit; one line of error, output whole or not at all."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from fitamp import read_sweep
from fitamp.arrays import ComplexArray
from fitamp.cli import main
from fitamp.importers import write_sweep
from fitamp.loopgain import double_injection, read_receivers, read_two_port_loop
from fitamp.sweep import Sign, Sweep

# Invented: T(0) = 80 dB, poles at 1.1 kHz and 40 MHz, zero at 130 MHz in the left half plane.
FREQ_HZ = np.geomspace(10.0, 100e6, 141)
GAIN: ComplexArray = 1e4 * (1 + 1j * FREQ_HZ / 130e6) / (1 + 1j * FREQ_HZ / 1.1e3) / (1 + 1j * FREQ_HZ / 40e6)
RECEIVERS = "f=1:Hz error_re=2 error_im=3 return_re=4 return_im=5"

Captured = pytest.CaptureFixture[str]


@pytest.fixture
def receivers(tmp_path: Path) -> Path:
    """Receivers' real and imaginary parts, the return receiver with the loop's inversion in it."""
    rows = [
        f"{f!r},{e.real!r},{e.imag!r},{r.real!r},{r.imag!r}"
        for f, e, r in zip(FREQ_HZ.tolist(), (1 / (1 + GAIN)).tolist(), (-GAIN / (1 + GAIN)).tolist(), strict=True)
    ]
    path = tmp_path / "rec.csv"
    path.write_text("\n".join(["part 7, invented", "f (Hz),a,b,c,d", *rows, ""]), encoding="utf-8")
    return path


@pytest.fixture
def injections(tmp_path: Path) -> tuple[Path, Path]:
    """Voltage and current records at an impedance ratio of 0.5."""
    paths = tmp_path / "v.csv", tmp_path / "i.csv"
    for path, ratio in zip(paths, (0.5, 2.0), strict=True):
        write_sweep(Sweep(freq_hz=FREQ_HZ, gain=GAIN * (1 + ratio) + ratio, sign=Sign.AS_READ), path)
    return paths


@pytest.fixture
def two_port(tmp_path: Path) -> Path:
    """A loop that goes one way and inverts: V2/V1 = S21/(1 − S11·S22) where it ends in itself."""
    path = tmp_path / "open.s2p"
    rows = [
        f"{f!r} 0.5 0 {s.real!r} {s.imag!r} 0 0 0.2 0"
        for f, s in zip(FREQ_HZ.tolist(), (-0.9 * GAIN).tolist(), strict=True)
    ]
    path.write_text("\n".join(["# Hz S RI R 50", *rows, ""]), encoding="utf-8")
    return path


def called(capsys: Captured, *words: str | Path) -> tuple[int, str, str]:
    code = main(["loop", *map(str, words)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def refused(capsys: Captured, code: int, *words: str | Path) -> str:
    """The one line of a command that fails with `code` and prints nothing else."""
    found, out, err = called(capsys, *words)
    assert (found, out) == (code, "")
    assert err.startswith("fitamp: ")
    assert err.count("\n") == 1
    return err


def same(written: Path, sweep: Sweep) -> bool:
    read = read_sweep(written)
    bits = read.freq_hz.tobytes() == sweep.freq_hz.tobytes() and read.gain.tolist() == sweep.gain.tolist()
    return bits and read.sign is Sign.AS_READ


def test_receivers_become_a_sweep_that_reads_back_to_the_bit(receivers: Path, tmp_path: Path, capsys: Captured) -> None:
    out = tmp_path / "T.csv"
    code, text, err = called(capsys, receivers, "--columns", RECEIVERS, "--out", out)
    assert (code, err) == (0, "")
    assert "T = −return/error" in text
    assert text.endswith(f"loop gain: {out}\n")
    made = read_receivers(receivers, columns=RECEIVERS)
    assert same(out, made)
    notes = read_sweep(out).origin.notes
    assert f"sha256 of the source: {made.origin.sha256}" in notes
    assert "from: (c, d)/(a, b)" in notes
    assert "note: part 7, invented" in notes
    assert any(note.startswith("loop gain: T = −return/error (") for note in notes)


def test_injections_become_a_sweep_with_ratio_and_warning(
    injections: tuple[Path, Path], tmp_path: Path, capsys: Captured
) -> None:
    voltage, current = injections
    out = tmp_path / "T.csv"
    code, text, err = called(capsys, "--voltage", voltage, "--current", current, "--out", out)
    assert (code, err) == (0, "")
    assert "|Z2/Z1| from 0.5 to 0.5 along the band" in text
    assert "beware: voltage injection alone would have been off by" in text
    assert same(out, double_injection(read_sweep(voltage), read_sweep(current)).sweep)
    assert any(note.startswith("CAUTION, one injection: current injection") for note in read_sweep(out).origin.notes)


def test_two_port_ends_in_itself_or_as_stated(two_port: Path, tmp_path: Path, capsys: Captured) -> None:
    out = tmp_path / "T.csv"
    assert called(capsys, two_port, "--out", out)[0] == 0
    np.testing.assert_allclose(read_sweep(out).gain, 0.9 * GAIN / (1 - 0.1), rtol=1e-12)
    assert same(out, read_two_port_loop(two_port))
    # V2/V1 into a matched load is S21/(1 + S11), and from a matched source the electromotive force is twice that of a1.
    assert called(capsys, two_port, "--load", "50 Ohm", "--out", out, "--force")[0] == 0
    np.testing.assert_allclose(read_sweep(out).gain, 0.9 * GAIN / 1.5, rtol=1e-12)
    assert called(capsys, two_port, "--load", "50 Ohm", "--source", "50 Ohm", "--out", out, "--force")[0] == 0
    np.testing.assert_allclose(read_sweep(out).gain, 0.9 * GAIN / 2, rtol=1e-12)
    assert called(capsys, two_port, "--source", "loop", "--out", out, "--force")[0] == 0
    np.testing.assert_allclose(read_sweep(out).gain, 0.9 * GAIN / (1 - 0.1), rtol=1e-12)


def test_record_is_one_object(injections: tuple[Path, Path], tmp_path: Path, capsys: Captured) -> None:
    voltage, current = injections
    words: list[str | Path] = ["--voltage", voltage, "--current", current, "--out", tmp_path / "T.csv"]
    code, out, err = called(capsys, *words, "--json", "-")
    assert (code, err) == (0, "")
    record: dict[str, Any] = json.loads(out)
    assert record["schema"] == "fitamp/loop/1"
    assert record["route"] == "double-injection"
    assert record["impedance_ratio"] == pytest.approx({"smallest": 0.5, "largest": 0.5})
    assert [one["injection"] for one in record["one_injection_alone"]] == ["voltage", "current"]
    assert [one["code"] for one in record["warnings"]] == ["one-injection", "one-injection"]
    assert record["sweep"]["points_used"] == len(FREQ_HZ)
    assert called(capsys, *words, "--json", tmp_path / "r.json", "--force")[0] == 0
    assert json.loads((tmp_path / "r.json").read_text(encoding="utf-8")) == record


def test_sign_that_the_band_does_not_show_survives_writing(receivers: Path, tmp_path: Path, capsys: Captured) -> None:
    lines = receivers.read_text(encoding="utf-8").splitlines()
    receivers.write_text("\n".join([*lines[:2], *lines[-6:], ""]), encoding="utf-8")
    out = tmp_path / "T.csv"
    assert "give --sign" in refused(capsys, 3, receivers, "--columns", RECEIVERS, "--out", out)
    assert not out.exists()
    assert called(capsys, receivers, "--columns", RECEIVERS, "--sign", "inverted", "--out", out)[0] == 0
    np.testing.assert_allclose(read_sweep(out).gain, GAIN[-6:], rtol=1e-12)


def test_written_sweep_fits_as_it_is(receivers: Path, tmp_path: Path, capsys: Captured) -> None:
    out = tmp_path / "T.csv"
    assert called(capsys, receivers, "--columns", RECEIVERS, "--out", out)[0] == 0
    assert main(["fit", str(out), "--delay", "0 s", "--json", "-"]) == 0
    record = json.loads(capsys.readouterr().out)
    assert record["parameters"]["pole2_hz"]["value"] == pytest.approx(40e6, rel=1e-6)


@pytest.mark.parametrize("option", ["--out", "--json"])
def test_existing_output_is_kept_without_force(receivers: Path, tmp_path: Path, capsys: Captured, option: str) -> None:
    mine = tmp_path / "mine"
    mine.write_text("mine", encoding="utf-8")
    words: list[str | Path] = [receivers, "--columns", RECEIVERS, option, mine]
    words += [] if option == "--out" else ["--out", tmp_path / "T.csv"]
    assert "exists already; choose another name or give --force" in refused(capsys, 2, *words)
    assert mine.read_text(encoding="utf-8") == "mine"
    assert not (tmp_path / "T.csv").exists()
    assert called(capsys, *words, "--force")[0] == 0
    assert mine.read_text(encoding="utf-8") != "mine"


def test_record_is_never_written_over(receivers: Path, tmp_path: Path, capsys: Captured) -> None:
    before = receivers.read_bytes()
    words: list[str | Path] = [receivers, "--columns", RECEIVERS, "--force"]
    assert "is one of the records" in refused(capsys, 2, *words, "--out", receivers)
    assert "is named for both outputs" in refused(capsys, 2, *words, "--out", tmp_path / "x", "--json", tmp_path / "x")
    assert receivers.read_bytes() == before


@pytest.mark.parametrize(
    ("words", "told"),
    [
        ([], "no record; name one file, or two with --voltage and --current"),
        (["a.csv", "--voltage", "v.csv", "--current", "i.csv"], "a file as well as --voltage and --current"),
        (
            ["--voltage", "v.csv", "--current", "./v.csv"],
            "v.csv: is named for both injections; name the record of each",
        ),
        (["a.csv", "--columns", RECEIVERS, "--out", "-"], "--out is for a file; name one"),
        (["--voltage", "v.csv"], "double injection needs both records; name the other one with --current"),
        (["--current", "i.csv"], "name the other one with --voltage"),
        (["a.csv"], 'a.csv: say where the error and the return receiver are, as in --columns "f=1:Hz error_mag=2:dB'),
        (["a.csv", "--columns", "f=1 mag=2 phase=3"], "--columns: cannot read 'mag'"),
        (
            ["a.csv", "--columns", RECEIVERS, "--load", "open"],
            "--load and --source are for the opened loop as a two-port",
        ),
        (["a.csv", "--columns", RECEIVERS, "--trace", "S21"], "--trace is for Touchstone records"),
        (["a.s2p", "--trace", "S21"], "a.s2p: all four S-parameters count; leave out --columns, --trace and --sweep"),
        (["a.s2p", "--load", "50"], "termination '50': '50' has no unit; expected Ω"),
        (["a.s2p", "--source", "50 Ohm"], "count the loop's own loading twice"),
        (["a.csv", "--sweep", "0"], "'0' is not a whole number from 1"),
    ],
)
def test_words_that_do_not_go_together_are_refused(
    words: list[str], told: str, tmp_path: Path, capsys: Captured
) -> None:
    assert told in refused(capsys, 2, "--out", tmp_path / "T.csv", *words)
    assert not list(tmp_path.iterdir())


def test_name_in_a_comment_cannot_leave_its_line(receivers: Path, tmp_path: Path, capsys: Captured) -> None:
    lines = receivers.read_text(encoding="utf-8").splitlines()
    lines[0] = "=cmd()\x0b1,2,3 <script>"
    receivers.write_text("\n".join([*lines, ""]), encoding="utf-8")
    out = tmp_path / "T.csv"
    assert called(capsys, receivers, "--columns", RECEIVERS, "--out", out)[0] == 0
    rows = out.read_text(encoding="utf-8").split("freq_hz,real,imag\n")
    assert len(rows) == 2
    assert all(line.startswith("# ") and line.isprintable() for line in rows[0].splitlines())
    assert same(out, read_receivers(receivers, columns=RECEIVERS))
