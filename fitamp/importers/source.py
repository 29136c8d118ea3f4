"""The bytes of one file or of standard input, refused early where they cannot be a sweep.

Nothing is executed or unpickled here: the bytes are read once, up to a limit, hashed, and handed on as they are, so
that what is checked is also what is read. A gzip file is unpacked in memory, up to the same limit.
"""

from __future__ import annotations

import hashlib
import os
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path, PurePath
from typing import BinaryIO

from fitamp.errors import SweepError
from fitamp.importers.unpack import GZIP_MARK, unpacked
from fitamp.sweep import Decision

__all__ = ["CALLED", "MAX_BYTES", "STANDARD_INPUT", "Source", "load_source"]

# A sweep of a million points is about 60 MB of text; beyond this it is some other kind of file.
MAX_BYTES = 100_000_000

# The name that stands for standard input, as of old.
STANDARD_INPUT = "-"
CALLED = "standard input"
_PIECE = 1 << 20

# First bytes of files that people pass by mistake, with what to do instead.
_FOREIGN = (
    (b"PK\x03\x04", "a zipped file or spreadsheet", "unpack it, or export the sheet as CSV"),
    (b"\xd0\xcf\x11\xe0", "a spreadsheet of the old binary form", "export the sheet as CSV"),
    (GZIP_MARK, "a gzip file inside a gzip file", "unpack it first"),
    (b"BZh", "a bzip2 file", "unpack it first"),
    (b"\xfd7zXZ", "an xz file", "unpack it first"),
    (b"%PDF", "a PDF document", "export the numbers as CSV or Touchstone"),
    (b"\x89PNG", "a picture", "export the numbers as CSV or Touchstone"),
    (b"\x89HDF", "an HDF5 file", "export the numbers as CSV or Touchstone"),
    (b"\x93NUMPY", "a NumPy array", "export the numbers as CSV or Touchstone"),
    (b"MATLAB 5.0", "a binary MAT file", "export the numbers as CSV or Touchstone"),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Source:
    """One file: its name as given, its bytes unpacked, what was done to it, and how to have its hash."""

    file: str
    data: bytes
    digest: Callable[[], str]
    decisions: tuple[Decision, ...] = ()

    @property
    def sha256(self) -> str:
        """SHA-256 of the file as it is, in hexadecimal."""
        return self.digest()

    @property
    def suffix(self) -> str:
        """The suffix of the name, in lower case, a ``.gz`` after it taken off."""
        suffixes = [suffix.lower() for suffix in PurePath(self.file).suffixes]
        if len(suffixes) > 1 and suffixes[-1] == ".gz":
            del suffixes[-1]
        return suffixes[-1] if suffixes else ""


def load_source(path: str | os.PathLike[str], *, max_bytes: int = MAX_BYTES) -> Source:
    """Read the bytes of a file; ``-`` is standard input.

    Raises
    ------
    SweepError
        For a name that is empty, a path that is missing, no regular file, unreadable, empty, larger than `max_bytes`
        (unpacked or not), damaged, or of a kind that is known not to be text.
    """
    file = os.fspath(path)
    if not file.strip():
        raise SweepError("the name of the sweep file is empty; name one CSV or Touchstone file")
    try:
        if file == STANDARD_INPUT:
            file = CALLED
            stored = _from_standard_input(max_bytes)
        else:
            stored = _from_file(file, Path(file), max_bytes)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise SweepError(f"{file}: cannot be read ({reason}); check the path and its permissions") from error
    is_packed = stored.startswith(GZIP_MARK)
    data = unpacked(file, stored, max_bytes=max_bytes) if is_packed else stored
    if not data or data.isspace():
        raise SweepError(f"{file}: the file is empty; export the sweep again")
    for start, kind, remedy in _FOREIGN:
        if data.startswith(start):
            raise SweepError(f"{file}: this is {kind}, not a text file; {remedy}")
    decisions = (_unpacking(len(stored), len(data)),) if is_packed else ()
    return Source(file=file, data=data, digest=_digest(stored), decisions=decisions)


def _digest(stored: bytes) -> Callable[[], str]:
    """The hash; that of a large file is worked out beside the reading of it."""
    if len(stored) < _PIECE:
        known = hashlib.sha256(stored).hexdigest()
        return lambda: known
    from concurrent.futures import ThreadPoolExecutor

    pool = ThreadPoolExecutor(max_workers=1)
    future = pool.submit(lambda: hashlib.sha256(stored).hexdigest())
    pool.shutdown(wait=False)
    return future.result


def _unpacking(packed: int, unpacked_to: int) -> Decision:
    choice = f"gzip, {packed} bytes unpacked to {unpacked_to}"
    return Decision(topic="packing", choice=choice, reason="the file starts as gzip files do")


def _from_file(file: str, path: Path, max_bytes: int) -> bytes:
    if path.is_dir():
        raise SweepError(f"{file}: this is a directory; name one file in it")
    if not path.exists():
        raise SweepError(f"{file}: no such file; check the path")
    if not path.is_file():
        raise SweepError(f"{file}: this is not a regular file; name a CSV or Touchstone file")
    size = path.stat().st_size
    if size > max_bytes:
        raise _too_large(file, f"{size / 1e6:.0f} MB", max_bytes)
    with path.open("rb") as stream:
        return _limited(file, stream, max_bytes, expected=size)


def _from_standard_input(max_bytes: int) -> bytes:
    if sys.stdin is None:  # as under a program without a console
        raise OSError("there is none")
    return _limited(CALLED, sys.stdin.buffer, max_bytes, expected=_PIECE)


def _limited(file: str, stream: BinaryIO, max_bytes: int, *, expected: int) -> bytes:
    """All that a stream holds; a refusal where that is more than may be.

    A file of the system may hold more than its size says, so that size is only what is asked for at first.
    """
    pieces = [stream.read(expected + 1)]
    size = len(pieces[0])
    while piece := stream.read(_PIECE):
        size += len(piece)
        if size > max_bytes:
            raise _too_large(file, "what it holds", max_bytes)
        pieces.append(piece)
    return b"".join(pieces)


def _too_large(file: str, size: str, max_bytes: int) -> SweepError:
    return SweepError(
        f"{file}: {size} is more than the {max_bytes / 1e6:.0f} MB that a sweep may have; export one sweep per file"
    )
