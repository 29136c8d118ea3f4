#!/usr/bin/env python3
"""How near the statistical limit the fit is: error over the Cramér–Rao bound, and coverage of the 95 % intervals.

    python scripts/accuracy.py [--runs 100] [--seed 1]

The standard scenario is invented: 281 points from 10 Hz to 100 MHz, 82 dB, poles at 1.2 kHz and 58 MHz, a zero at
110 MHz in the left half plane; receiver floors of 2e-5 for a drive of 1 and a gain error of 0.1 %, neither told to the
fit. The bound is computed by differences of the true response (benchmarking/bound.py), not by the package's own
derivatives.
"""

from __future__ import annotations

import argparse
from operator import itemgetter

import numpy as np
from benchmarking.bound import CORE, cramer_rao, loop_gain

import fitamp

NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
FREQ_HZ = np.geomspace(10.0, 100e6, 281)
ZERO_HZ = {"left zero": -110e6, "right zero": 110e6, "n = 1": None}


def truth(zero_hz: float | None) -> dict[str, float]:
    """T(0), pole 1, pole 2 and zero time in SI units."""
    zero_time_s = 0.0 if zero_hz is None else -1 / (2 * np.pi * zero_hz)
    return dict(zip(CORE, (10 ** (82 / 20), 1.2e3, 58e6, zero_time_s), strict=True))


# Noise-free loops: both half planes, no zero, a complex pair, pole 1 from 1 Hz to 10 kHz, pole 2 over four decades:
# pole 1 and pole 2 (or a pair), and the zero's place as a share of 1/pole 2.
EXACT_CASES = [
    (1.0, 1e5, 0.5),
    (1.0, 1e6, -0.5),
    (10.0, 1e7, 0.0),
    (100.0, 1e6, 3.0),
    (100.0, 1e8, -0.3),
    (1e3, 1e5, -0.5),
    (1.2e3, 58e6, 0.53),
    (1.2e3, 58e6, -0.53),
    (1.2e3, 58e6, 0.0),
    (1e4, 1e9, 0.8),
    (1e4, 1e6, 0.9),
    (1e6 + 3e6j, 1e6 - 3e6j, 0.5),
]


def worst_exact_error() -> float:
    """Largest relative error of a pole, or of the zero time (against 1/pole 2 where there is none), over all cases."""
    worst = 0.0
    for pole1_hz, pole2_hz, share in EXACT_CASES:
        zero_time_s = share / (2 * np.pi * abs(pole2_hz))
        top_hz = max(20 * abs(pole2_hz), 1e6)
        freq_hz = np.geomspace(max(abs(pole1_hz) / 30, 0.03), top_hz, 301)
        s = 1j * freq_hz
        gain = 1e4 * (1 + 2 * np.pi * s * zero_time_s) / ((1 + s / pole1_hz) * (1 + s / pole2_hz))
        fit = fitamp.fit_sweep(fitamp.Sweep(freq_hz=freq_hz, gain=gain))
        true = sorted((-pole1_hz, -pole2_hz), key=lambda pole: (abs(pole), complex(pole).imag))
        found = sorted((root.value_hz for root in fit.poles[:2]), key=lambda pole: (abs(pole), pole.imag))
        errors = [abs(a - b) / abs(b) for a, b in zip(found, true, strict=True)]
        scale_s = abs(zero_time_s) or 1 / (2 * np.pi * abs(pole2_hz))
        worst = max(worst, *errors, abs(fit.parameters.zero_time_s.value - zero_time_s) / scale_s)
    return worst


def main() -> None:
    """Run and print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=100)
    parser.add_argument("--seed", type=int, default=1)
    args = parser.parse_args()
    print(f"{len(EXACT_CASES)} noise-free loops: largest relative error of a root {worst_exact_error():.1e}")
    print(f"{args.runs} noisy sweeps a scenario, seed {args.seed}; noise unknown to the fit")
    print(f"{'scenario':<12} {'quantity':<13} {'RMSE/bound':>10} {'bias/bound':>10} {'coverage':>9}")
    for name, zero_hz in ZERO_HZ.items():
        rng = np.random.default_rng(args.seed)
        values = truth(zero_hz)
        gain, true = loop_gain(FREQ_HZ, values), np.array(list(values.values()))
        bound = cramer_rao(FREQ_HZ, values, NOISE, [itemgetter(name) for name in CORE])
        errors, covered, inadequate = [], [], 0
        for _ in range(args.runs):
            sweep = fitamp.Sweep(freq_hz=FREQ_HZ, gain=fitamp.simulate_bench(gain, NOISE, rng))
            fit = fitamp.fit_sweep(sweep)
            inadequate += not fit.adequacy.adequate
            estimates = [getattr(fit.parameters, quantity) for quantity in CORE]
            errors.append([estimate.value - value for estimate, value in zip(estimates, true, strict=True)])
            covered.append([e.ci95[0] <= value <= e.ci95[1] for e, value in zip(estimates, true, strict=True)])
        ratio = np.sqrt((np.array(errors) ** 2).mean(axis=0)) / bound
        bias = np.array(errors).mean(axis=0) / bound
        for index, quantity in enumerate(CORE):
            share = np.mean(covered, axis=0)[index]
            print(f"{name:<12} {quantity:<13} {ratio[index]:>10.2f} {bias[index]:>+10.2f} {share:>8.0%}")
        print(f"{name:<12} called inadequate in {inadequate} of {args.runs}")


if __name__ == "__main__":
    main()
