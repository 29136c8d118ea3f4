"""Paths and bytes that cannot be a sweep are refused before anything reads them."""

from __future__ import annotations

import gzip
import hashlib
import io
import os
import re
import sys
from pathlib import Path
from typing import BinaryIO

import pytest

from fitamp.errors import SweepError
from fitamp.importers.source import Source, load_source


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

    def denied(_: Path, mode: str) -> BinaryIO:
        raise PermissionError(13, f"Permission denied{mode[2:]}")

    monkeypatch.setattr(Path, "open", denied)
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
        (gzip.compress(b"\x1f\x8b\x08", mtime=0), "a gzip file inside a gzip file"),
        (b"BZh91AY", "a bzip2 file"),
        (b"\xfd7zXZ\x00", "an xz file"),
        (b"\x93NUMPY\x01", "a NumPy array"),
        (b"%PDF-1.7", "a PDF document"),
        (b"\x89PNG\r\n", "a picture"),
        (b"\x89HDF\r\n", "an HDF5 file"),
        (b"MATLAB 5.0 MAT-file", "a binary MAT file"),
    ],
)
def test_other_kinds_of_file_are_called_by_name(tmp_path: Path, start: bytes, kind: str) -> None:
    # File signatures: common knowledge (file(1) magic), from memory.
    path = tmp_path / "a.csv"
    path.write_bytes(start if start.startswith(b"\x1f") else start + b"...")
    with pytest.raises(SweepError, match=f"this is {kind}, not a text file; "):
        load_source(path)


def test_gzip_file_is_unpacked_and_hashed_as_it_is(tmp_path: Path) -> None:
    # Python's own gzip module packs; two members in one file are one content (RFC 1952, section 2.2).
    packed = gzip.compress(b"f,re,") + gzip.compress(b"im\n")
    path = tmp_path / "a.csv.gz"
    path.write_bytes(packed + b"\0" * 100)
    source = load_source(path)
    assert source.data == b"f,re,im\n"
    assert source.sha256 == hashlib.sha256(packed + b"\0" * 100).hexdigest()
    (decision,) = source.decisions
    assert decision.choice == f"gzip, {len(packed) + 100} bytes unpacked to 8"


@pytest.mark.parametrize(
    ("name", "suffix"),
    [("a.s2p", ".s2p"), ("a.S2P.GZ", ".s2p"), ("a.csv.gz", ".csv"), ("a.gz", ".gz"), ("a", ""), ("b.1/a", "")],
)
def test_suffix_is_that_of_the_content(name: str, suffix: str) -> None:
    assert Source(file=name, data=b"", digest=str).suffix == suffix


def test_broken_gzip_files_are_refused_with_the_reason(tmp_path: Path) -> None:
    packed = gzip.compress(bytes(range(256)) * 20)
    path = tmp_path / "a.csv.gz"
    for content, message in (
        (packed[:-12], "the gzip file is cut short; copy or export it again"),
        (packed[:-5] + b"\0" + packed[-4:], r"the gzip file is damaged \(.*incorrect data check.*\); copy or export"),
        (packed[:3] + b"\xff" + packed[4:], "the gzip file is damaged"),
        (b"\x1f\x8b", "the gzip file is cut short"),
        (packed + b"f,re,im", "there is something else behind the end of the gzip file"),
        (gzip.compress(b" \n"), "the file is empty; export the sweep again"),
    ):
        path.write_bytes(content)
        with pytest.raises(SweepError, match=message):
            load_source(path)


def test_gzip_file_that_grows_beyond_the_limit_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "a.csv.gz"
    path.write_bytes(gzip.compress(b"0" * 3_000_000) * 50)
    assert path.stat().st_size < 1_000_000
    with pytest.raises(SweepError, match="unpacks to more than the 1 MB that a sweep may have; export one"):
        load_source(path, max_bytes=1_000_000)
    path.write_bytes(gzip.compress(b"0" * 20_000_000))
    with pytest.raises(
        SweepError, match="unpacks to more than 200 times its size, as no table of numbers does; unpack"
    ):
        load_source(path)


class Endless(io.RawIOBase):
    """A stream without end, which counts what is taken from it."""

    taken = 0

    def readable(self) -> bool:
        return True

    def read(self, size: int = -1) -> bytes:
        assert size > 0
        self.taken += size
        return b"1" * size


class Console:
    """Standard input as far as its bytes are concerned."""

    def __init__(self, buffer: io.RawIOBase | io.BytesIO) -> None:
        self.buffer = buffer


def test_standard_input_is_read_under_a_name_of_its_own(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", Console(io.BytesIO(b"abc")))
    source = load_source("-")
    assert (source.file, source.data) == ("standard input", b"abc")


def test_program_without_standard_input_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", None)
    with pytest.raises(SweepError, match=r"standard input: cannot be read \(there is none\)"):
        load_source("-")


def test_endless_standard_input_is_refused_at_the_limit(monkeypatch: pytest.MonkeyPatch) -> None:
    endless = Endless()
    monkeypatch.setattr(sys, "stdin", Console(endless))
    message = "standard input: what it holds is more than the 5 MB that a sweep may have; export one sweep per file"
    with pytest.raises(SweepError, match=message):
        load_source("-", max_bytes=5_000_000)
    assert endless.taken < 8_000_000
