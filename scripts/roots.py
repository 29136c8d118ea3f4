#!/usr/bin/env python3
"""What is found in sweeps with more than two poles and a zero: order right, roots within 4 of their standard errors.

    python scripts/roots.py [--runs 200] [--seed 1] [--case NAME ...]

Fitted without a design, noise unknown, on 281 points from 10 Hz to 100 MHz with receiver floors of 2e-5 for a drive of
1 and 0.1 % gain error. All loops are invented: 82 dB, poles at 1.2 kHz and 58 MHz, a zero at 116 MHz, and what the case
says.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

import fitamp

NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
FREQ_HZ = np.geomspace(10.0, 100e6, 281)
SIGMAS = 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """A loop, and the step of a receiver's range that its reading has: place in Hz, size in dB."""

    title: str
    loop: fitamp.Transfer
    step: tuple[float, float] | None = None

    def measure(self, rng: np.random.Generator) -> np.ndarray:
        """One noisy reading."""
        gain = self.loop.evaluate(FREQ_HZ)
        if self.step is not None:
            gain = gain * np.where(self.step[0] < FREQ_HZ, 10 ** (self.step[1] / 20), 1.0)
        return fitamp.simulate_bench(gain, NOISE, rng)


def pair(distance_hz: float, quality: float) -> tuple[complex, complex]:
    """A complex pair by its distance from the origin; a negative quality lies in the right half plane."""
    root = distance_hz * complex(-1 / (2 * quality), np.sqrt(1 - 1 / (4 * quality**2)))
    return root, root.conjugate()


def _loop(poles_hz: Sequence[complex] = (), zeros_hz: Sequence[complex] = ()) -> fitamp.Transfer:
    return fitamp.Transfer(dc_gain=10**4.1, poles_hz=(-1.2e3, -58e6, *poles_hz), zeros_hz=(-116e6, *zeros_hz))


CASES = {
    "resonance": Case(
        title="package resonance, 30 MHz, Q 20, zeros 2 % above", loop=_loop(pair(30e6, 20), pair(30.6e6, 20))
    ),
    "broad": Case(title="resonance, 9 MHz, Q 10, zeros 4 % above", loop=_loop(pair(9e6, 10), pair(9.4e6, 12))),
    "mirror": Case(title="mirror pole 20 MHz, its zero 40 MHz", loop=_loop((-20e6,), (-40e6,))),
    "third-pole": Case(
        title="poles at 20 and 50 MHz, zero at 40 MHz",
        loop=fitamp.Transfer(dc_gain=10**4.1, poles_hz=(-1.2e3, -20e6, -50e6), zeros_hz=(-40e6,)),
    ),
    "unstable": Case(title="resonance with unstable poles", loop=_loop(pair(30e6, -50), pair(30.6e6, 20))),
    "range-step": Case(title="range step of 0.1 dB at 1 MHz", loop=_loop(), step=(1e6, 0.1)),
    "nothing": Case(title="nothing more", loop=_loop()),
}


def deviation(fit: fitamp.LoopFit, loop: fitamp.Transfer) -> float:
    """The farthest that a fitted root lies from the nearest true one, in its own standard errors; inf without error."""
    farthest = 0.0
    for found, truth in ((fit.named_poles, loop.poles_hz), (fit.named_zeros, loop.zeros_hz)):
        for _, root in found:
            if root.covariance is None:
                return np.inf
            nearest = min(truth, key=lambda true: abs(true - root.value_hz))
            off = np.abs([(root.value_hz - nearest).real, (root.value_hz - nearest).imag])
            errors = np.sqrt(np.diag(root.covariance))
            farthest = max(farthest, float((off[errors > 0] / errors[errors > 0]).max(initial=0.0)))
    return farthest


def main(arguments: Sequence[str]) -> int:
    """Run and print; the exit code."""
    parser = argparse.ArgumentParser(
        prog="roots", description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--runs", type=int, default=200)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--case", nargs="+", choices=CASES, default=list(CASES))
    args = parser.parse_args(arguments)
    print(f"{args.runs} noisy sweeps a case, seed {args.seed}")
    print(f"{'case':<54}{'order right':>12}{'within 4 σ':>12}{'farthest':>10}{'inadequate':>12}")
    for index, (name, case) in enumerate(CASES.items()):
        if name not in args.case:
            continue
        orders, farthest, inadequate = [], [], 0
        for run in range(args.runs):
            gain = case.measure(np.random.default_rng([args.seed, index, run]))
            fit = fitamp.fit_sweep(fitamp.Sweep(freq_hz=FREQ_HZ, gain=gain))
            same = (len(fit.named_poles), len(fit.named_zeros)) == (len(case.loop.poles_hz), len(case.loop.zeros_hz))
            orders.append(same and len(fit.range_steps) == (case.step is not None))
            farthest.append(deviation(fit, case.loop))
            inadequate += not fit.adequacy.adequate
        within = np.mean(np.array(farthest) <= SIGMAS)
        print(
            f"{case.title:<54}{np.mean(orders):>12.1%}{within:>12.1%}{max(farthest):>8.1f} σ"
            f"{inadequate / args.runs:>12.1%}",
            flush=True,
        )
    return 0


if __name__ == "__main__":
    for stream in (sys.stdout, sys.stderr):
        # A console in a legacy code page must not stop a table over a σ.
        stream.reconfigure(errors="replace")
    sys.exit(main(sys.argv[1:]))
