#!/usr/bin/env python3
"""Read thousands of broken files: nothing but fitamp's own errors may come of it, and memory may not go.

    python scripts/fuzz.py [--files 20000] [--seed 1]

Seeds are the examples, the tests' data files and the corpus in tests/corpus; each file is one of them with pieces
replaced, doubled, taken out or put in from another. Prints how many were read and how they were refused, the time,
and the peak memory; ends with 1, and the bytes of the file, at the first exception that is not fitamp's own.
"""

from __future__ import annotations

import argparse
import os
import random
import sys
import tempfile
import time
import traceback
import tracemalloc
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from fitamp.design import read_design
from fitamp.design.template import design_template
from fitamp.errors import FitampError
from fitamp.importers import read_sweeps
from fitamp.sweep import Sign

ROOT = Path(__file__).resolve().parent.parent
LARGEST_SEED = 20_000
TOKENS = (
    *(bytes([code]) for code in b"0123456789+-.,;:eEjk()\"'#![]{}= \t\r\n"),
    *b"E400|1e-400|nan|inf|OVL|---|Hz|dB|1,000|1.000.000|9.91E37|sep=;\n|[End]|R 50|freq_hz,re,im\n".split(b"|"),
    *b'\xe2\x88\x92|\xef\xbb\xbf|\xff\xfe|\x1f\x8b\x08|[elements]\n|= "1 kOhm"|{ value = '.split(b"|"),
    b"9" * 500,
    b"\n" * 200,
    b"," * 500,
)


@dataclass(frozen=True)
class Kind:
    """A kind of file: its name, its seeds, and what reads it."""

    name: str
    seeds: Sequence[bytes]
    read: Callable[[Path], object]


def read_both_ways(path: Path) -> object:
    """Read a sweep file, its sign to be recognised; where that is all that fails, with the sign given."""
    try:
        return read_sweeps(path)
    except FitampError as error:
        if "--sign" not in str(error):
            raise
        return read_sweeps(path, sign=Sign.AS_READ)


def kinds() -> list[Kind]:
    """Kinds of files with their seeds."""
    sys.path.insert(0, str(ROOT / "tests" / "corpus"))
    from make import BAD_DESIGNS, BAD_SWEEPS, ODD_SWEEPS

    found: dict[str, list[bytes]] = {"a.csv": [], "a.s1p": [], "a.s2p": [], "a.toml": []}
    bad = {**BAD_SWEEPS, **BAD_DESIGNS}
    sound = {name: odd.content for name, odd in ODD_SWEEPS.items()} | {"template.toml": design_template()}
    for folder in ("data_examples", "tests/data"):
        files = sorted(path for path in (ROOT / folder).iterdir() if path.is_file() and path.suffix != ".md")
        sound |= {path.name: path.read_bytes() for path in files}
    for contents, weight in ((bad, 1), (sound, 4)):
        for name, content in contents.items():
            data = content.encode() if isinstance(content, str) else content
            target = f"a{Path(name.lower().removesuffix('.gz')).suffix}"
            if isinstance(data, bytes) and data:
                found[target if target in found else "a.csv"] += [data[:LARGEST_SEED]] * weight
    readers = {name: read_design if name == "a.toml" else read_both_ways for name in found}
    return [Kind(name, seeds, readers[name]) for name, seeds in found.items()]


def mutated(seeds: Sequence[bytes], rng: random.Random) -> bytes:
    """One of the seeds with some of its pieces changed."""
    data = rng.choice(seeds)
    for _ in range(rng.choice((1, 1, 1, 2, 3, 5))):
        start = rng.randint(0, len(data))
        end = min(start + rng.choice((0, 0, 0, 1, 1, 1, 2, 5, 40, 400)), len(data))
        other = rng.choice(seeds)
        new = rng.choice(
            (
                rng.choice(TOKENS),
                rng.choice(TOKENS),
                rng.choice(TOKENS) * rng.randint(1, 5),
                data[start:end] * rng.randint(1, 3),
                b"",
                other[: rng.randint(0, len(other))] if rng.random() < 0.1 else b"",
                rng.randbytes(rng.randint(1, 3)) if rng.random() < 0.3 else b"",
            )
        )
        data = data[:start] + new + data[end:]
    return data


def outcome(kind: Kind, path: Path) -> str:
    """In a word what came of a file."""
    try:
        kind.read(path)
    except FitampError as error:
        text = str(error)
        if len(text.splitlines()) != 1:
            raise ValueError(f"message of several lines: {text!r}") from error
        return type(error).__name__
    return "read"


def peak_memory() -> str:
    """The most memory that was taken: by the process, where the system tells, else by Python's objects."""
    try:
        import resource
    except ImportError:  # on Windows
        return f"{tracemalloc.get_traced_memory()[1] / 1e6:.0f} MB of objects"
    unit = 1 if sys.platform == "darwin" else 1024  # bytes there, kibibytes elsewhere
    return f"{resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit / 1e6:.0f} MB of the process"


def main() -> int:
    """Read the files and print what came of them."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--files", type=int, default=20_000)
    parser.add_argument("--seed", type=int, default=1)
    args = parser.parse_args()
    rng = random.Random(args.seed)
    all_kinds = kinds()
    counts: dict[str, Counter[str]] = {kind.name: Counter() for kind in all_kinds}
    longest = (0.0, "")
    started = time.perf_counter()
    if os.name == "nt":
        tracemalloc.start()  # slow, but nothing else tells there
    with tempfile.TemporaryDirectory() as folder:
        for number in range(args.files):
            kind = all_kinds[number % len(all_kinds)]
            path = Path(folder) / kind.name
            data = mutated(kind.seeds, rng)
            path.write_bytes(data)
            start = time.perf_counter()
            try:
                counts[kind.name][outcome(kind, path)] += 1
            except Exception:
                traceback.print_exc()
                print(f"file {number} of seed {args.seed}, as {kind.name}: {data!r}")
                return 1
            longest = max(longest, (time.perf_counter() - start, f"file {number}, {kind.name}, {len(data)} bytes"))
    for name, count in counts.items():
        print(f"{name:7} {count.total():6} files: " + ", ".join(f"{n} {what}" for what, n in count.most_common()))
    print(
        f"{time.perf_counter() - started:.0f} s, the longest {longest[0]:.2f} s ({longest[1]}); "
        f"peak memory {peak_memory()}"
    )
    return 0


if __name__ == "__main__":
    sys.exit(main())
