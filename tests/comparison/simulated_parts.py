"""Invented parts on an invented bench, computed from the exact circuit. Shared by the comparison's tests."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.arrays import FloatArray
from fitamp.design import Bench, Design
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep

__all__ = ["BENCH", "DESIGN", "FREQ_HZ", "NOISE", "NOMINAL", "SPREADS", "drawn", "measured", "noise_free"]

FREQ_HZ: FloatArray = np.geomspace(10.0, 200e6, 141)
# A usual bench: receivers 94 dB below the drive, gain errors of 0.1 %.
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
NOMINAL = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
SPREADS: dict[str, float] = {
    "gm1": 0.08,
    "R1": 0.15,
    "C1": 0.10,
    "gm2": 0.08,
    "R2": 0.15,
    "CL": 0.05,
    "Cc": 0.06,
    "Rz": 0.12,
}
DELAY_S = 0.4e-9
BENCH = Bench(load_f=2e-12, load_spread=0.05, delay_s=DELAY_S, delay_spread_s=0.02e-9)
DESIGN = Design.from_elements(NOMINAL, spreads=SPREADS, bench=BENCH)


def noise_free(
    elements: Elements, *, load_f: float = BENCH.load_f, delay_s: float = DELAY_S, freq_hz: FloatArray = FREQ_HZ
) -> Sweep:
    """What a perfect bench with this load and cable would read."""
    on_bench = replace(elements, CL=elements.CL + load_f, delay_s=elements.delay_s + delay_s)
    return Sweep(
        freq_hz=freq_hz,
        gain=on_bench.transfer().evaluate(freq_hz),
        noise=NOISE,
        origin=Origin(file="part.csv", form="computed"),
    )


def measured(
    elements: Elements,
    seed: int,
    *,
    load_f: float = BENCH.load_f,
    delay_s: float = DELAY_S,
    freq_hz: FloatArray = FREQ_HZ,
) -> Sweep:
    """What the bench reads, with its noise, about which the sweep says nothing."""
    perfect = noise_free(elements, load_f=load_f, delay_s=delay_s, freq_hz=freq_hz)
    return replace(perfect, gain=simulate_bench(perfect.gain, NOISE, np.random.default_rng(seed)), noise=None)


def drawn(rng: np.random.Generator, spreads: Mapping[str, float], *, nominal: Elements = NOMINAL) -> Elements:
    """A die: every element of `spreads` off its nominal value by a normal deviate."""
    factors = {name: 1 + spreads[name] * rng.standard_normal() for name in ELEMENT_NAMES if name in spreads}
    return nominal.with_changes(**{name: getattr(nominal, name) * factor for name, factor in factors.items()})
