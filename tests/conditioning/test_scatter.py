"""What all repeats have alike: seen in the scatter of their mean, and seldom where there is nothing."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from repeated_sweeps import loop, repeats

from fitamp.arrays import ComplexArray
from fitamp.conditioning.repeats import NOISE as TOPIC
from fitamp.conditioning.repeats import average_repeats
from fitamp.conditioning.scatter import Contradiction, mean_without_glitches, scatter_of_mean
from fitamp.fitting import fit_sweep
from fitamp.sweep import NoiseLevels, Sweep


def seen(sd_factor: float, *, seed: int = 1, points: int = 281, peaking: float = 0.0) -> Contradiction | None:
    """A mean of 5 repeats of known noise, held against `sd_factor` of that noise."""
    freq_hz = np.geomspace(10.0, 100e6, points)
    closed = 1 / (1 + loop(freq_hz) * np.exp(-1j * peaking * freq_hz / 14e6))
    variance = 1e-10 + (1e-4 * np.abs(closed * (1 - closed))) ** 2
    rng = np.random.default_rng(seed)
    noise = np.sqrt(variance / 2) * (rng.standard_normal(points) + 1j * rng.standard_normal(points))
    return scatter_of_mean(freq_hz, closed + noise, sd_factor**2 * variance, 5)


@pytest.mark.parametrize(("points", "peaking"), [(281, 0.0), (281, 0.9), (120, 0.0), (1001, 0.0)])
def test_right_noise_is_seldom_contradicted(points: int, peaking: float) -> None:
    # 1 % is asked for: of 60 at most 3, which 1 % would exceed once in 300 times. The noise here is exactly right. A
    # closed loop that peaks tenfold bends the most.
    assert sum(seen(1.0, seed=seed, points=points, peaking=peaking) is not None for seed in range(60)) <= 3


def test_wrong_noise_is_contradicted() -> None:
    for seed in range(10):
        small, large = seen(0.7, seed=seed), seen(1.4, seed=seed)
        assert small is not None
        assert small.too_small
        assert large is not None
        assert not large.too_small


def test_a_sweep_too_coarse_to_tell_shape_from_scatter_is_not_judged() -> None:
    assert seen(0.01, points=60) is None
    assert seen(0.01, points=5) is None


def test_interference_common_to_all_repeats_is_said_and_the_fit_takes_the_scatter() -> None:
    rng = np.random.default_rng(3)
    common = 1 + 1e-3 * (rng.standard_normal(281) + 1j * rng.standard_normal(281))
    average = average_repeats(repeats(5, 1, changes=dict.fromkeys(range(5), common)))
    (said,) = (decision for decision in average.decisions if decision.topic == TOPIC)
    assert said.choice == "not used"
    assert "something is in all of them alike" in said.reason
    assert average.noise is None
    fit = fit_sweep(average)
    assert fit.noise.source == "estimated from the sweep"
    assert fit.adequacy.adequate


def test_what_changes_between_repeats_without_a_place_is_said() -> None:
    # Each repeat wanders along frequency in a way of its own: no contrast holds it all, every part of the band does.
    rng = np.random.default_rng(4)
    position = np.linspace(0.0, 1.0, 281)
    wander = {i: 1 + 4e-3 * np.sin(40 * position + rng.uniform(0, 6)) for i in range(5)}
    average = average_repeats(repeats(5, 1, changes=wander))
    assert {decision.topic for decision in average.decisions} & {TOPIC, "drift of repeats"}


def test_lines_at_one_frequency_do_not_count() -> None:
    # A fit leaves them out by itself.
    bad = np.where(np.isin(np.arange(281), [120, 190]), 1.3, 1.0)
    average = average_repeats(repeats(5, 1, changes=dict.fromkeys(range(5), bad)))
    assert TOPIC not in {decision.topic for decision in average.decisions}
    assert average.noise is not None
    assert len(fit_sweep(average).sweep) == 279


def test_files_rounded_to_their_scatter_do_not_pass_for_better_than_they_are() -> None:
    # Three significant digits, all repeats alike where their noise is far less.
    quiet = NoiseLevels(error_channel=1e-9, return_channel=1e-9, relative=1e-6)

    def rounded(gain: ComplexArray) -> ComplexArray:
        decibels = np.round(20 * np.log10(np.abs(gain)), 2)
        return np.asarray(10 ** (decibels / 20) * np.exp(1j * np.angle(gain)))

    sweeps: list[Sweep] = [replace(s, gain=rounded(s.gain)) for s in repeats(4, 1, noise=quiet)]
    average = average_repeats(sweeps)
    assert average.noise is None
    assert TOPIC in {decision.topic for decision in average.decisions}


def test_the_mean_leaves_out_a_few_and_not_many() -> None:
    squares = np.ones(20)
    squares[3] = 100.0
    assert mean_without_glitches(squares) == 1.0
    squares[:10] = 100.0
    assert mean_without_glitches(squares) == pytest.approx(50.5)
