#!/usr/bin/env python3
"""What an analysis costs: its time over that of a plain lmfit fit of the same data, and against the number of points.

    python scripts/cost.py [--runs 9] [--case NAME ...] [--points 100 1000 10000 100000] [--profile]

The plain fit is the benchmark's: four parameters, logarithms, no noise model, one start. The whole analysis is start,
noise, search, lags, intervals, margins and verdict on the residuals; the case "design" fits with what a design file
expects, "compare" is all of `fitamp compare` but reading and writing. Both are timed in turn on the same noisy sweeps
by the processor's clock, which others on the machine hardly move; medians are compared. `--profile` shows instead where
each case spends its time.
"""

from __future__ import annotations

import argparse
import cProfile
import pstats
import statistics
import sys
import time
import warnings
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from benchmarking.methods import METHODS, Method
from benchmarking.scenarios import NOISE, SCENARIOS, Scenario

import fitamp
from fitamp.comparison.expectation import expectation

DESIGN = Path(__file__).resolve().parent.parent / "data_examples" / "line_buffer.toml"
SCALED = "left-zero"
REFERENCE_POINTS = 1000
# Sweeps beyond this size are timed a few times only.
LARGE, RUNS_IF_LARGE = 20_000, 3
PROFILE_LINES = 40


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """Something to time: how a noisy sweep comes about, what is done with it, and the scenario of the plain fit."""

    name: str
    plain: Scenario
    measure: Callable[[np.random.Generator], np.ndarray]
    analyse: Callable[[fitamp.Sweep], object]

    def sweep(self, rng: np.random.Generator) -> fitamp.Sweep:
        """One noisy sweep."""
        return fitamp.Sweep(freq_hz=self.plain.freq_hz, gain=self.measure(rng))


def of_scenario(scenario: Scenario) -> Case:
    """The fit of a scenario of the benchmark, told what the benchmark tells it."""
    return Case(
        name=scenario.name,
        plain=scenario,
        measure=scenario.measure,
        analyse=lambda sweep: fitamp.fit_sweep(sweep, far_pole=scenario.far_pole, delay=scenario.delay),
    )


def with_design() -> Iterator[Case]:
    """Parts as designed in the examples' design file, fitted with its expectation, and compared."""
    design = fitamp.read_design(str(DESIGN))
    plain = SCENARIOS[SCALED]
    exact = design.on_bench().evaluate(plain.freq_hz)
    for name, analyse in (
        ("design", lambda sweep: fitamp.fit_sweep(sweep, **expectation(design).as_arguments())),
        ("compare", lambda sweep: fitamp.compare(sweep, design)),
    ):
        yield Case(
            name=name, plain=plain, measure=lambda rng: fitamp.simulate_bench(exact, NOISE, rng), analyse=analyse
        )


def medians(case: Case, runs: int) -> tuple[float, float]:
    """Milliseconds of the analysis and of the plain fit, each the median of `runs` sweeps fitted in turn."""
    whole, plain = [], []
    for run in range(runs):
        sweep = case.sweep(np.random.default_rng([7, run]))
        whole.append(milliseconds(lambda sweep=sweep: case.analyse(sweep)))
        plain.append(milliseconds(lambda sweep=sweep: METHODS[Method.LMFIT_LOG](case.plain, sweep.gain)))
    return statistics.median(whole), statistics.median(plain)


def milliseconds(work: Callable[[], object]) -> float:
    """Processor time of some work, of all threads; what a plain fit warns of is not what is measured here."""
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        warnings.simplefilter("ignore")
        start = time.process_time()
        work()
        return 1e3 * (time.process_time() - start)


def print_ratios(cases: Sequence[Case], runs: int) -> None:
    """One line a case."""
    print(f"whole analysis over plain fit, medians of {runs} sweeps of {SCENARIOS[SCALED].points} points")
    print(f"{'case':<15}{'whole ms':>10}{'plain ms':>10}{'ratio':>8}", flush=True)
    ratios = []
    for case in cases:
        whole, plain = medians(case, runs)
        ratios.append(whole / plain)
        print(f"{case.name:<15}{whole:>10.1f}{plain:>10.2f}{whole / plain:>8.1f}", flush=True)
    print(f"{'median':<15}{'':>20}{statistics.median(ratios):>8.1f}\n", flush=True)


def print_scaling(points: Sequence[int], runs: int) -> None:
    """One line a number of points; per point, against that at the reference."""
    print(f"time against points, scenario {SCALED}")
    print(f"{'points':<15}{'whole ms':>10}{'plain ms':>10}{'ratio':>8}   per point, {REFERENCE_POINTS} = 1")
    found = {}
    for count in sorted({*points, REFERENCE_POINTS}):
        case = of_scenario(replace(SCENARIOS[SCALED], points=count))
        found[count] = medians(case, min(runs, RUNS_IF_LARGE) if count > LARGE else runs)
    reference = found[REFERENCE_POINTS][0] / REFERENCE_POINTS
    for count in sorted(points):
        whole, plain = found[count]
        print(f"{count:<15}{whole:>10.1f}{plain:>10.2f}{whole / plain:>8.1f}   {whole / count / reference:.2f}")


def print_profile(case: Case, runs: int) -> None:
    """Where the analysis of a case spends its time, by cumulative time."""
    profile = cProfile.Profile()
    for run in range(runs):
        sweep = case.sweep(np.random.default_rng([7, run]))
        profile.runcall(case.analyse, sweep)
    print(f"{case.name}: {runs} sweeps")
    pstats.Stats(profile).strip_dirs().sort_stats("cumulative").print_stats(PROFILE_LINES)


def main(arguments: Sequence[str]) -> int:
    """Run and print; the exit code."""
    cases = {case.name: case for case in (*map(of_scenario, SCENARIOS.values()), *with_design())}
    parser = argparse.ArgumentParser(
        prog="cost", description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--runs", type=int, default=9, help="noisy sweeps a line (default 9)")
    parser.add_argument("--case", nargs="+", choices=cases, metavar="NAME", help=f"of {', '.join(cases)}")
    parser.add_argument("--points", nargs="*", type=int, default=[100, 1000, 10_000, 100_000], metavar="N")
    parser.add_argument("--profile", action="store_true", help="show where the time goes instead")
    args = parser.parse_args(arguments)
    if args.runs < 1 or min(args.points, default=100) < 100:
        parser.error("--runs must be 1 or more, --points 100 or more")
    chosen = [case for name, case in cases.items() if args.case is None or name in args.case]
    for case in chosen:  # so that no line pays for imports
        medians(case, 1)
    if args.profile:
        for case in chosen:
            print_profile(case, args.runs)
        return 0
    print_ratios(chosen, args.runs)
    if args.points:
        print_scaling(args.points, args.runs)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
