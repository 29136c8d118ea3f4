#!/usr/bin/env python3
"""fitamp against plain scripts and general rational fits, each error as a ratio to the Cramér–Rao bound.

    python scripts/benchmark.py [--runs 40] [--seed 1] [--scenario NAME] [--methods NAME ...] [--markdown]

Every method gets the same noisy sweeps of a scenario; the noise is told to none. Errors are those of the runs that did
not fail. A run fails when the method raises, has no finite number for what is judged, has other real roots than the
circuit, or puts pole 2 off by more than a factor of 2. Times are medians within this run; "cost" is fitamp's time over
the method's.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence


def main(arguments: Sequence[str]) -> int:
    """Run and print; the exit code."""
    try:
        return _run(arguments)
    except KeyboardInterrupt:
        print("benchmark: interrupted", file=sys.stderr)
        return 130


def _run(arguments: Sequence[str]) -> int:
    from benchmarking.methods import Method
    from benchmarking.running import run_scenario, warm_up
    from benchmarking.scenarios import SCENARIOS
    from benchmarking.tables import markdown_head, markdown_rows, text_table
    from rich.console import Console
    from rich.progress import Progress

    args = _parser(tuple(SCENARIOS), tuple(Method)).parse_args(arguments)
    chosen = [scenario for name, scenario in SCENARIOS.items() if args.scenario in (None, name)]
    methods = [method for method in Method if method in args.methods]
    # Of n normal errors of standard deviation 1, the root mean square is known to 1/√(2n) and the mean to 1/√n.
    chance = f"±{(2 * args.runs) ** -0.5:.0%} in RMSE/bound, ±{args.runs**-0.5:.2f} in bias/bound"
    print(f"{args.runs} noisy sweeps a scenario, seed {args.seed}; chance leaves {chance}", end="\n\n", flush=True)
    if args.markdown:
        print(markdown_head(), flush=True)
    errors = Console(stderr=True)
    with Progress(console=errors, transient=True, disable=not errors.is_terminal, redirect_stdout=False) as progress:
        task = progress.add_task("warming up", total=len(chosen) * args.runs)
        warm_up(methods, args.seed)
        for scenario in chosen:
            progress.update(task, description=scenario.name)
            scores = run_scenario(
                scenario, methods, runs=args.runs, seed=args.seed, done=lambda: progress.advance(task)
            )
            text = markdown_rows(scenario, scores) if args.markdown else text_table(scenario, scores) + "\n"
            print(text, flush=True)
    return 0


def _parser(scenarios: Sequence[str], methods: Sequence[str]) -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="benchmark", description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--runs", type=_count, default=40, help="noisy sweeps a scenario (default 40)")
    parser.add_argument("--seed", type=_not_negative, default=1, help="of the noise (default 1)")
    parser.add_argument("--scenario", choices=scenarios, metavar="NAME", help=f"only one of {', '.join(scenarios)}")
    parser.add_argument(
        "--methods", nargs="+", choices=methods, default=list(methods), metavar="NAME", help=f"of {', '.join(methods)}"
    )
    parser.add_argument("--markdown", action="store_true", help="one table, one row a scenario and method")
    return parser


def _count(text: str) -> int:
    return _at_least(text, 1)


def _not_negative(text: str) -> int:
    return _at_least(text, 0)


def _at_least(text: str, least: int) -> int:
    if not text.isdecimal() or int(text) < least:
        raise argparse.ArgumentTypeError(f"{text!r} is not a whole number of {least} or more")
    return int(text)


if __name__ == "__main__":
    for stream in (sys.stdout, sys.stderr):
        # A console in a legacy code page must not stop a table over a τ.
        stream.reconfigure(errors="replace")
    sys.exit(main(sys.argv[1:]))
