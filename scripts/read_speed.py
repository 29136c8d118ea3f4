#!/usr/bin/env python3
"""What it costs to be told nothing: fitamp.read_sweep against pandas.read_csv that is told everything in advance.

    python scripts/read_speed.py [--rows 1000000] [--runs 7]

Both read the same invented file in turn, pandas with separator, header and types given. Times of a shared machine vary,
ratios within one run hardly do; the ratio of each pair of readings is taken, and the median of these is printed, with
the smallest and the largest. The long way, which a file goes that is not plain throughout, is timed on a tenth of the
rows with a word in a column that is not in use.
"""

from __future__ import annotations

import argparse
import statistics
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd

import fitamp

TYPES = {"freq_hz": float, "re": float, "im": float}


def write(path: Path, rows: int, *, status: str = "") -> None:
    """Write an invented sweep of so many rows, full digits, with a status column where one is given."""
    freq_hz = np.logspace(1, 8, rows)
    gain = 1e4 * (1 + 1j * freq_hz / 1.6e8) / (1 + 1j * freq_hz / 1e3) / (1 + 1j * freq_hz / 5e7)
    with path.open("w", encoding="utf-8", newline="\n") as stream:
        stream.write("freq_hz,re,im" + (",status" if status else "") + "\n")
        end = f",{status}\n" if status else "\n"
        triples = zip(freq_hz.tolist(), gain.real.tolist(), gain.imag.tolist(), strict=True)
        stream.writelines(f"{f!r},{re!r},{im!r}{end}" for f, re, im in triples)


def seconds(work: Callable[[], object]) -> float:
    """Wall time of one call."""
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def compare(path: Path, runs: int) -> None:
    """Time both readers in turn and print the ratios."""
    told = {**TYPES, "status": str}
    names = path.read_bytes().split(b"\n", 1)[0].decode().split(",")
    types = {name: told[name] for name in names}
    pairs = []
    for _ in range(runs + 1):
        by_pandas = seconds(lambda: pd.read_csv(path, sep=",", header=0, dtype=types, engine="c", encoding="utf-8"))
        pairs.append((seconds(lambda: fitamp.read_sweep(path)), by_pandas))
    ratios = [ours / theirs for ours, theirs in pairs[1:]]  # the first round warms the file cache
    ours, theirs = (statistics.median(times) for times in zip(*pairs[1:], strict=True))
    print(f"{path.stat().st_size / 1e6:8.1f} MB  {path.name}")
    print(f"{theirs:8.3f} s   pandas.read_csv, told separator, header and types")
    print(f"{ours:8.3f} s   fitamp.read_sweep, told nothing")
    print(f"{statistics.median(ratios):8.2f}     ratio ({min(ratios):.2f} to {max(ratios):.2f} in {runs} pairs)")


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--rows", type=int, default=1_000_000)
    parser.add_argument("--runs", type=int, default=7)
    args = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        plain, words = Path(folder) / "plain.csv", Path(folder) / "with_words.csv"
        write(plain, args.rows)
        compare(plain, args.runs)
        write(words, max(args.rows // 10, 1), status="OK")
        compare(words, max(args.runs // 2, 1))


if __name__ == "__main__":
    main()
