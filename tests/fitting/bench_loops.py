"""Loops and benches for the tests of fitting, written out independently of the package; all values are invented."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels, Sweep

FREQ_HZ: FloatArray = np.geomspace(10.0, 100e6, 281)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
QUANTITIES = ("dc_gain", "pole1_hz", "pole2_hz", "zero_time_s")


@dataclass(frozen=True, slots=True, kw_only=True)
class Loop:
    """T(s) = T0 (1 + s τz) e^(−s τd) / ((1 + s/ω1)(1 + s/ω2)(1 + s τ3)), poles as positive (or complex) distances."""

    dc_gain: float = 10 ** (82 / 20)
    pole1_hz: complex = 1.2e3
    pole2_hz: complex = 58e6
    zero_time_s: float = 1 / (2 * np.pi * 110e6)
    third_s: float = 0.0
    delay_s: float = 0.0

    def gain(self, freq_hz: FloatArray = FREQ_HZ) -> ComplexArray:
        s = 2j * np.pi * freq_hz
        two = (1 + 1j * freq_hz / self.pole1_hz) * (1 + 1j * freq_hz / self.pole2_hz)
        return np.asarray(
            self.dc_gain * (1 + s * self.zero_time_s) * np.exp(-s * self.delay_s) / (two * (1 + s * self.third_s))
        )

    def exact(self, freq_hz: FloatArray = FREQ_HZ) -> Sweep:
        return Sweep(freq_hz=freq_hz, gain=self.gain(freq_hz))

    def measured(self, seed: int, *, freq_hz: FloatArray = FREQ_HZ, noise: NoiseLevels = NOISE) -> Sweep:
        """Two receivers with their own floors, then a gain error: read-outs of one bench, drive 1."""
        rng = np.random.default_rng(seed)
        draws = rng.standard_normal((3, 2, len(freq_hz))) / np.sqrt(2)
        error_floor, return_floor, relative = draws[:, 0] + 1j * draws[:, 1]
        loop = self.gain(freq_hz)
        error = 1 / (1 + loop) + noise.error_channel * error_floor
        returned = loop / (1 + loop) + noise.return_channel * return_floor
        return Sweep(freq_hz=freq_hz, gain=returned / error * (1 + noise.relative * relative))

    def truth(self) -> FloatArray:
        """(T(0), pole 1, pole 2, zero time), for real poles."""
        return np.array([self.dc_gain, abs(self.pole1_hz), abs(self.pole2_hz), self.zero_time_s])


STANDARD = Loop()


def cramer_rao(loop: Loop, *, freq_hz: FloatArray = FREQ_HZ, noise: NoiseLevels = NOISE) -> FloatArray:
    """Least possible standard deviation of (T(0), pole 1, pole 2, zero time): root of the inverse Fisher information.

    The closed-loop pair gives, to first order, (T_meas − T)/(1 + T) with variance n_r² + |T|² n_e² + rel² |T/(1+T)|²;
    that the variance itself depends on the parameters adds next to nothing here. Derivatives by hand.
    """
    s = 2j * np.pi * freq_hz
    gain = loop.gain(freq_hz)
    slopes = np.array(
        [
            gain / loop.dc_gain,
            gain * 1j * freq_hz / loop.pole1_hz**2 / (1 + 1j * freq_hz / loop.pole1_hz),
            gain * 1j * freq_hz / loop.pole2_hz**2 / (1 + 1j * freq_hz / loop.pole2_hz),
            gain * s / (1 + s * loop.zero_time_s),
        ]
    )
    variance = noise.return_channel**2 + np.abs(gain * noise.error_channel) ** 2
    variance += noise.relative**2 * np.abs(gain / (1 + gain)) ** 2
    weighted = slopes / (1 + gain) / np.sqrt(variance / 2)
    scale = np.linalg.norm(weighted, axis=1)
    information = (weighted @ weighted.conj().T).real / np.outer(scale, scale)
    return np.asarray(np.sqrt(np.diag(np.linalg.inv(information))) / scale)
