"""The one door: which reader gets the file, which options it takes, and the example files in tests/data."""

from __future__ import annotations

import hashlib
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from bench_tables import FREQ_HZ, GAIN, cells, file_of, table

import fitamp.importers
from fitamp.errors import SweepError, UsageError
from fitamp.importers import ColumnChoice, ColumnRef, Quantity, Unit, read_sweep
from fitamp.sweep import Sign

DATA = Path(__file__).parent.parent / "data"
TOUCHSTONE = "# Hz S RI R 50\n" + "\n".join(" ".join(row) for row in cells("re im"))


def test_public_names_change_only_on_purpose() -> None:
    assert sorted(fitamp.importers.__all__) == [
        "ColumnChoice", "ColumnRef", "Quantity", "Unit", "read_sweep", "read_sweeps", "write_sweep",
    ]  # fmt: skip


def test_door_opens_without_the_heavy_libraries() -> None:
    code = "import sys, fitamp.importers; print(sorted({'pandas', 'skrf', 'scipy', 'matplotlib'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_suffix_decides_in_any_case_and_origin_tells(tmp_path: Path) -> None:
    for name in ("a.s1p", "a.S1P"):
        path = file_of(tmp_path, TOUCHSTONE, name)
        sweep = read_sweep(str(path))
        assert sweep.origin.file == str(path)
        assert sweep.origin.form == "touchstone"
        assert sweep.origin.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    text = table(["freq_hz", "Re(T)", "Im(T)"], cells("re im"), separator="\t")
    for name in ("a.csv", "a.TXT", "a", "a.dat"):
        origin = read_sweep(file_of(tmp_path, text, name)).origin
        assert (origin.form, origin.trace) == ("csv", "Re(T), Im(T)")


@pytest.mark.parametrize("content", [TOUCHSTONE, "! x\n[Version] 2.0\n" + TOUCHSTONE])
def test_touchstone_under_another_name_is_refused(tmp_path: Path, content: str) -> None:
    with pytest.raises(SweepError, match=r"the content is Touchstone, .*rename it to end in \.s1p or \.s2p"):
        read_sweep(file_of(tmp_path, content, "a.txt"))


def test_options_of_the_other_kind_of_file_are_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="--columns is for text tables; a Touchstone file takes --trace"):
        read_sweep(file_of(tmp_path, TOUCHSTONE, "a.s1p"), columns="f=1:Hz re=2 im=3")
    with pytest.raises(UsageError, match="--trace is for Touchstone files; a text table takes --columns"):
        read_sweep(file_of(tmp_path, "freq_hz,re,im\n1,2,3\n", "a.csv"), trace="S21")


def test_choice_may_be_built_instead_of_written(tmp_path: Path) -> None:
    path = file_of(tmp_path, "x,T\n1,10-1j\n2,10-2j\n")
    choice = ColumnChoice(
        columns={
            Quantity.FREQUENCY: ColumnRef(column="x", unit=Unit.MHZ),
            Quantity.COMPLEX: ColumnRef(column=2),
        }
    )
    sweep = read_sweep(path, columns=choice, sign=Sign.UNKNOWN)
    assert sweep.freq_hz.tolist() == [1e6, 2e6]
    assert sweep.gain.tolist() == [10 - 1j, 10 - 2j]


def test_inverted_read_out_is_turned_and_stated(tmp_path: Path) -> None:
    rows = [[f, f"{-float(re)!r}", f"{-float(im)!r}"] for f, re, im in cells("re im")]
    path = file_of(tmp_path, table(["freq_hz", "re", "im"], rows, separator=","))
    sweep = read_sweep(path)
    assert sweep.sign is Sign.INVERTED
    assert np.allclose(sweep.gain, GAIN, rtol=1e-10)
    kept = read_sweep(path, sign=Sign.AS_READ)
    assert np.allclose(kept.gain, -GAIN, rtol=1e-10)
    assert read_sweep(path, sign=Sign.UNKNOWN).sign is Sign.UNKNOWN


def test_sign_that_the_band_does_not_show_is_asked_for(tmp_path: Path) -> None:
    path = file_of(tmp_path, "freq_hz,re,im\n1,10,0\n2,0.1,0\n4,0.1,0\n")
    with pytest.raises(SweepError, match=r"cannot tell whether the sweep holds T or -T: .* give --sign as-read or"):
        read_sweep(path)


@pytest.mark.parametrize(
    ("name", "sign"),
    [
        ("bench_latin1_falling.csv", Sign.AS_READ),
        ("bench_inverted.s1p", Sign.INVERTED),
        ("bench_version2.s2p", Sign.AS_READ),
        ("bench_complex.tsv", Sign.AS_READ),
    ],
)
def test_example_files_hold_the_same_sweep(name: str, sign: Sign) -> None:
    sweep = read_sweep(DATA / name)
    assert sweep.sign is sign
    assert np.allclose(sweep.freq_hz, FREQ_HZ, rtol=1e-12)
    # Written with six digits; 0.001 dB and 0.001 degrees in the first file.
    assert np.max(np.abs(sweep.gain / GAIN - 1)) < (2e-4 if name.endswith(".csv") else 2e-6)
