"""Invented parts on an invented bench that adds loads and resistors, with a nodal solver of its own."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.design import Bench, Design
from fitamp.elements.condition import Condition
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep

__all__ = ["BASE", "DESIGN", "FREQ_HZ", "NOISE", "NOMINAL", "STEPS", "drawn", "exact_sweep", "solve_nodes", "swept"]

FREQ_HZ: FloatArray = np.geomspace(10.0, 100e6, 141)
# A usual bench: receivers 94 dB below the drive, gain errors of 0.1 %.
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
NOMINAL = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
DESIGN = Design.from_elements(
    NOMINAL, spreads=dict.fromkeys(ELEMENT_NAMES, 0.2), bench=Bench(load_f=2e-12, load_spread=0.05, delay_s=0.0)
)
BASE = Condition()
STEPS = (
    BASE,
    Condition(load_added_f=5e-12),
    Condition(load_added_f=15e-12),
    Condition(rz_added_ohm=-400.0),
    Condition(rz_added_ohm=500.0),
)


def solve_nodes(
    e: Elements, freq_hz: FloatArray, condition: Condition, *, bench_load_f: float = 0.0, delay_s: float = 0.0
) -> ComplexArray:
    """Loop gain on the bench by Kirchhoff's current law, solved numerically; every part is stamped on its own.

    Nodes: 0 first stage's output, 1 second stage's output, 2 between Cc and Rz (joined with 1 without a resistor).
    """
    resistance_ohm = e.Rz + condition.rz_added_ohm
    size = 3 if resistance_ohm else 2
    gains = []
    for s in 2j * np.pi * freq_hz:
        matrix = np.zeros((size, size), dtype=complex)
        grounded = [(0, 1 / e.R1), (0, s * e.C1), (1, 1 / e.R2), (1, s * e.CL)]
        grounded += [(1, s * bench_load_f), (1, s * condition.load_added_f)]
        bridging = [(0, size - 1, s * e.Cc), (0, 1, s * e.Cgd)]
        if resistance_ohm:
            bridging.append((2, 1, 1 / resistance_ohm))
        for node, admittance in grounded:
            matrix[node, node] += admittance
        for a, b, admittance in bridging:
            matrix[np.ix_([a, b], [a, b])] += admittance * np.array([[1, -1], [-1, 1]])
        matrix[1, 0] += e.gm2
        voltages = np.linalg.solve(matrix, np.array([-e.gm1, 0, 0][:size], dtype=complex))
        gains.append(e.beta * voltages[1])
    s = 2j * np.pi * freq_hz
    mirror: ComplexArray | float = 1.0
    if e.mirror_pole_hz is not None:
        mirror = (1 + 0.5j * freq_hz / e.mirror_pole_hz) / (1 + 1j * freq_hz / e.mirror_pole_hz)
    return np.asarray(np.array(gains) * mirror * np.exp(-s * (e.delay_s + delay_s)), dtype=np.complex128)


def exact_sweep(
    elements: Elements,
    condition: Condition = BASE,
    *,
    bench_load_f: float = 2e-12,
    delay_s: float = 0.0,
    freq_hz: FloatArray = FREQ_HZ,
    file: str = "part.csv",
) -> Sweep:
    """What a bench without noise reads."""
    gain = solve_nodes(elements, freq_hz, condition, bench_load_f=bench_load_f, delay_s=delay_s)
    return Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file=file, form="computed"))


def swept(
    elements: Elements,
    conditions: Sequence[Condition],
    seed: int,
    *,
    bench_load_f: float = 2e-12,
    delay_s: float = 0.0,
    freq_hz: FloatArray = FREQ_HZ,
    noise: NoiseLevels = NOISE,
) -> list[Sweep]:
    """What the bench reads under each condition, with its noise, about which the sweeps say nothing."""
    rng = np.random.default_rng(seed)
    sweeps = []
    for number, condition in enumerate(conditions):
        perfect = exact_sweep(
            elements,
            condition,
            bench_load_f=bench_load_f,
            delay_s=delay_s,
            freq_hz=freq_hz,
            file=f"step{number}.csv",
        )
        sweeps.append(replace(perfect, gain=simulate_bench(perfect.gain, noise, rng)))
    return sweeps


def drawn(seed: int, spread: float = 0.12) -> Elements:
    """A die: every element off its designed value by a normal deviate."""
    factors = 1 + spread * np.random.default_rng(seed).standard_normal(len(ELEMENT_NAMES))
    return NOMINAL.with_changes(
        **{name: getattr(NOMINAL, name) * factor for name, factor in zip(ELEMENT_NAMES, factors, strict=True)}
    )
