"""Range steps: found where they are and as large as they are, and none found in noise, misfit, resonances or spurs."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest

from fitamp import simulate_bench
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.steps import RangeStep, find_range_steps
from fitamp.fitting.two_pole import TwoPole, solve
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep

# All invented: the standard bench of the accuracy script.
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)


def grid(count: int = 281) -> FloatArray:
    return np.geomspace(10.0, 100e6, count)


def loop(freq_hz: FloatArray, *, pole2_hz: float = 58e6, delay_s: float = 0.0) -> ComplexArray:
    poles = (1 + 1j * freq_hz / 1.2e3) * (1 + 1j * freq_hz / pole2_hz)
    return np.asarray(10 ** (82 / 20) * (1 + 1j * freq_hz / 116e6) * np.exp(-2j * np.pi * freq_hz * delay_s) / poles)


def resonance(freq_hz: FloatArray, *, at_hz: float, quality: float, apart: float) -> ComplexArray:
    """A zero pair over a pole pair, `apart` from each other relative to their frequency."""

    def pair(pair_hz: float) -> ComplexArray:
        return np.asarray(1 + 1j * freq_hz / (quality * pair_hz) - (freq_hz / pair_hz) ** 2)

    return np.asarray(pair(at_hz * (1 + apart)) / pair(at_hz))


def stepped(gain: ComplexArray, index: int, *, db: float, deg: float = 0.0) -> ComplexArray:
    """The gain with a step after the point `index`."""
    factor = 10 ** (db / 20) * cmath.exp(1j * math.radians(deg))
    return np.asarray(gain * np.where(np.arange(len(gain)) > index, factor, 1.0))


def look(
    freq_hz: FloatArray, gain: ComplexArray, seed: int, *, model: ComplexArray | None = None
) -> tuple[RangeStep, ...]:
    """What is found in a noisy measurement of `gain`, with the noise estimated as a fit does it."""
    measured = simulate_bench(gain, NOISE, np.random.default_rng(seed))
    model = loop(freq_hz) if model is None else model
    return find_range_steps(freq_hz, measured, model, estimate_noise(Sweep(freq_hz=freq_hz, gain=measured), model))


@pytest.mark.parametrize("count", [12, 61, 281])
def test_at_most_one_false_step_in_two_hundred_clean_sweeps(count: int) -> None:
    freq_hz = grid(count)
    assert sum(bool(look(freq_hz, loop(freq_hz), seed)) for seed in range(200)) <= 1


@pytest.mark.parametrize("count", [61, 281])
@pytest.mark.parametrize(("pole2_hz", "delay_s"), [(50e6, 0.0), (58e6, 0.3e-9), (300e6, 0.0)])
def test_a_smooth_misfit_is_no_step(count: int, pole2_hz: float, delay_s: float) -> None:
    freq_hz = grid(count)
    wrong = loop(freq_hz, pole2_hz=pole2_hz, delay_s=delay_s)
    assert not any(look(freq_hz, loop(freq_hz), seed, model=wrong) for seed in range(30))


@pytest.mark.parametrize("count", [61, 281, 600])
def test_resonances_of_any_sharpness_are_no_steps(count: int) -> None:
    freq_hz, rng = grid(count), np.random.default_rng(8)
    for seed in range(40):
        pair = resonance(
            freq_hz,
            at_hz=math.exp(rng.uniform(math.log(1e4), math.log(9e7))),
            quality=math.exp(rng.uniform(math.log(3), math.log(300))),
            apart=math.exp(rng.uniform(math.log(1e-3), math.log(0.1))) * rng.choice([-1, 1]),
        )
        assert look(freq_hz, loop(freq_hz) * pair, seed) == ()


@pytest.mark.parametrize("factor", [1.01, 1.3, 0.7j, 1000.0])
def test_spurs_are_no_steps(factor: complex) -> None:
    for index in (180, 200, 240, 274, 275, 279):
        gain = loop(grid())
        gain[index] *= factor
        assert look(grid(), gain, index) == ()


def test_a_bend_at_the_end_of_the_band_is_no_step() -> None:
    # The misfit of a forgotten pole pair just beyond the band grows ever faster.
    for seed in range(20):
        assert look(grid(), loop(grid()) * resonance(grid(), at_hz=105e6, quality=5, apart=0.1), seed) == ()


@pytest.mark.parametrize(("db", "deg"), [(0.1, 0.0), (-0.1, 0.0), (0.0, 1.0), (0.07, -0.7)])
def test_a_tenth_of_a_decibel_is_found_wherever_the_noise_is_a_tenth_of_a_percent(db: float, deg: float) -> None:
    # From 300 kHz, below which the floor of the error receiver rules, to five points from the end: 95 of 100.
    places = np.random.default_rng(2).integers(180, 275, 50)
    found = [look(grid(), stepped(loop(grid()), int(at), db=db, deg=deg), seed) for seed, at in enumerate(places)]
    right = [steps[0] for steps, at in zip(found, places, strict=True) if [step.index for step in steps] == [at]]
    assert len(right) >= 48
    # As large as it was: two components, in standard errors. Chi-square of 100 degrees has a spread of 14.
    wanted = complex(db * math.log(10) / 20, math.radians(deg))
    square = [abs(step.ln_ratio - wanted) ** 2 / step.stderr**2 for step in right]
    assert 0.6 < sum(square) / (2 * len(square)) < 1.5


def two_poles_and_a_zero(sweep: Sweep) -> ComplexArray:
    """Loop gain of the plain model fitted to a sweep, under the noise of the bench."""
    model = TwoPole(time_s=1 / (2 * np.pi * 58e6))
    w1, w2 = 2 * np.pi * 1.2e3, 2 * np.pi * 58e6
    a1, a2 = 1 / w1 + 1 / w2, 1 / (w1 * w2)
    start = model.vector(g=10 ** (82 / 20) / a1, q=1 / a1, b=a2 / a1, zero_time_s=1 / (2 * np.pi * 116e6))
    return model.gain(solve(model, sweep, NOISE, start).values, sweep.freq_hz)


def test_a_step_is_found_about_the_fit_that_it_has_bent() -> None:
    for seed, at in enumerate((190, 215, 240, 268)):
        measured = simulate_bench(stepped(loop(grid()), at, db=0.15), NOISE, np.random.default_rng(seed))
        sweep = Sweep(freq_hz=grid(), gain=measured)
        model = two_poles_and_a_zero(sweep)
        (step,) = find_range_steps(grid(), measured, model, estimate_noise(sweep, model))
        assert step.index == at
        assert step.db == pytest.approx(0.15, abs=4 * step.db_stderr)
        assert step.db_stderr < 0.02


def test_a_step_that_the_floor_drowns_is_not_found_and_a_large_one_is() -> None:
    # At 1 kHz the loop gain is 12 600, of which an error floor of 2e-5 makes 19 %: 1.6 dB.
    assert not any(look(grid(), stepped(loop(grid()), 80, db=0.5), seed) for seed in range(20))
    assert [step.index for step in look(grid(), stepped(loop(grid()), 140, db=3.0), 1)] == [140]


def test_several_steps_are_told_apart_by_rising_frequency() -> None:
    gain = stepped(stepped(loop(grid()), 250, db=0.5), 200, db=-0.3, deg=2.0)
    first, second = look(grid(), gain, 3)
    assert (first.index, second.index) == (200, 250)
    assert first.db == pytest.approx(-0.3, abs=4 * first.db_stderr)
    assert first.deg == pytest.approx(2.0, abs=4 * first.deg_stderr)
    assert second.db == pytest.approx(0.5, abs=4 * second.db_stderr)
    assert grid()[200] < first.f_hz < grid()[201]


def test_a_point_without_logarithm_is_passed_over_and_indices_stay_those_of_the_sweep() -> None:
    gain = stepped(loop(grid()), 230, db=0.5)
    gain[190] = 0.0
    model = loop(grid())
    measured = np.where(gain == 0, 0.0, simulate_bench(gain, NOISE, np.random.default_rng(4)))
    assert [step.index for step in find_range_steps(grid(), measured, model, NOISE)] == [230]


def test_a_sweep_of_a_few_points_shows_no_step() -> None:
    freq_hz = grid(9)
    assert find_range_steps(freq_hz, stepped(loop(freq_hz), 4, db=6.0), loop(freq_hz), NOISE) == ()


def test_decibels_degrees_and_errors_are_those_of_the_factor() -> None:
    step = RangeStep(index=3, f_hz=1e6, ln_ratio=complex(math.log(10) / 20, math.pi / 180), stderr=0.01)
    assert step.db == pytest.approx(1.0)
    assert step.deg == pytest.approx(1.0)
    assert abs(step.factor) == pytest.approx(10 ** (1 / 20))
    assert step.db_stderr == pytest.approx(0.0868589, rel=1e-5)  # 20/ln 10 is 8.68589
    assert step.deg_stderr == pytest.approx(0.572958, rel=1e-5)  # 180/π is 57.2958
    assert step.significance == pytest.approx(math.hypot(math.log(10) / 20, math.pi / 180) / 0.01)
