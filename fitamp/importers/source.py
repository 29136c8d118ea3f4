"""The bytes of one file, refused early where they cannot be a sweep.

Nothing is executed or unpickled here: the bytes are read once, hashed, and handed on as they are, so that what
is checked is also what is read.
"""

from __future__ import annotations

import hashlib
import os
from dataclasses import dataclass
from pathlib import Path

from fitamp.errors import SweepError

__all__ = ["MAX_BYTES", "Source", "load_source"]

# A sweep of a million points is about 60 MB of text; beyond this it is some other kind of file.
MAX_BYTES = 512 * 1024 * 1024

# First bytes of files that people pass by mistake, with what to do instead.
_FOREIGN = (
    (b"PK\x03\x04", "a zipped file or spreadsheet", "unpack it, or export the sheet as CSV"),
    (b"\xd0\xcf\x11\xe0", "a spreadsheet of the old binary form", "export the sheet as CSV"),
    (b"\x1f\x8b", "a gzip file", "unpack it first"),
    (b"%PDF", "a PDF document", "export the numbers as CSV or Touchstone"),
    (b"\x89PNG", "a picture", "export the numbers as CSV or Touchstone"),
    (b"\x89HDF", "an HDF5 file", "export the numbers as CSV or Touchstone"),
    (b"MATLAB 5.0", "a binary MAT file", "export the numbers as CSV or Touchstone"),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Source:
    """One file: its name as given, its bytes and their SHA-256 in hexadecimal."""

    file: str
    data: bytes
    sha256: str


def load_source(path: str | os.PathLike[str], *, max_bytes: int = MAX_BYTES) -> Source:
    """Read the bytes of a file.

    Raises
    ------
    SweepError
        For a name that is empty, a path that is missing, no regular file, unreadable, empty, larger than `max_bytes`,
        or of a kind that is known not to be text.
    """
    file = os.fspath(path)
    if not file.strip():
        raise SweepError("the name of the sweep file is empty; name one CSV or Touchstone file")
    try:
        data = _read(file, Path(file), max_bytes)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise SweepError(f"{file}: cannot be read ({reason}); check the path and its permissions") from error
    if not data.strip():
        raise SweepError(f"{file}: the file is empty; export the sweep again")
    for start, kind, remedy in _FOREIGN:
        if data.startswith(start):
            raise SweepError(f"{file}: this is {kind}, not a text file; {remedy}")
    return Source(file=file, data=data, sha256=hashlib.sha256(data).hexdigest())


def _read(file: str, path: Path, max_bytes: int) -> bytes:
    if path.is_dir():
        raise SweepError(f"{file}: this is a directory; name one file in it")
    if not path.exists():
        raise SweepError(f"{file}: no such file; check the path")
    if not path.is_file():
        raise SweepError(f"{file}: this is not a regular file; name a CSV or Touchstone file")
    size = path.stat().st_size
    if size > max_bytes:
        raise SweepError(
            f"{file}: {size / 1e6:.0f} MB is more than the {max_bytes / 1e6:.0f} MB that a sweep may have; "
            "export one sweep per file"
        )
    return path.read_bytes()
