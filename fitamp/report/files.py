"""Output written whole or not at all.

Files are first written beside their place and then moved there, so that an interrupted run leaves nothing half-written
and nothing that was there before is lost.
"""

from __future__ import annotations

import tempfile
import uuid
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from fitamp.errors import UsageError

__all__ = ["refuse_existing", "staged_directory", "write_text"]


def refuse_existing(path: Path, *, force: bool) -> None:
    """Raise UsageError where output would overwrite something and `force` is not given."""
    if path.exists() and not force and not (path.is_dir() and not any(path.iterdir())):
        raise UsageError(f"{path}: exists already; choose another name or give --force")


def write_text(path: Path, text: str, *, force: bool) -> None:
    """Write a text file in UTF-8, whole or not at all.

    Raises
    ------
    UsageError
        When the file exists and `force` is not given, or its folder cannot be written.
    """
    refuse_existing(path, force=force)
    if path.is_dir():
        raise UsageError(f"{path}: is a folder; name a file")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        # Not by tempfile, whose files only their owner may read: results are for colleagues too.
        temporary = path.parent / f".fitamp-{uuid.uuid4().hex}"
        stream = temporary.open("x", encoding="utf-8", newline="\n")
    except OSError as error:
        raise UsageError(f"{path}: cannot be written ({error.strerror or error}); choose another place") from error
    try:
        with stream:
            stream.write(text)
        temporary.replace(path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


@contextmanager
def staged_directory(path: Path, *, force: bool) -> Iterator[Path]:
    """Give a folder to fill; its files move to `path` when the block ends well, and vanish otherwise.

    Other files that stand in `path` stay untouched.

    Raises
    ------
    UsageError
        When `path` exists, is not empty and `force` is not given, or cannot be written.
    """
    refuse_existing(path, force=force)
    if path.exists() and not path.is_dir():
        raise UsageError(f"{path}: is a file; name a folder for the output")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        staging = tempfile.TemporaryDirectory(prefix=".fitamp-", dir=path.parent)
    except OSError as error:
        raise UsageError(f"{path}: cannot be written ({error.strerror or error}); choose another place") from error
    with staging as name:
        yield Path(name)
        try:
            path.mkdir(exist_ok=True)
            for file in sorted(Path(name).iterdir()):
                file.replace(path / file.name)
        except OSError as error:
            raise UsageError(f"{path}: cannot be written ({error.strerror or error}); choose another place") from error
