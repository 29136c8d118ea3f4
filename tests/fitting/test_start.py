"""Starting values: near the truth on exact data, usable on noisy data, and never an exception."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from bench_loops import FREQ_HZ, STANDARD, Loop

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.start import ENOUGH, Start, excess_delay, starts, vector_fit_roots
from fitamp.sweep import NoiseLevels, Sweep


def near(start: Start, loop: Loop) -> float:
    """Largest factor by which g, q, b are off the loop's own (see the model: g = T0/a1, q = 1/a1, b = a2/a1)."""
    w1, w2 = 2 * np.pi * loop.pole1_hz, 2 * np.pi * loop.pole2_hz
    a1, a2 = (1 / w1 + 1 / w2).real, (1 / (w1 * w2)).real
    truth = np.array([loop.dc_gain / a1, 1 / a1, a2 / a1])
    return float(np.exp(np.abs(np.log(np.array([start.g, start.q, start.b]) / truth)).max()))


LOOPS = {
    "standard": STANDARD,
    "right half plane": replace(STANDARD, zero_time_s=-STANDARD.zero_time_s),
    "no zero": replace(STANDARD, zero_time_s=0.0),
    "low pole 1": Loop(dc_gain=1e5, pole1_hz=30.0, pole2_hz=3e6, zero_time_s=2e-8),
    "pair": Loop(dc_gain=1e3, pole1_hz=1e6 + 3e6j, pole2_hz=1e6 - 3e6j, zero_time_s=3e-8),
}


@pytest.mark.parametrize("name", LOOPS)
def test_exact_sweeps_start_close_by(name: str) -> None:
    loop = LOOPS[name]
    found = starts(loop.exact())
    best = min(found, key=lambda start: near(start, loop))
    assert near(best, loop) < 1.05
    assert best.zero_time_s == pytest.approx(loop.zero_time_s, abs=0.05 / abs(2 * np.pi * loop.pole2_hz))


@pytest.mark.parametrize("name", ["standard", "right half plane", "no zero", "low pole 1"])
def test_noisy_sweeps_start_within_a_factor_that_the_fit_can_mend(name: str) -> None:
    # One per cent of gain error, ten times the standard bench.
    noise = NoiseLevels(error_channel=5e-5, return_channel=2e-4, relative=1e-2)
    for seed in range(5):
        found = starts(LOOPS[name].measured(seed, noise=noise))
        assert min(near(start, LOOPS[name]) for start in found) < 30


def test_the_straight_lines_have_the_gain_bandwidth_without_any_fit() -> None:
    # The integrator's slope read off at crossover: T0·p1 = 15.1 MHz within the reach of pole 2 and zero.
    line = starts(STANDARD.exact())[-1]
    assert line.g / (2 * np.pi) == pytest.approx(STANDARD.dc_gain * 1.2e3, rel=0.2)
    assert line.zero_time_s == 0.0


ODD: dict[str, ComplexArray] = {
    "flat": np.full(281, 10 + 0j),
    "tiny": np.full(281, 1e-9 + 0j),
    "white noise": np.asarray(np.random.default_rng(3).standard_normal((2, 281)).T @ [1, 1j], dtype=np.complex128),
    "rising": np.asarray(1j * FREQ_HZ, dtype=np.complex128),
    "wrong sign": np.asarray(-STANDARD.gain(), dtype=np.complex128),
}


@pytest.mark.parametrize("name", ODD)
def test_odd_sweeps_still_give_usable_numbers(name: str) -> None:
    found = starts(Sweep(freq_hz=FREQ_HZ, gain=ODD[name]))
    assert found
    for start in found:
        assert all(np.isfinite(value) and value > 0 for value in (start.g, start.q, start.b))
        assert np.isfinite(start.zero_time_s)
        assert np.isfinite(start.far_pole_s)


def test_the_last_points_of_a_short_sweep_are_enough() -> None:
    assert starts(STANDARD.exact(np.geomspace(10.0, 100e6, 12)))


@pytest.mark.parametrize("spacing", [np.geomspace, np.linspace])
def test_a_dense_sweep_starts_as_near_as_a_thin_one_whatever_its_spacing(
    spacing: Callable[[float, float, int], FloatArray],
) -> None:
    dense = STANDARD.exact(spacing(10.0, 100e6, 20 * ENOUGH))
    assert min(near(start, STANDARD) for start in starts(dense)) < 1.05


def test_the_delay_that_the_phase_shows_does_not_depend_on_the_number_of_points() -> None:
    # 5 ns turn the top of the band by half a turn.
    rough = []
    for points in (281, 20 * ENOUGH):
        freq_hz = np.geomspace(10.0, 100e6, points)
        turned = STANDARD.gain(freq_hz) * np.exp(-2j * np.pi * freq_hz * 5e-9)
        rough.append(excess_delay(Sweep(freq_hz=freq_hz, gain=turned)))
    assert rough == pytest.approx([5e-9, 5e-9], rel=0.3)
    assert rough[0] == pytest.approx(rough[1], rel=0.02)


def test_a_pair_fit_of_higher_order_finds_resonant_roots_too() -> None:
    # Poles at 30 MHz and zeros 2 % above, Q 20, beside the standard two poles and zero.
    s = 2j * np.pi * FREQ_HZ
    below, above = 2 * np.pi * 30e6, 2 * np.pi * 30.6e6
    pair = (1 + s / above / 20 + (s / above) ** 2) / (1 + s / below / 20 + (s / below) ** 2)
    found = vector_fit_roots(Sweep(freq_hz=FREQ_HZ, gain=STANDARD.gain() * pair), 2, 1)
    assert found is not None
    for roots, expected in zip(found, (below, above), strict=True):
        upper = roots[np.argmax(roots.imag)]
        assert abs(upper) == pytest.approx(expected, rel=1e-6)
        assert -abs(upper) / (2 * upper.real) == pytest.approx(20.0, rel=1e-5)
