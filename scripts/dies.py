#!/usr/bin/env python3
"""Verdicts on simulated dies whose true zero is known: how often right, wrong and undecided.

    python scripts/dies.py [--dies 500] [--seed 1] [--jobs 2]

The dies are invented: the elements of data_examples/line_buffer.toml, each off by 6 % (one standard deviation), the
resistor in turn intact, missing, 30 %, at gm2·Rz = 1 and 2.2 times. The exact third-order circuit is swept from 10 Hz
to 100 MHz in 281 points, with receiver floors of 2e-5 for a drive of 1 and a gain error of 0.1 %. Each sweep is held
against a design with spreads of 6 %, limits on the zero from 90 to 200 MHz, and the bench's delay stated as 0 ns; in a
second table as 0.4 ± 0.02 ns, with the true one drawn from that. A die is the same whatever the number of jobs.
"""

from __future__ import annotations

import argparse
import math
import signal
import statistics
import sys
import time
from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from functools import partial
from multiprocessing import get_context
from pathlib import Path

import numpy as np

import fitamp
from fitamp import Nulling

DESIGN_FILE = Path(__file__).resolve().parent.parent / "data_examples" / "line_buffer.toml"
FREQ_HZ = np.geomspace(10.0, 100e6, 281)
NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
SPREAD = 0.06
ELEMENTS = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
RESISTORS = (1.0, 0.0, 0.3, None, 2.2)  # times the die's Rz; None: 1/gm2
DELAYS = {"0 ns": (0.0, 0.0), "0.4 ± 0.02 ns": (0.4e-9, 0.02e-9)}
ZERO_LIMITS_HZ = (90e6, 200e6)
SMALL = 0.10  # of Cc/gm2 as designed: a zero time up to this counts as none
REGIONS = tuple(nulling for nulling in Nulling if nulling is not Nulling.UNDECIDED)
NO_FIT = "no fit"
CLEARLY = 3.0
NEAR_ONE = 0.25


@dataclass(frozen=True, slots=True, kw_only=True)
class Die:
    """One die's truth and what was said of it.

    product : true gm2·Rz; zero_time_s : true zero time in s
    verdict : None where the fit failed
    stderr_s, low_s, high_s : of the zero time that the verdict rests on, in s; None where there is none
    """

    product: float
    zero_time_s: float
    verdict: Nulling | None
    stderr_s: float | None
    low_s: float | None
    high_s: float | None
    seconds: float

    @property
    def region(self) -> Nulling:
        """Where the true zero time lies."""
        return next(name for name, (low, high) in regions().items() if low <= self.zero_time_s <= high)

    @property
    def is_decided(self) -> bool:
        """Whether the verdict names a region."""
        return self.verdict in REGIONS

    @property
    def is_wrong(self) -> bool:
        """Whether the verdict names another region than the true one."""
        return self.is_decided and self.verdict is not self.region

    @property
    def is_wrong_half_plane(self) -> bool:
        """Whether the verdict names a half plane and the true zero, not small, lies in the other."""
        if not self.is_decided or Nulling.AT_INFINITY in (self.verdict, self.region):
            return False
        return (self.verdict is Nulling.WRONG_SIDE) != (self.region is Nulling.WRONG_SIDE)

    @property
    def is_clear(self) -> bool:
        """Whether n is not near 1 and the true zero time is 3 standard errors or more from every limit.

        Without a standard error the zero counts as clear of the limits, so that giving none excuses nothing.
        """
        edges = [edge for pair in regions().values() for edge in pair if math.isfinite(edge)]
        nearest_s = min(abs(self.zero_time_s - edge) for edge in edges)
        far = self.stderr_s is None or nearest_s >= CLEARLY * self.stderr_s
        return far and abs(self.product - 1) > NEAR_ONE

    @property
    def covers(self) -> bool:
        """Whether the 95 % interval holds the true zero time; an open end holds all."""
        low = -math.inf if self.low_s is None else self.low_s
        return low <= self.zero_time_s <= (math.inf if self.high_s is None else self.high_s)

    @property
    def errors_off(self) -> float:
        """Standard errors from the true zero time to the region that the verdict names; infinite without one."""
        low, high = regions()[self.verdict] if self.verdict in REGIONS else (-math.inf, math.inf)
        distance_s = max(low - self.zero_time_s, self.zero_time_s - high, 0.0)
        return distance_s / self.stderr_s if self.stderr_s else math.inf


def nominal() -> fitamp.Elements:
    """The designed elements."""
    elements = fitamp.read_design(DESIGN_FILE).elements
    assert elements is not None
    return elements


def regions() -> dict[Nulling, tuple[float, float]]:
    """Ends of the regions of zero times in s, from the design's numbers alone and not by the package's own rules."""
    small_s = SMALL * NOMINAL.Cc / NOMINAL.gm2
    near_s, far_s = (1 / (2 * math.pi * limit_hz) for limit_hz in ZERO_LIMITS_HZ)
    return {
        Nulling.AS_DESIGNED: (far_s, near_s),
        Nulling.TOO_LITTLE: (small_s, far_s),
        Nulling.TOO_MUCH: (near_s, math.inf),
        Nulling.WRONG_SIDE: (-math.inf, -small_s),
        Nulling.AT_INFINITY: (-small_s, small_s),
    }


NOMINAL = nominal()


def design(delay_s: float, delay_sd_s: float) -> fitamp.Design:
    """What the dies are held against: 6 % spreads, limits on the zero, and this delay of the bench."""
    from fitamp.design import Bench, Limit

    return fitamp.Design.from_elements(
        NOMINAL,
        spreads=dict.fromkeys(ELEMENTS, SPREAD),
        limits={"zero_hz": Limit(low=ZERO_LIMITS_HZ[0], high=ZERO_LIMITS_HZ[1])},
        bench=Bench(delay_s=delay_s, delay_spread_s=delay_sd_s),
    )


def compare_die(index: int, *, seed: int, delay_s: float, delay_sd_s: float) -> Die:
    """Make die number `index`, measure and compare it. Its elements and noise are the same for any delay."""
    rng = np.random.default_rng([seed, index])
    factors = 1 + SPREAD * rng.standard_normal(len(ELEMENTS))
    die = NOMINAL.with_changes(
        **{name: getattr(NOMINAL, name) * factor for name, factor in zip(ELEMENTS, factors, strict=True)}
    )
    times = RESISTORS[index % len(RESISTORS)]
    resistor_ohm = 1 / die.gm2 if times is None else times * die.Rz
    die = die.with_changes(Rz=resistor_ohm, delay_s=max(delay_s + delay_sd_s * rng.standard_normal(), 0.0))
    gain = fitamp.simulate_bench(die.transfer().evaluate(FREQ_HZ), NOISE, rng)
    sweep, designed = fitamp.Sweep(freq_hz=FREQ_HZ, gain=gain), design(delay_s, delay_sd_s)
    start = time.perf_counter()
    try:
        verdict = fitamp.compare(sweep, designed).verdict
    except fitamp.FitError:
        verdict = None
    low, high = (None, None) if verdict is None else verdict.zero_time_s.ci95
    return Die(
        product=die.nulling_product,
        zero_time_s=die.zero_time_s,
        verdict=None if verdict is None else verdict.nulling,
        stderr_s=None if verdict is None else verdict.zero_time_s.stderr,
        low_s=low,
        high_s=high,
        seconds=time.perf_counter() - start,
    )


def table(dies: Sequence[Die]) -> str:
    """Confusion table with the share of intervals that hold the truth in each row."""
    heads = [*REGIONS, Nulling.UNDECIDED, NO_FIT, "covered"]
    widths = [max(len(head), 6) for head in heads]
    cells = "  ".join(f"{head:>{width}}" for head, width in zip(heads, widths, strict=True))
    lines = [f"{'true region':<12}  {cells}"]
    for region in REGIONS:
        row = [die for die in dies if die.region is region]
        counts = Counter(die.verdict or NO_FIT for die in row)
        texts = [str(counts[head]) for head in heads[:-1]] + [share(die.covers for die in row)]
        cells = "  ".join(f"{text:>{width}}" for text, width in zip(texts, widths, strict=True))
        lines.append(f"{region:<12}  {cells}")
    return "\n".join(lines)


def summary(dies: Sequence[Die]) -> str:
    """What the table comes to, one line a question."""
    wrong = [die for die in dies if die.is_wrong]
    clear = [die for die in dies if die.is_clear]
    undecided = [die for die in dies if not die.is_decided]
    numbered = [die for die in dies if die.stderr_s is not None]
    # Where the interval lies in one region and there is still no verdict, the model did not describe the sweep.
    one_region = sum(
        any(low <= die.low_s and die.high_s <= high for low, high in regions().values())
        for die in undecided
        if die.low_s is not None and die.high_s is not None
    )
    no_number = sum(die.stderr_s is None for die in undecided)
    far = f", at most {max(die.errors_off for die in wrong):.2f} standard errors from it" if wrong else ""
    lines = {
        "wrong half plane": f"{sum(die.is_wrong_half_plane for die in dies)} of {len(dies)}",
        "wrong across a limit": f"{len(wrong)} of {len(dies)} ({share(die.is_wrong for die in dies)}){far}",
        f"undecided, |n − 1| > {NEAR_ONE} and {CLEARLY:g} standard errors from every limit": (
            f"{sum(not die.is_decided for die in clear)} of {len(clear)} ({share(not die.is_decided for die in clear)})"
        ),
        "undecided in all": (
            f"{len(undecided)} of {len(dies)}: {len(undecided) - one_region - no_number} reach into several regions, "
            f"{one_region} not described by the model, {no_number} without a zero time"
        ),
        "95 % interval holds the zero time": (
            f"{share(die.covers for die in numbered)} of {len(numbered)} with a standard error"
        ),
        "median time per die": f"{statistics.median(die.seconds for die in dies):.3f} s",
    }
    return "\n".join(f"{question}: {answer}" for question, answer in lines.items())


def share(flags: Iterable[bool]) -> str:
    """Share of flags that are set, in percent; a dash of none."""
    found = list(flags)
    return f"{sum(found) / len(found):.1%}" if found else "–"


def deaf() -> None:
    """Leave Ctrl-C to the parent process."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)


@contextmanager
def mapper(jobs: int) -> Iterator[Callable[[Callable[[int], Die], Iterable[int]], Iterable[Die]]]:
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
    """Run and print both tables."""
    from rich.console import Console
    from rich.progress import Progress

    args = parser().parse_args(arguments)
    print(f"{args.dies} simulated dies, seed {args.seed}; noise unknown to the fit", flush=True)
    errors = Console(stderr=True)
    with (
        mapper(args.jobs) as mapped,
        Progress(console=errors, transient=True, disable=not errors.is_terminal, redirect_stdout=False) as progress,
    ):
        for words, (delay_s, delay_sd_s) in DELAYS.items():
            work = partial(compare_die, seed=args.seed, delay_s=delay_s, delay_sd_s=delay_sd_s)
            found = progress.track(mapped(work, range(args.dies)), total=args.dies, description=f"delay {words}")
            dies = list(found)
            print(f"\n[bench] delay stated as {words}\n{table(dies)}\n{summary(dies)}", flush=True)


def parser() -> argparse.ArgumentParser:
    """Options of the script."""
    made = argparse.ArgumentParser(
        prog="dies", description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    made.add_argument("--dies", type=partial(whole, least=1), default=500, help="how many (default 500)")
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
