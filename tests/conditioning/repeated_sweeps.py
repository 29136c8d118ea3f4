"""Repeats of one invented sweep for the tests of conditioning."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep

FREQ_HZ: FloatArray = np.geomspace(10.0, 100e6, 281)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
DC_GAIN = 10 ** (82 / 20)


def loop(freq_hz: FloatArray = FREQ_HZ) -> ComplexArray:
    """82 dB, poles at 1.2 kHz and 58 MHz, a left zero at 110 MHz."""
    poles = (1 + 1j * freq_hz / 1.2e3) * (1 + 1j * freq_hz / 58e6)
    return np.asarray(DC_GAIN * (1 + 1j * freq_hz / 110e6) / poles)


def repeats(
    count: int,
    seed: int,
    *,
    noise: NoiseLevels = NOISE,
    freq_hz: FloatArray = FREQ_HZ,
    changes: Mapping[int, ArrayLike] | None = None,
) -> list[Sweep]:
    """Sweeps A.csv, B.csv, ... of one loop, each with a noise of its own; `changes` are factors on some of them."""
    rng = np.random.default_rng(seed)
    sweeps = []
    for index in range(count):
        gain = simulate_bench(loop(freq_hz), noise, rng) * np.asarray((changes or {}).get(index, 1.0))
        sweeps.append(Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file=f"{_name(index)}.csv", form="csv")))
    return sweeps


def _name(index: int) -> str:
    return "ABCDEFGHIJ"[index] if index < 10 else str(index)
