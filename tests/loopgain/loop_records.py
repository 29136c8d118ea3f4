"""An invented loop, and what receivers and injections read of it. Shared by the tests of this folder."""

from __future__ import annotations

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sign, Sweep

__all__ = ["FREQ_HZ", "GAIN", "NOISE", "current_gain", "record", "scatter", "voltage_gain_of"]

# Invented: T(0) = 80 dB, poles at 1.1 kHz and 40 MHz, zero at 130 MHz in the left half plane.
FREQ_HZ: FloatArray = np.geomspace(10.0, 100e6, 281)
_jf = 1j * FREQ_HZ
GAIN: ComplexArray = 1e4 * (1 + _jf / 130e6) / (1 + _jf / 1.1e3) / (1 + _jf / 40e6)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)


def voltage_gain_of(ratio: complex | ComplexArray) -> ComplexArray:
    """Tv at a cut with Z2/Z1 = `ratio`; R. D. Middlebrook, Int. J. Electronics 38 (1975), from memory."""
    return np.asarray(GAIN * (1 + ratio) + ratio)


def current_gain(ratio: complex | ComplexArray) -> ComplexArray:
    """Ti at the same cut."""
    return np.asarray(GAIN * (1 + 1 / ratio) + 1 / ratio)


def scatter(level: float, rng: np.random.Generator) -> ComplexArray:
    """Complex noise of this standard deviation, one value for each point."""
    draws = rng.standard_normal((2, len(FREQ_HZ)))
    return np.asarray(level / np.sqrt(2) * (draws[0] + 1j * draws[1]))


def record(
    gain: ComplexArray, name: str, *, rng: np.random.Generator | None = None, noise: NoiseLevels | None = None
) -> Sweep:
    """A record with its sign settled, as a bench with `NOISE` reads it where there is a generator."""
    read = gain if rng is None else simulate_bench(gain, NOISE, rng)
    return Sweep(freq_hz=FREQ_HZ, gain=read, noise=noise, sign=Sign.AS_READ, origin=Origin(file=name, form="csv"))
