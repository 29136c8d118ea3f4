#!/usr/bin/env python3
"""Verdicts on simulated dies whose true zero is known: how often right, wrong and undecided.

    python scripts/dies.py [--dies 500] [--near 1000] [--seed 1] [--jobs 2]

The dies are invented: the elements of data_examples/line_buffer.toml, each off by 6 % (one standard deviation), the
resistor in turn intact, missing, 30 %, at gm2·Rz = 1 and 2.2 times. The exact third-order circuit is swept from 10 Hz
to 100 MHz in 281 points, with receiver floors of 2e-5 for a drive of 1 and a gain error of 0.1 %. Each sweep is held
against a design with spreads of 6 %, limits on the zero from 90 to 200 MHz, and the bench's delay stated as 0 ns; then
as 0.4 ± 0.02 ns, with the true one drawn from that. A second lot has resistors that put the zero near a limit, as far
off as chance has it, up to six of the standard errors that sweep and design leave of it at the best: there a verdict
is easily wrong, a third has to stay open, and of those beyond three standard errors one in forty.

Each lot has two tables: what `compare` answers, whose zero time comes from the circuit's elements unless there is a
doubt about them, and what two poles and a zero alone say of the same sweeps. A die is the same whatever the number of
jobs.
"""

from __future__ import annotations

import argparse
import signal
import statistics
import sys
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from functools import partial
from itertools import product
from multiprocessing import get_context

from judging.judged import Die, compare_die
from judging.making import Lot
from judging.tables import summary, table

DELAYS = {"0 ns": (0.0, 0.0), "0.4 ± 0.02 ns": (0.4e-9, 0.02e-9)}
Mapper = Callable[[Callable[[int], Die], Iterable[int]], Iterable[Die]]


def deaf() -> None:
    """Leave Ctrl-C to the parent process."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)


@contextmanager
def mapper(jobs: int) -> Iterator[Mapper]:
    """A map over so many processes, in order; without processes for one job."""
    if jobs == 1:
        yield map
        return
    pool = ProcessPoolExecutor(jobs, mp_context=get_context("spawn"), initializer=deaf)

    def pool_map(work: Callable[[int], Die], indices: Iterable[int]) -> Iterable[Die]:
        # Here the processes start, and they inherit what is ignored: no traceback of one that is still importing.
        before = signal.signal(signal.SIGINT, signal.SIG_IGN)
        try:
            return pool.map(work, indices)
        finally:
            signal.signal(signal.SIGINT, before)

    try:
        yield pool_map
    finally:
        pool.shutdown(cancel_futures=True)


def run(arguments: Sequence[str]) -> None:
    """Run and print all tables."""
    from rich.console import Console
    from rich.progress import Progress

    args = parser().parse_args(arguments)
    print(f"simulated dies, seed {args.seed}; noise unknown to the fit", flush=True)
    errors = Console(stderr=True)
    with (
        mapper(args.jobs) as mapped,
        Progress(console=errors, transient=True, disable=not errors.is_terminal, redirect_stdout=False) as progress,
    ):
        for (lot, count), (words, (delay_s, delay_sd_s)) in product(
            {Lot.RESISTORS: args.dies, Lot.LIMITS: args.near}.items(), DELAYS.items()
        ):
            if not count:
                continue
            work = partial(compare_die, lot=lot, seed=args.seed, delay_s=delay_s, delay_sd_s=delay_sd_s)
            dies = list(progress.track(mapped(work, range(count)), total=count, description=f"delay {words}"))
            print(f"\n{count} dies: {lot}; [bench] delay stated as {words}")
            for title, judged in (
                ("compare", [die.compared for die in dies]),
                ("two poles and a zero alone", [die.behaviour for die in dies]),
            ):
                print(f"\n{title}\n{table(judged)}\n{summary(judged)}", flush=True)
            print(
                f"\nmedian time of compare per die: {statistics.median(die.seconds for die in dies):.3f} s", flush=True
            )


def parser() -> argparse.ArgumentParser:
    """Options of the script."""
    made = argparse.ArgumentParser(
        prog="dies", description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    made.add_argument("--dies", type=partial(whole, least=0), default=500, help="with resistors in turn (default 500)")
    made.add_argument("--near", type=partial(whole, least=0), default=1000, help="near limits (default 1000)")
    made.add_argument("--seed", type=partial(whole, least=0), default=1, help="of elements and noise (default 1)")
    made.add_argument("--jobs", type=partial(whole, least=1), default=2, help="processes (default 2)")
    return made


def whole(text: str, *, least: int) -> int:
    """A whole number of at least `least`."""
    if not text.isdecimal() or int(text) < least:
        raise argparse.ArgumentTypeError(f"{text!r} is not a whole number of {least} or more")
    return int(text)


def main(arguments: Sequence[str]) -> int:
    """Run and print; the exit code."""
    try:
        run(arguments)
    except KeyboardInterrupt:
        print("dies: interrupted", file=sys.stderr)
        return 130
    return 0


if __name__ == "__main__":
    for stream in (sys.stdout, sys.stderr):
        # A console in a legacy code page must not stop a table over a ±.
        stream.reconfigure(errors="replace")
    sys.exit(main(sys.argv[1:]))
