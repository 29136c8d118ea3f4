#!/usr/bin/env python3
"""How sure element values are: what sets of sweeps promise, what simulated parts show, and what it costs.

    python scripts/elements.py [--single 200] [--stepped 20] [--seed 1] [--timed 5]

The parts are invented: the elements of data_examples/line_buffer.toml, of a design with spreads of 20 %. A part of the
single sweeps is drawn from those spreads (normal deviates of the logarithms), a part of the stepped ones has every
element off by 12 % (one standard deviation). The exact third-order circuit is swept from 10 Hz to 100 MHz in 281
points, with receiver floors of 2e-5 for a drive of 1 and a gain error of 0.1 %, which the estimate is not told.
"""

from __future__ import annotations

import argparse
import statistics
import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

import fitamp
from fitamp.design import Bench
from fitamp.elements import Circuit, Condition, ElementEstimate, information, informed_shares

DESIGN_FILE = Path(__file__).resolve().parent.parent / "data_examples" / "line_buffer.toml"
FREQ_HZ = np.geomspace(10.0, 100e6, 281)
NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
ELEMENTS = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
SPREAD, STEPPED_SPREAD = 0.20, 0.12
BASE = Condition()
STEPS = (
    BASE,
    Condition(load_added_f=5e-12),
    Condition(load_added_f=15e-12),
    Condition(rz_added_ohm=-400.0),
    Condition(rz_added_ohm=500.0),
)
PLANS = {
    "one sweep": STEPS[:1],
    "0/5/10/20 pF": tuple(Condition(load_added_f=load_f) for load_f in (0.0, 5e-12, 10e-12, 20e-12)),
    "0/−400/+400 Ω": tuple(Condition(rz_added_ohm=rz_ohm) for rz_ohm in (0.0, -400.0, 400.0)),
    "the five steps": STEPS,
}
Found = tuple[fitamp.Elements, ElementEstimate]


def nominal() -> fitamp.Elements:
    """The designed elements."""
    elements = fitamp.read_design(DESIGN_FILE).elements
    assert elements is not None
    return elements


def design() -> fitamp.Design:
    """Their design with equal spreads and a bench that adds nothing."""
    return fitamp.Design.from_elements(
        nominal(), spreads=dict.fromkeys(ELEMENTS, SPREAD), bench=Bench(delay_s=0.0), file="line buffer"
    )


def swept(part: fitamp.Elements, steps: Sequence[Condition], rng: np.random.Generator) -> list[fitamp.Sweep]:
    """What the bench reads under each condition."""
    sweeps = []
    for step in steps:
        seen = replace(part, CL=part.CL + step.load_added_f, Rz=part.Rz + step.rz_added_ohm)
        gain = fitamp.simulate_bench(seen.transfer().evaluate(FREQ_HZ), NOISE, rng)
        sweeps.append(fitamp.Sweep(freq_hz=FREQ_HZ, gain=gain))
    return sweeps


def estimated(
    parts: int, seed: int, steps: Sequence[Condition], draw: Callable[[np.random.Generator], float]
) -> Iterator[Found]:
    """Parts and their estimates; `draw` gives the factor on an element."""
    for index in range(parts):
        rng = np.random.default_rng([seed, index])
        part = replace(nominal(), **{name: getattr(nominal(), name) * draw(rng) for name in ELEMENTS})
        yield part, fitamp.estimate_elements(swept(part, steps, rng), design(), conditions=steps)


def print_plans() -> None:
    """Relative standard deviations to be expected, and the shares that come from the data."""
    circuit = Circuit.from_design(replace(design(), under_test=frozenset()))
    scale = np.where(np.array(circuit.names) == "Rz", nominal().nulling_product, 1.0)
    print("expected relative standard deviation, every element with a prior of 20 %, and share that the data tell")
    print(f"{'sweeps':<16}" + "".join(f"{name:>9}" for name in ELEMENTS))
    for name, steps in PLANS.items():
        total = circuit.prior_information()
        for step in steps:
            total = total + information(circuit, circuit.designed, FREQ_HZ, NOISE, condition=step)
        covariance = np.linalg.inv(total)
        print(f"{name:<16}" + "".join(f"{sd:>9.4f}" for sd in np.sqrt(np.diag(covariance)) / scale))
        print(f"{'':<16}" + "".join(f"{share:>9.2f}" for share in informed_shares(circuit, covariance)))


def print_campaign(title: str, found: Sequence[Found]) -> None:
    """One line an element, and the zero time, over all parts."""
    print(f"\n{title}")
    print(f"{'element':<12}{'covered':>9}{'mean z':>8}{'sd z':>7}{'median |error|':>16}{'largest':>9}{'informed':>10}")
    inside = []
    for name in ELEMENTS:
        zs, errors, covered, informed = [], [], [], []
        for part, estimate in found:
            one, true = estimate.element(name), getattr(part, name)
            zs.append((one.estimate.value - true) / one.estimate.stderr)
            errors.append(abs(one.estimate.value / true - 1))
            covered.append(one.estimate.ci95[0] <= true <= one.estimate.ci95[1])
            informed.append(one.informed)
        inside += covered
        print(
            f"{name:<12}{np.mean(covered):>9.1%}{np.mean(zs):>+8.2f}{np.std(zs):>7.2f}{np.median(errors):>15.2%}"
            f"{max(errors):>9.2%}{np.median(informed):>10.2f}"
        )
    zeros = [(part.zero_time_s, estimate.zero_time_s) for part, estimate in found]
    zs = [(zero.value - true) / zero.stderr for true, zero in zeros]
    covered = [zero.ci95[0] <= true <= zero.ci95[1] for true, zero in zeros]
    print(f"{'zero time':<12}{np.mean(covered):>9.1%}{np.mean(zs):>+8.2f}{np.std(zs):>7.2f}")
    doubtful = sum(not estimate.is_trustworthy for _, estimate in found)
    print(f"all elements together covered {np.mean(inside):.1%}; {doubtful} of {len(found)} called not trustworthy")


def print_cost(timed: int, seed: int) -> None:
    """Ratios of medians, timed in turn."""
    times: dict[str, list[float]] = {"fit": [], "one": [], "five": []}
    for index in range(timed + 1):  # the first one pays for the imports
        rng = np.random.default_rng([seed, index])
        sweeps = swept(nominal(), STEPS, rng)
        works: dict[str, Callable[[], object]] = {
            "fit": lambda sweeps=sweeps: fitamp.fit_sweep(sweeps[0]),
            "one": lambda sweeps=sweeps: fitamp.estimate_elements(sweeps[0], design()),
            "five": lambda sweeps=sweeps: fitamp.estimate_elements(sweeps, design(), conditions=STEPS),
        }
        for name, work in works.items():
            start = time.perf_counter()
            work()
            times[name].append(time.perf_counter() - start)
    fit, one, five = (statistics.median(times[name][1:]) for name in ("fit", "one", "five"))
    print(
        f"\ncost, medians of {timed}: one sweep {one / fit:.1f} times fit_sweep, five steps {five / one:.1f} times one"
    )


def main() -> None:
    """Run and print all tables."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--single", type=int, default=200, help="parts with one sweep each")
    parser.add_argument("--stepped", type=int, default=20, help="parts with five steps each")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--timed", type=int, default=5, help="parts that are timed")
    args = parser.parse_args()
    print_plans()
    if args.single:
        found = list(estimated(args.single, args.seed, STEPS[:1], lambda rng: np.exp(SPREAD * rng.standard_normal())))
        print_campaign(f"{args.single} single sweeps, seed {args.seed}, parts drawn from the design's spreads", found)
    if args.stepped:
        found = list(estimated(args.stepped, args.seed, STEPS, lambda rng: 1 + STEPPED_SPREAD * rng.standard_normal()))
        print_campaign(f"{args.stepped} parts in five steps, seed {args.seed}, elements off by 12 %", found)
    if args.timed:
        print_cost(args.timed, args.seed)


if __name__ == "__main__":
    main()
