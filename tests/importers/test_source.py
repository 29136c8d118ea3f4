"""Paths and bytes that cannot be a sweep are refused before anything reads them."""

from __future__ import annotations

import hashlib
import os
import re
from pathlib import Path

import pytest

from fitamp.errors import SweepError
from fitamp.importers.source import load_source


def test_bytes_name_and_hash_are_kept_as_they_are(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(b"abc")
    source = load_source(path)
    assert (source.file, source.data) == (str(path), b"abc")
    # FIPS 180 example "abc", from memory.
    assert source.sha256 == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert source.sha256 == hashlib.sha256(b"abc").hexdigest()


def test_name_is_kept_as_given(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.csv").write_bytes(b"abc")
    monkeypatch.chdir(tmp_path)
    assert load_source("./a.csv").file == "./a.csv"


def test_directory_missing_and_empty_files_are_refused(tmp_path: Path) -> None:
    with pytest.raises(SweepError, match="this is a directory; name one file in it"):
        load_source(tmp_path)
    for name in ("", " "):
        with pytest.raises(SweepError, match=r"^the name of the sweep file is empty; name one CSV or Touchstone file$"):
            load_source(name)
    with pytest.raises(SweepError, match="no such file; check the path"):
        load_source(tmp_path / "missing.csv")
    for content in (b"", b" \r\n\t\n"):
        (tmp_path / "empty.csv").write_bytes(content)
        with pytest.raises(SweepError, match="the file is empty; export the sweep again"):
            load_source(tmp_path / "empty.csv")
    with pytest.raises(SweepError, match=r"no such file|cannot be read"):
        load_source("a\0b.csv")


def test_device_is_no_file() -> None:
    with pytest.raises(SweepError, match=r"not a regular file|no such file"):
        load_source(os.devnull)


def test_unreadable_file_is_refused_with_the_system_s_reason(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(b"abc")

    def denied(_: Path) -> bytes:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "read_bytes", denied)
    with pytest.raises(SweepError, match=re.escape("a.csv: cannot be read (Permission denied); check the path")):
        load_source(path)


def test_file_beyond_the_limit_is_refused_without_reading_it(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(b"1,2\n" * 500_000)
    with pytest.raises(SweepError, match="2 MB is more than the 1 MB that a sweep may have; export one sweep per file"):
        load_source(path, max_bytes=1_000_000)


@pytest.mark.parametrize(
    ("start", "kind"),
    [
        (b"PK\x03\x04", "a zipped file or spreadsheet"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1", "a spreadsheet of the old binary form"),
        (b"\x1f\x8b\x08", "a gzip file"),
        (b"%PDF-1.7", "a PDF document"),
        (b"\x89PNG\r\n", "a picture"),
        (b"\x89HDF\r\n", "an HDF5 file"),
        (b"MATLAB 5.0 MAT-file", "a binary MAT file"),
    ],
)
def test_other_kinds_of_file_are_called_by_name(tmp_path: Path, start: bytes, kind: str) -> None:
    # File signatures: common knowledge (file(1) magic), from memory.
    path = tmp_path / "a.csv"
    path.write_bytes(start + b"...")
    with pytest.raises(SweepError, match=f"this is {kind}, not a text file; "):
        load_source(path)
