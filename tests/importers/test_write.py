"""Written sweeps come back to the bit."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pytest
from bench_tables import FREQ_HZ, GAIN
from hypothesis import given, settings
from hypothesis import strategies as st

from fitamp.errors import SweepError, UsageError
from fitamp.importers import read_sweep, write_sweep
from fitamp.importers.write import sweep_csv
from fitamp.sweep import Origin, Sign, Sweep

SIZES = st.floats(min_value=-1e12, max_value=1e12, allow_nan=False)
ONE_POINT = Sweep(freq_hz=np.array([10.0]), gain=np.array([1.0 + 0j]))
POINTS = st.dictionaries(st.floats(min_value=1e-6, max_value=1e15), st.tuples(SIZES, SIZES), min_size=1, max_size=8)


@settings(max_examples=40, deadline=None)
@given(POINTS)
def test_any_sweep_comes_back_to_the_bit(points: dict[float, tuple[float, float]]) -> None:
    freq_hz = sorted(points)
    sweep = Sweep(freq_hz=np.array(freq_hz), gain=np.array([complex(*points[f]) for f in freq_hz]))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "a.csv"
        write_sweep(sweep, path)
        read = read_sweep(path, sign=Sign.UNKNOWN)
    assert read.freq_hz.tobytes() == sweep.freq_hz.tobytes()
    assert read.gain.tolist() == sweep.gain.tolist()


def test_file_is_plain_csv_with_the_loop_gain_in_it(tmp_path: Path) -> None:
    origin = Origin(file="bench\n7.csv")
    sweep = Sweep(
        freq_hz=np.array([10.0, 20.0]), gain=np.array([1e3 - 1j, 1e3 - 2j]), origin=origin, sign=Sign.INVERTED
    )
    write_sweep(sweep, tmp_path / "a.csv")
    assert (tmp_path / "a.csv").read_bytes().decode("utf-8") == (
        "# fitamp sweep\n# source: bench 7.csv\n# loop gain T in V/V, the source held -T\n"
        "freq_hz,real,imag\n10.0,1000.0,-1.0\n20.0,1000.0,-2.0\n"
    )


def test_sign_of_a_written_sweep_is_recognised_again(tmp_path: Path) -> None:
    write_sweep(Sweep(freq_hz=FREQ_HZ, gain=GAIN), tmp_path / "a.csv")
    assert read_sweep(tmp_path / "a.csv").sign is Sign.AS_READ


def test_sign_that_was_settled_stays_so_where_the_band_does_not_show_it(tmp_path: Path) -> None:
    inverted = Sweep(freq_hz=FREQ_HZ[-3:], gain=GAIN[-3:], sign=Sign.INVERTED)
    write_sweep(inverted, tmp_path / "a.csv")
    read = read_sweep(tmp_path / "a.csv")
    assert read.sign is Sign.AS_READ
    assert read.gain.tolist() == inverted.gain.tolist()
    assert "the comments say that it is T" in {decision.reason for decision in read.decisions}
    assert read_sweep(tmp_path / "a.csv", sign=Sign.INVERTED).gain.tolist() == (-inverted.gain).tolist()


def test_sign_that_was_left_open_is_asked_for_again(tmp_path: Path) -> None:
    write_sweep(Sweep(freq_hz=FREQ_HZ[-3:], gain=GAIN[-3:]), tmp_path / "a.csv")
    with pytest.raises(SweepError, match="give --sign as-read"):
        read_sweep(tmp_path / "a.csv")


def test_comments_stay_on_their_lines_and_are_notes_again(tmp_path: Path) -> None:
    content = sweep_csv(ONE_POINT, ["a\nb\x1b[0m", "=cmd(), 1, 2"])
    assert content.splitlines()[3:6] == ["# a b [0m", "# =cmd(), 1, 2", "freq_hz,real,imag"]
    path = tmp_path / "a.csv"
    path.write_text(content, encoding="utf-8")
    assert read_sweep(path, sign=Sign.UNKNOWN).origin.notes[3:] == ("a b [0m", "=cmd(), 1, 2")


def test_existing_file_is_kept_unless_told_otherwise(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(UsageError, match=r"a\.csv: the file exists; choose another name or allow overwriting"):
        write_sweep(ONE_POINT, path)
    assert path.read_text(encoding="utf-8") == "mine"
    write_sweep(ONE_POINT, path, overwrite=True)
    assert path.read_text(encoding="utf-8").startswith("# fitamp sweep")


def test_place_that_cannot_be_written_is_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"a\.csv: cannot be written \(No such file"):
        write_sweep(ONE_POINT, tmp_path / "missing" / "a.csv")
