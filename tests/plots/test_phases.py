"""Phases that are counted, not unwrapped: right where samples are too far apart to tell turns."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import comparison_of, part

from fitamp.fitting import LoopFit
from fitamp.plots.phases import continuous_deg, extra_delay_s, fitted_deg, measured_deg
from fitamp.transfer import Transfer

RESPONSES = (
    Transfer(dc_gain=1e4, poles_hz=(-1e3, -4e7), zeros_hz=(-1e8,)),
    Transfer(dc_gain=1e4, poles_hz=(-1e3, -4e7, -7e8), zeros_hz=(6e7,), delay_s=1e-9),
    Transfer(dc_gain=50.0, poles_hz=(-1e5 + 2e6j, -1e5 - 2e6j), zeros_hz=(3e7 + 1e7j, 3e7 - 1e7j)),
)


@pytest.mark.parametrize("response", RESPONSES)
def test_phase_is_the_unwrapped_one_of_a_dense_grid(response: Transfer) -> None:
    freq_hz = np.geomspace(1, 1e9, 20001)
    dense = np.degrees(np.unwrap(np.angle(response.evaluate(freq_hz))))
    np.testing.assert_allclose(continuous_deg(response, freq_hz), dense, atol=1e-6)


def test_a_delay_of_many_turns_a_sample_is_not_aliased() -> None:
    freq_hz = np.array([1e6, 1e9, 1e11])
    lag = continuous_deg(Transfer(dc_gain=1.0, poles_hz=(-1e3,), delay_s=1e-8), freq_hz)
    # 360° a turn, f·delay turns, and a quarter turn of the pole.
    np.testing.assert_allclose(lag, -360 * freq_hz * 1e-8 - np.degrees(np.arctan(freq_hz / 1e3)), rtol=1e-12)


def test_fitted_phase_is_the_fits_own_angle() -> None:
    fit = comparison_of(0).fit
    freq_hz = np.geomspace(1, 1e8, 50)
    found = fitted_deg(fit, freq_hz)
    unit = fit.evaluate(freq_hz) / np.abs(fit.evaluate(freq_hz))
    np.testing.assert_allclose(np.exp(1j * np.radians(found)), unit, atol=1e-6)
    assert found[0] == pytest.approx(0.0, abs=1.0)
    assert np.all(np.diff(found) < 0)


def _delayed(delay_s: float) -> LoopFit:
    """A fit that knows nothing of the delay in its sweep."""
    fit = comparison_of(0).fit
    sweep = part(0)
    return replace(
        fit, sweep=replace(sweep, gain=sweep.gain * np.exp(-2j * np.pi * sweep.freq_hz * delay_s), noise=sweep.noise)
    )


@pytest.mark.parametrize("delay_s", [20e-9, 6e-9])
def test_data_with_a_delay_that_the_fit_lacks_do_not_bounce(delay_s: float) -> None:
    fit = _delayed(delay_s)
    freq_hz = fit.sweep.freq_hz
    found = extra_delay_s(fit)
    assert found == pytest.approx(delay_s, rel=0.05)
    phase = measured_deg(fit, freq_hz, fit.sweep.gain, found)
    np.testing.assert_allclose(phase, fitted_deg(fit, freq_hz) - 360 * freq_hz * delay_s, atol=60)


def test_a_fit_that_follows_its_sweep_lacks_no_delay() -> None:
    assert extra_delay_s(comparison_of(0).fit) == 0
    assert extra_delay_s(_delayed(0.5e-9)) == 0
