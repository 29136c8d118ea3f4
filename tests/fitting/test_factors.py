"""Resonances beside two poles and a zero: found, given back with honest errors, and not invented."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.arrays import ComplexArray
from fitamp.estimate import Known
from fitamp.fitting import LoopFit, WarningCode, fit_sweep
from fitamp.fitting.factors import Resonance
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

FREQ_HZ = np.geomspace(10.0, 100e6, 281)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
LOOP = Transfer(dc_gain=12.6e3, poles_hz=(-1.2e3, -58e6), zeros_hz=(-110e6,))
ZERO_TIME_S = 1 / (2 * np.pi * 110e6)


def pair_gain(pole_hz: float, zero_hz: float, quality: float) -> ComplexArray:
    """Gain of a pole pair and a zero pair of one quality, written out."""
    s = 1j * FREQ_HZ
    return np.asarray(
        (1 + s / zero_hz / quality + (s / zero_hz) ** 2) / (1 + s / pole_hz / quality + (s / pole_hz) ** 2)
    )


def fitted(pole_hz: float, zero_hz: float, quality: float, seed: int) -> LoopFit:
    gain = LOOP.evaluate(FREQ_HZ) * pair_gain(pole_hz, zero_hz, quality)
    return fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(gain, NOISE, np.random.default_rng(seed))))


@pytest.mark.parametrize(("pole_hz", "ratio", "quality"), [(9e6, 1.02, 20.0), (2e6, 0.985, 40.0), (0.4e6, 1.05, 10.0)])
def test_a_resonance_is_found_and_the_zero_kept_within_its_errors(pole_hz: float, ratio: float, quality: float) -> None:
    # The pair's upper root by the quadratic formula, (−1/Q + j·sqrt(4 − 1/Q²))·f/2.
    true = pole_hz / 2 * complex(-1 / quality, np.sqrt(4 - 1 / quality**2))
    pulls = []
    for seed in range(8):
        fit = fitted(pole_hz, ratio * pole_hz, quality, seed)
        assert fit.adequacy.adequate
        assert len(fit.resonant_poles) == len(fit.resonant_zeros) == 2
        assert WarningCode.RESONANCE in {warning.code for warning in fit.warnings}
        pole = fit.resonant_poles[0]
        assert pole.covariance is not None
        off = np.array([pole.value_hz.real - true.real, pole.value_hz.imag - true.imag])
        assert off @ np.linalg.solve(pole.covariance, off) < 16
        # Two numbers of the pair from a dozen points at 0.1 %: known to a few per mille of its distance.
        assert np.sqrt(np.trace(pole.covariance)) < 0.01 * pole_hz
        for estimate, truth in (
            (fit.parameters.zero_time_s, ZERO_TIME_S),
            (fit.parameters.pole2_hz, 58e6),
            (fit.parameters.pole1_hz, 1.2e3),
        ):
            assert estimate.known is Known.MEASURED
            assert estimate.value is not None
            assert estimate.stderr is not None
            pulls.append((estimate.value - truth) / estimate.stderr)
    assert np.abs(pulls).max() < 4
    assert 0.6 < np.std(pulls) < 1.5


def test_no_resonance_is_seen_in_noise() -> None:
    for seed in range(40):
        gain = simulate_bench(LOOP.evaluate(FREQ_HZ), NOISE, np.random.default_rng(500 + seed))
        assert fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain)).resonant_poles == ()


def test_two_resonances_are_both_found() -> None:
    gain = LOOP.evaluate(FREQ_HZ) * pair_gain(9e6, 9.3e6, 20.0) * pair_gain(0.5e6, 0.51e6, 15.0)
    fit = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(gain, NOISE, np.random.default_rng(3))))
    found = sorted(abs(pole.value_hz) for pole in fit.resonant_poles[::2])
    assert found == pytest.approx([0.5e6, 9e6], rel=0.01)
    assert fit.parameters.zero_time_s.value == pytest.approx(ZERO_TIME_S, rel=0.05)


def test_derivatives_are_those_of_differences() -> None:
    resonance = Resonance(omega=2 * np.pi * 9e6)
    values = np.array([0.05, 0.97, 0.06, 1.02])
    s = np.asarray(2j * np.pi * np.geomspace(1e6, 50e6, 7), dtype=np.complex128)
    factor, slopes = resonance.factor_and_derivatives(values, s)
    for index in range(4):
        step = np.zeros(4)
        step[index] = 1e-6
        ahead = resonance.factor_and_derivatives(values + step, s)[0]
        behind = resonance.factor_and_derivatives(values - step, s)[0]
        assert (ahead - behind) / 2e-6 == pytest.approx(slopes[:, index] * factor, rel=1e-6, abs=1e-7)


def test_a_broad_pair_is_no_resonance() -> None:
    resonance = Resonance(omega=2 * np.pi * 9e6)
    assert resonance.is_local(np.array([0.05, 0.97, 0.05, 1.0]))
    for values in ([1.0, 1.0, 1.0, 1.1], [0.05, 0.3, 0.05, 1.0], [2.5, 1.0, 0.05, 1.0]):
        assert not resonance.is_local(np.array(values))
