#!/usr/bin/env python3
"""Whether plans keep what they promise: expected standard deviations against the scatter of simulated campaigns.

    python scripts/plan_check.py [--runs 200] [--seed 1] [--sweeps 4] [--centre] [--unknown-noise]

The design is data_examples/line_buffer.toml, the list 0, 5, 10 and 20 pF with 0, 500 and −400 Ω. Each campaign draws a
part (and the bench's load and delay) from the design's spreads, simulates the planned sweeps with the noise that the
plan assumed, and estimates the elements. With --centre every part is the designed one; then only what the sweeps tell,
and not the priors, can be checked (CL hangs on that of the bench's load). With --unknown-noise the estimate is not told
the noise levels; that it has to find them costs some per cent.

Before that, tables of what sets of sweeps promise where every element is known to 20 % beforehand: 281 points from
10 Hz to 100 MHz and to 1 GHz.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

import fitamp
from fitamp.design import Bench
from fitamp.elements import Circuit
from fitamp.planning import DEFAULT_NOISE, expected_precision

DESIGN_FILE = Path(__file__).resolve().parent.parent / "data_examples" / "line_buffer.toml"
ELEMENTS = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
LOADS_F = (0.0, 5e-12, 10e-12, 20e-12)
RESISTANCES_OHM = (0.0, 500.0, -400.0)
SETS = {
    "one sweep": ((0.0,), (0.0,)),
    "0/5/10/20 pF": (LOADS_F, (0.0,)),
    "0/−400/+400 Ω": ((0.0,), (0.0, -400.0, 400.0)),
}
TOPS_HZ = (100e6, 1e9)
# Over so many parts of its own the plan takes the mean.
PARTS = 200
# What a plan is held against, and the unit in which both are printed.
QUANTITIES = {"zero_time_s": ("zero time", 1e-12, "ps"), "pole2_hz": ("pole 2", 1e3, "kHz")}
QUANTITIES |= {"gm2_rz": ("gm2·Rz", 1e-3, "1e-3"), "phase_margin_deg": ("phase margin", 1e-3, "m°")}


def print_sets(design: fitamp.Design) -> None:
    """Relative standard deviations that sets of sweeps promise, with equal priors."""
    assert design.elements is not None
    equal = fitamp.Design.from_elements(
        design.elements, spreads=dict.fromkeys(ELEMENTS, 0.2), under_test=(), bench=Bench(delay_s=0.0), file="equal"
    )
    print("expected relative standard deviation, every element known to 20 % beforehand")
    for top_hz in TOPS_HZ:
        print(f"\n{'up to ' + f'{top_hz / 1e6:g} MHz':<16}" + "".join(f"{name:>9}" for name in ELEMENTS))
        sweeps = {
            name: fitamp.affordable_sweeps(
                equal, loads_f=loads_f, resistances_ohm=resistances_ohm, bands_hz=[(10.0, top_hz)]
            )
            for name, (loads_f, resistances_ohm) in SETS.items()
        }
        sweeps["both"] = tuple(dict.fromkeys(sweeps["0/5/10/20 pF"] + sweeps["0/−400/+400 Ω"]))
        for name, those in sweeps.items():
            stage = expected_precision(equal, those)
            print(f"{name:<16}" + "".join(f"{stage.of(element).relative:>9.4f}" for element in ELEMENTS))


def swept(
    circuit: Circuit, values: np.ndarray, sweeps: Sequence[fitamp.PlannedSweep], rng: np.random.Generator
) -> list[fitamp.Sweep]:
    """What the bench reads of a part, by the polynomial form of the loop gain."""
    delay_s = circuit.physical(values)["bench_delay_s"]
    found = []
    for number, sweep in enumerate(sweeps, start=1):
        gain = circuit.loaded(values, sweep.condition).transfer().evaluate(sweep.freq_hz)
        gain = fitamp.simulate_bench(gain * np.exp(-2j * np.pi * sweep.freq_hz * delay_s), DEFAULT_NOISE, rng)
        origin = fitamp.sweep.Origin(file=f"step{number}.csv", form="simulated")
        found.append(fitamp.Sweep(freq_hz=sweep.freq_hz, gain=gain, origin=origin))
    return found


def drawn(circuit: Circuit, design: fitamp.Design, rng: np.random.Generator) -> np.ndarray:
    """A part from the design's spreads, with the bench it is on."""
    values = circuit.designed
    for index, one in enumerate(circuit.parameters):
        spread = one.prior_sd
        if spread is None:  # Rz, under test
            spread = design.spreads[one.name] * one.prior_mean
        values[index] += spread * rng.standard_normal()
    return values


def errors_of(estimate: fitamp.ElementEstimate, circuit: Circuit, values: np.ndarray) -> dict[str, float]:
    """Estimate less truth: of elements as a share of the truth (of Rz of the design), else in SI units."""
    true = circuit.physical(values)
    found = {name: np.log(estimate.element(name).estimate.value / true[name]) for name in ELEMENTS if name != "Rz"}
    found["Rz"] = (estimate.element("Rz").estimate.value - true["Rz"]) / circuit.nominal.Rz
    part = circuit.loaded(values)
    exact = {
        "zero_time_s": part.zero_time_s,
        "pole2_hz": sorted(abs(pole) for pole in part.transfer().poles_hz)[1],
        "gm2_rz": part.nulling_product,
        "phase_margin_deg": fitamp.loop_margins(part.transfer()).phase_margin_deg,
    }
    return found | {name: getattr(estimate.derived, name).value - exact[name] for name in QUANTITIES}


def print_campaigns(design: fitamp.Design, plan: fitamp.Plan, options: argparse.Namespace) -> None:
    """A line a number: promised at the design's centre and over its parts, scattered, and the ratios.

    A ratio is uncertain by chance as a standard deviation is, ±√((κ − 1)/4n) with the kurtosis κ of the errors: 5 % of
    200 normal deviates, and more where parts differ in how sure they are. The last ratio is of errors each divided by
    the promise made at that very part.
    """
    circuit = Circuit.from_design(design)
    conditions = [sweep.condition for sweep in plan.sweeps]
    noise = None if options.unknown_noise else plan.noise
    errors: dict[str, list[float]] = {name: [] for name in (*ELEMENTS, *QUANTITIES)}
    own: dict[str, list[float]] = {name: [] for name in errors}
    for run in range(options.runs):
        rng = np.random.default_rng([options.seed, run])
        values = circuit.designed if options.centre else drawn(circuit, design, rng)
        sweeps = swept(circuit, values, plan.sweeps, rng)
        estimate = fitamp.estimate_elements(sweeps, design, conditions=conditions, noise=noise)
        there = expected_precision(replace(design, elements=circuit.elements(values)), plan.sweeps)
        for name, error in errors_of(estimate, circuit, values).items():
            one = there.of(name)
            share = circuit.nominal.Rz if name == "Rz" else one.value
            errors[name].append(error)
            own[name].append(error / (one.sd / (share if name in ELEMENTS else 1.0)))
    print(
        f"{'':<14}{'at centre':>13}{'over parts':>13}{'scatter':>13}{'to centre':>11}{'to parts':>10}{'by chance':>11}"
        f"{'mean/sd':>9}{'to own':>8}"
    )
    for name, those in errors.items():
        one = plan.last.of(name)
        share = one.value if name in ELEMENTS else 1.0
        label, scale, unit = (name, 0.01, "%") if name in ELEMENTS else QUANTITIES[name]
        squares = np.square(those)
        scatter, mean = float(np.sqrt(squares.mean())), float(np.mean(those))
        chance = float(np.sqrt(squares.var() / len(squares)) / squares.mean() / 2)
        at_centre, over_parts = one.sd / share, one.over_parts / share
        print(
            f"{label:<14}{at_centre / scale:>8.4g} {unit:<4}{over_parts / scale:>8.4g} {unit:<4}"
            f"{scatter / scale:>8.4g} {unit:<4}{scatter / at_centre:>11.3f}{scatter / over_parts:>10.3f}"
            f"{chance:>11.1%}{mean / scatter:>+9.2f}{np.sqrt(np.mean(np.square(own[name]))):>8.3f}"
        )


def main() -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=200, help="campaigns to simulate")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--sweeps", type=int, default=4, help="how many sweeps a campaign has")
    parser.add_argument("--centre", action="store_true", help="every part is the designed one")
    parser.add_argument("--unknown-noise", action="store_true", help="the estimate is not told the noise")
    args = parser.parse_args()
    design = fitamp.read_design(DESIGN_FILE)
    print_sets(design)
    candidates = fitamp.affordable_sweeps(design, loads_f=LOADS_F, resistances_ohm=RESISTANCES_OHM)
    plan = fitamp.plan(design, candidates, count=args.sweeps, parts_drawn=PARTS, seed=args.seed + 1)
    if args.runs:
        parts = "of the designed part" if args.centre else "of parts drawn from the design's spreads"
        parts += ", noise not stated" if args.unknown_noise else ", noise stated"
        print(f"\n{args.runs} campaigns {parts}, seed {args.seed}: {', '.join(sweep.added for sweep in plan.sweeps)}")
        print_campaigns(design, plan, args)


if __name__ == "__main__":
    main()
