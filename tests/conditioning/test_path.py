"""Gain and delay of a path: found whatever the spacing, the length of the cables, and where the noise is."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.arrays import FloatArray
from fitamp.conditioning.path import fitted_path
from fitamp.sweep import Sweep

LOG_HZ: FloatArray = np.geomspace(10.0, 200e6, 281)
LINEAR_HZ: FloatArray = np.linspace(1e6, 200e6, 201)


def path(
    freq_hz: FloatArray, delay_s: float, seed: int, *, scatter: FloatArray | float = 1e-3, gain: float = 1.0
) -> Sweep:
    rng = np.random.default_rng(seed)
    noise = rng.standard_normal(len(freq_hz)) + 1j * rng.standard_normal(len(freq_hz))
    return Sweep(freq_hz=freq_hz, gain=gain * (np.exp(-2j * np.pi * freq_hz * delay_s) + scatter * noise / np.sqrt(2)))


@pytest.mark.parametrize(
    ("freq_hz", "delay_s"),
    [(LOG_HZ, 0.4e-9), (LOG_HZ, -0.4e-9), (LOG_HZ, 100e-9), (LINEAR_HZ, 300e-9), (np.geomspace(1e3, 1e8, 12), 0.4e-9)],
)
def test_delay_and_gain_err_as_much_as_they_say(freq_hz: FloatArray, delay_s: float) -> None:
    fits = [fitted_path(path(freq_hz, delay_s, seed)) for seed in range(40)]
    delays = np.array([(fit.delay_s - delay_s) / fit.delay_stderr_s for fit in fits])
    gains = np.array([np.log(fit.gain) / fit.ln_gain_stderr for fit in fits])
    # 40 values: root mean square 1 ± 0.11, or with 12 points, whose scatter is known to a third, somewhat more.
    assert np.sqrt(np.mean(delays**2)) == pytest.approx(1.0, abs=0.4)
    assert np.sqrt(np.mean(gains**2)) == pytest.approx(1.0, abs=0.4)


def test_the_standard_error_is_that_of_a_line_through_the_origin() -> None:
    # Phase −ωτ with the variance σ²/2 at each point: var τ = σ²/2/Σω².
    expected = 1e-3 / np.sqrt(2 * np.sum((2 * np.pi * LINEAR_HZ) ** 2))
    found = np.mean([fitted_path(path(LINEAR_HZ, 1e-9, seed)).delay_stderr_s for seed in range(20)])
    assert found == pytest.approx(expected, rel=0.05)


def test_an_inverting_read_out_has_the_same_delay() -> None:
    fit = fitted_path(path(LOG_HZ, 0.4e-9, 1, gain=-0.9))
    assert fit.gain == pytest.approx(-0.9, rel=1e-3)
    assert fit.delay_s == pytest.approx(0.4e-9, abs=4 * fit.delay_stderr_s)


def test_a_low_end_without_meaning_does_not_lead_astray() -> None:
    # Coupled receivers: below 1 kHz there is noise alone.
    scatter = np.hypot(1e-3, 500.0 / LOG_HZ)
    for seed in range(10):
        fit = fitted_path(path(LOG_HZ, 50e-9, seed, scatter=scatter))
        assert fit.delay_s == pytest.approx(50e-9, abs=5 * fit.delay_stderr_s)
        assert fit.scatter[0] > 3
        assert fit.scatter[200] == pytest.approx(1e-3, rel=0.5)


def test_a_computed_path_is_found_to_rounding() -> None:
    fit = fitted_path(path(LOG_HZ, 0.4e-9, 1, scatter=0.0))
    assert fit.delay_s == pytest.approx(0.4e-9, rel=1e-10)
    assert fit.gain == pytest.approx(1.0, rel=1e-12)
