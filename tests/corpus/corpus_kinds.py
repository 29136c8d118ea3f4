"""What the corpus is made of: kinds of files, and the contents that many of them start from. All of it is invented."""

from __future__ import annotations

import gzip
import io
import pickle
import zipfile
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

__all__ = [
    "DB",
    "DECADES",
    "FREQ_3",
    "GAIN_3",
    "HEAD",
    "ONE_PORT",
    "ROWS",
    "TABLE",
    "V2",
    "Content",
    "Odd",
    "directory",
    "huge",
    "nothing",
    "packed",
    "pickled",
    "zipped",
]

# Bytes or text of a file, or what makes it at a path.
Content = bytes | str | Callable[[Path], None]


@dataclass(frozen=True, kw_only=True)
class Odd:
    """A sweep file that is odd but sound, with the numbers that stand in it: hertz and loop gain."""

    name: str
    content: Content
    freq_hz: tuple[float, ...] = (10, 20, 40, 80)
    gain: tuple[complex, ...] = (9 - 1j, 9 - 2j, 8 - 4j, 7 - 5j)
    options: tuple[str, ...] = ()


# Three points as they stand in most of the shorter files, and what 20, 0 and -20 dB at 0 degrees are.
FREQ_3 = (10.0, 20.0, 40.0)
GAIN_3 = (9 - 1j, 9 - 2j, 8 - 4j)
DECADES = (10.0, 1.0, 0.1)

HEAD = "freq_hz,re,im\n"
ROWS = "10,9,-1\n20,9,-2\n40,8,-4\n80,7,-5\n"
TABLE = HEAD + ROWS
DB = "freq_hz,mag_db,phase_deg\n10,60,-1\n20,60,-2\n40,59,-4\n"
ONE_PORT = "# Hz S RI R 50\n10 9 -1\n20 9 -2\n40 8 -4\n"
V2 = (
    "[Version] 2.0\n# Hz S RI R 50\n[Number of Ports] 1\n[Number of Frequencies] 3\n[Network Data]\n"
    "10 9 -1\n20 9 -2\n40 8 -4\n[End]\n"
)


class Payload:
    """What a pickle can do to whoever opens it: this one would write a file."""

    def __init__(self, mark: Path) -> None:
        self.mark = mark

    def __reduce__(self) -> tuple[Callable[..., object], tuple[str, str]]:
        return open, (str(self.mark), "w")


def packed(content: bytes) -> bytes:
    """Pack with gzip, the same bytes every time."""
    return gzip.compress(content, mtime=0)


def nothing(_: Path) -> None:
    """Make no file at all."""


def directory(path: Path) -> None:
    """Make a folder where a file should be."""
    path.mkdir()


def huge(path: Path) -> None:
    """Make a file of a gigabyte, which takes no room on most disks."""
    with path.open("wb") as stream:
        stream.truncate(1_000_000_000)


def pickled(path: Path) -> None:
    """Make a pickle that writes a file beside itself when it is opened."""
    path.write_bytes(pickle.dumps(Payload(path.with_name("opened"))))


def zipped(path: Path) -> None:
    """Make what spreadsheets save."""
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("xl/workbook.xml", "<workbook/>")
    path.write_bytes(stream.getvalue())
