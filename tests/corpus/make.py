#!/usr/bin/env python3
"""The corpus of files as they should not be, and of odd ones that are sound.

    python tests/corpus/make.py FOLDER      writes them all, to look at

`build` writes one of them, as the tests do.
"""

from __future__ import annotations

import sys
from pathlib import Path

from corpus_designs import DESIGNS
from corpus_kinds import Content, Odd
from corpus_odd import ODD
from corpus_refused import OPTIONS, REFUSED
from corpus_touchstone import ODD_TOUCHSTONE, REFUSED_TOUCHSTONE, TOUCHSTONE_OPTIONS

__all__ = ["BAD_DESIGNS", "BAD_SWEEPS", "ODD_SWEEPS", "OPTIONS_OF_BAD", "build", "expected_lines"]

BAD_SWEEPS: dict[str, Content] = REFUSED | REFUSED_TOUCHSTONE
OPTIONS_OF_BAD: dict[str, tuple[str, ...]] = OPTIONS | TOUCHSTONE_OPTIONS
ODD_SWEEPS: dict[str, Odd] = {odd.name: odd for odd in (*ODD, *ODD_TOUCHSTONE)}
BAD_DESIGNS: dict[str, Content] = DESIGNS

_EXPECTED = Path(__file__).with_name("expected_lines.txt")


def build(name: str, content: Content, folder: Path) -> Path:
    """Write a file of the corpus into a folder; its path."""
    path = folder / name
    if isinstance(content, bytes):
        path.write_bytes(content)
    elif isinstance(content, str):
        path.write_bytes(content.encode("utf-8"))
    else:
        content(path)
    return path


def expected_lines() -> dict[str, tuple[int, str]]:
    """Exit code and line of every file that is refused; in a line `{file}` stands for the file as it is given."""
    expected = {}
    for line in _EXPECTED.read_text(encoding="utf-8").splitlines():
        if line and not line.startswith("#"):
            name, code, text = line.split(" | ", 2)
            expected[name] = (int(code), text)
    return expected


def main(arguments: list[str]) -> int:
    """Write all files into the folder that is named."""
    if len(arguments) != 1:
        print(__doc__, file=sys.stderr)
        return 2
    folder = Path(arguments[0])
    odd = {name: case.content for name, case in ODD_SWEEPS.items()}
    for kind, files in {"bad_sweeps": BAD_SWEEPS, "odd_sweeps": odd, "bad_designs": BAD_DESIGNS}.items():
        (folder / kind).mkdir(parents=True)
        for name, content in files.items():
            build(name, content, folder / kind)
        print(f"{len(files)} files in {folder / kind}")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
