"""The three noise levels: found again in simulations, not moved by a wrong model, sane at the edges."""

from __future__ import annotations

from dataclasses import asdict

import numpy as np
import pytest

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.noise import FLOOR, estimate_noise, simulate_bench, variance_components
from fitamp.sweep import NoiseLevels, Sweep

FREQ_HZ: FloatArray = np.geomspace(10.0, 1e9, 321)
# All invented. 82 dB and a floor of 2e-5 make the error channel rule below 10 kHz, the return channel above 30 MHz.
LEVELS = NoiseLevels(error_channel=2e-5, return_channel=3e-4, relative=1e-3)


def gain(freq_hz: FloatArray = FREQ_HZ, *, zero_hz: float = 110e6) -> ComplexArray:
    poles = (1 + 1j * freq_hz / 1.2e3) * (1 + 1j * freq_hz / 58e6)
    return np.asarray(10 ** (82 / 20) * (1 + 1j * freq_hz / zero_hz) / poles, dtype=np.complex128)


def measured(seed: int, levels: NoiseLevels = LEVELS, freq_hz: FloatArray = FREQ_HZ) -> Sweep:
    return Sweep(freq_hz=freq_hz, gain=simulate_bench(gain(freq_hz), levels, np.random.default_rng(seed)))


def as_array(levels: NoiseLevels) -> FloatArray:
    """Error channel, return channel, relative; a floor of T itself looks like the return channel's."""
    known = asdict(levels)
    return np.array(
        [known["error_channel"], np.hypot(known["return_channel"], known.get("ratio", 0.0)), known["relative"]]
    )


def test_simulated_channels_have_the_stated_deviations() -> None:
    # Far from crossover T = return/error is 1/error where T is large and return where it is small: the relative scatter
    # is n_e·|T| at the low end and n_r/|T| at the high end, beside the gain error. 2000 points: 2 % of the deviation.
    rng = np.random.default_rng(1)
    for loop, levels, expected in (
        (1e3, NoiseLevels(error_channel=1e-5, return_channel=0.0, relative=0.0), 1e-2),
        (1e-3, NoiseLevels(error_channel=0.0, return_channel=1e-5, relative=0.0), 1e-2),
        (1.0, NoiseLevels(error_channel=0.0, return_channel=0.0, relative=1e-2), 1e-2),
    ):
        true = np.full(2000, loop + 0j)
        relative = simulate_bench(true, levels, rng) / true - 1
        assert np.sqrt(np.mean(np.abs(relative) ** 2)) == pytest.approx(expected, rel=0.06)
        assert np.mean(relative.real**2) == pytest.approx(np.mean(relative.imag**2), rel=0.2)


def test_the_three_levels_are_found_where_each_rules_somewhere() -> None:
    found = np.array([as_array(estimate_noise(measured(seed), gain())) for seed in range(30)])
    truth = as_array(LEVELS)
    # Each level rests on some tens of points: 10 % or so a sweep, 2 % in the mean of 30.
    assert np.median(found, axis=0) == pytest.approx(truth, rel=0.08)
    assert np.all(np.abs(found / truth - 1).mean(axis=0) < 0.25)


def test_one_level_alone_is_not_shared_out() -> None:
    only_relative = NoiseLevels(error_channel=0.0, return_channel=0.0, relative=2e-3)
    found = estimate_noise(measured(1, only_relative), gain())
    assert found.relative == pytest.approx(2e-3, rel=0.15)
    # What is left for the others is less than the gain error makes of them where they would count most.
    assert found.error_channel < 1e-6
    assert found.return_channel < 2e-4
    assert found.source == "estimated from the sweep"


@pytest.mark.parametrize(("zero_hz", "factor", "within"), [(115e6, 1.01, 0.03), (-150e6, 1.05, 0.2)])
def test_a_wrong_smooth_model_hardly_moves_the_estimate(zero_hz: float, factor: float, within: float) -> None:
    # A model that is off by ten times the scatter, and one with the zero in the other half plane.
    for seed in range(5):
        sweep = measured(seed)
        right = as_array(estimate_noise(sweep, gain()))
        wrong = as_array(estimate_noise(sweep, gain(zero_hz=zero_hz) * factor))
        assert wrong == pytest.approx(right, rel=within)


def test_levels_scale_with_the_noise() -> None:
    small, large = (estimate_noise(measured(2, levels), gain()) for levels in (LEVELS, _times(LEVELS, 0.1)))
    assert as_array(small) == pytest.approx(10 * as_array(large), rel=0.05)


def _times(levels: NoiseLevels, factor: float) -> NoiseLevels:
    return NoiseLevels(
        error_channel=levels.error_channel * factor,
        return_channel=levels.return_channel * factor,
        relative=levels.relative * factor,
    )


def test_data_without_scatter_have_the_floor_and_nothing_to_warn_of() -> None:
    found = estimate_noise(Sweep(freq_hz=FREQ_HZ, gain=gain()), gain())
    assert FLOOR <= found.relative < 10 * FLOOR
    assert found.error_channel < 1e-12
    assert found.return_channel < 1e-12


@pytest.mark.parametrize("points", [6, 12, 20])
def test_short_sweeps_give_finite_levels_of_the_right_size(points: int) -> None:
    freq_hz = np.geomspace(10.0, 100e6, points)
    for seed in range(10):
        found = as_array(estimate_noise(measured(seed, freq_hz=freq_hz), gain(freq_hz)))
        assert np.isfinite(found).all()
        assert found.max() < 0.1
        assert found.max() > 1e-6


def test_levels_rounded_off_by_a_file_are_found_as_a_relative_error() -> None:
    # Four decimals of a decibel: uniform rounding, 1e-4 dB/sqrt(12) = 3.3e-6 in magnitude, as one part of a complex sd.
    true = gain()
    decibels = np.round(20 * np.log10(np.abs(true)), 4)
    read = 10 ** (decibels / 20) * np.exp(1j * np.angle(true))
    sloping = FREQ_HZ > 1e3
    sweep = Sweep(freq_hz=FREQ_HZ[sloping], gain=read[sloping])
    found = estimate_noise(sweep, true[sloping])
    assert found.relative == pytest.approx(3.3e-6, rel=0.4)


def test_a_few_bad_points_do_not_swell_the_noise() -> None:
    for seed in range(5):
        sweep = measured(seed)
        spoilt = sweep.gain.copy()
        spoilt[[100, 160, 161, 200, 290]] *= 1.3
        found = as_array(estimate_noise(Sweep(freq_hz=FREQ_HZ, gain=spoilt), gain()))
        assert found == pytest.approx(as_array(estimate_noise(sweep, gain())), rel=0.2)


def test_setting_aside_what_is_no_noise_leaves_clean_estimates_unmoved() -> None:
    # Relative error alone, so that one number holds all points: known to 1/sqrt(30 · 321) in the mean.
    only_relative = NoiseLevels(error_channel=0.0, return_channel=0.0, relative=1e-3)
    found = [estimate_noise(measured(seed, only_relative), gain()).relative for seed in range(30)]
    assert np.mean(found) == pytest.approx(1e-3, rel=0.03)


def test_variance_components_are_the_most_likely_ones() -> None:
    # Where the gradient of the likelihood is 0, or leads out of the region θ ≥ 0 (W. Karush; H. W. Kuhn and
    # A. W. Tucker), and no other point that a general optimiser finds is likelier.
    from scipy.optimize import minimize

    x = np.linspace(0.0, 1.0, 400)
    design = np.stack([np.exp(-6 * x), np.exp(-6 * (1 - x)), np.ones(400)], axis=1)
    for seed, truth in enumerate(([1.0, 4.0, 0.1], [1.0, 0.0, 0.02], [0.0, 0.0, 1.0])):
        observed = design @ np.array(truth) * np.random.default_rng(seed).exponential(size=400)
        observed = np.minimum(observed, 8 * (design @ np.array(truth)))  # nothing to set aside

        def unlikely(theta: FloatArray, observed: FloatArray = observed) -> float:
            return float((observed / (design @ theta) + np.log(design @ theta)).sum())

        found = variance_components(observed, design)
        means = design @ found
        gradient = design.T @ ((1 - observed / means) / means)
        size = np.abs(design).T @ (1 / means)
        assert np.all(found >= 0)
        assert np.all(np.abs(gradient[found > 0]) < 1e-5 * size[found > 0])
        assert np.all(gradient[found == 0] > -1e-5 * size[found == 0])
        other = minimize(unlikely, np.full(3, 0.5), bounds=[(1e-9, None)] * 3, method="L-BFGS-B")
        assert unlikely(found) <= other.fun + 1e-6
