"""Adequacy: silent on good sweeps, heard on a third pole, a resonance and a wrong noise level."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from bench_loops import FREQ_HZ, NOISE, STANDARD, Loop
from scipy import stats

from fitamp.fitting.adequacy import judge
from fitamp.fitting.two_pole import Solution, TwoPole, solve
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep


def plain_fit(sweep: Sweep, loop: Loop = STANDARD, noise: NoiseLevels | None = None) -> Solution:
    """Two poles and a zero from a start nearby, with noise given or estimated as the fit does it."""
    model = TwoPole(time_s=1 / (2 * np.pi * 58e6))
    w1, w2 = 2 * np.pi * abs(loop.pole1_hz), 2 * np.pi * abs(loop.pole2_hz)
    a1, a2 = 1 / w1 + 1 / w2, 1 / (w1 * w2)
    values = model.vector(g=loop.dc_gain / a1, q=1 / a1, b=a2 / a1, zero_time_s=loop.zero_time_s)
    for _ in range(2):
        levels = noise or estimate_noise(sweep, model.gain(values, sweep.freq_hz))
        solution = solve(model, sweep, levels, values)
        values = np.array(solution.values)
    return solution


@pytest.fixture(scope="module")
def good() -> list[Solution]:
    return [plain_fit(STANDARD.measured(seed)) for seed in range(200)]


def test_at_most_two_false_alarms_in_two_hundred_good_sweeps(good: list[Solution]) -> None:
    verdicts = [judge(solution) for solution in good]
    assert sum(not verdict.adequate for verdict in verdicts) <= 2
    assert all(verdict.inflation == 1.0 for verdict in verdicts if verdict.adequate)


def test_both_statistics_are_about_standard_normal_on_good_sweeps(good: list[Solution]) -> None:
    # 200 of them: mean ± 0.07 and spread ± 5 % by chance; a level that comes from the same points may be narrower.
    verdicts = [judge(solution) for solution in good]
    level, structure = (np.array([getattr(v, name) for v in verdicts]) for name in ("level", "structure"))
    assert 0.3 < level.std() < 1.3
    assert abs(level.mean()) < 0.8
    assert 0.6 < structure.std() < 1.4
    assert -1.2 < structure.mean() < 0.3  # four fitted parameters take a little of the slow noise away
    assert np.mean([v.reduced_chi_square for v in verdicts]) == pytest.approx(1.0, abs=0.05)


def test_given_noise_makes_chi_square_what_it_should_be() -> None:
    # 2n − 4 degrees of freedom; Kolmogorov–Smirnov against the chi-square distribution.
    chi = [plain_fit(STANDARD.measured(seed), noise=NOISE).optimum.chi_square for seed in range(60)]
    assert stats.kstest(chi, "chi2", args=(2 * len(FREQ_HZ) - 4,)).pvalue > 0.01


def test_a_third_pole_within_sight_is_heard() -> None:
    loop = replace(STANDARD, third_s=1 / (2 * np.pi * 300e6))
    for seed in range(5):
        verdict = judge(plain_fit(loop.measured(seed)))
        assert not verdict.adequate
        assert verdict.inflation > 1
        assert "pattern along frequency" in verdict.sentence


def test_a_resonance_is_heard() -> None:
    # A doublet of 2 % at 3 MHz, quality 20: a few points wide.
    s = 1j * FREQ_HZ / 3e6
    doublet = (1 + s / 20 * 1.4 + s**2) / (1 + s / 20 + s**2)
    for seed in range(5):
        sweep = STANDARD.measured(seed)
        assert not judge(plain_fit(replace(sweep, gain=sweep.gain * doublet))).adequate


def test_noise_given_too_low_is_heard_and_widens_by_the_misfit() -> None:
    low = NoiseLevels(error_channel=1e-5, return_channel=1e-5, relative=5e-4)
    verdict = judge(plain_fit(STANDARD.measured(3), noise=low))
    assert not verdict.adequate
    assert verdict.reduced_chi_square == pytest.approx(4.0, rel=0.2)
    assert verdict.inflation >= verdict.reduced_chi_square
    assert "2 times as large as the scatter allows" in verdict.sentence


def test_noise_given_right_is_no_alarm() -> None:
    verdict = judge(plain_fit(STANDARD.measured(4), noise=NOISE))
    assert verdict.adequate
    assert verdict.sentence == "residuals look like the noise"


def test_an_exact_sweep_is_no_evidence_against_the_model() -> None:
    verdict = judge(plain_fit(STANDARD.exact()))
    assert verdict.adequate
    assert verdict.reduced_chi_square < 0.01


def within(verdict_hz: tuple[float, float], low_hz: float, high_hz: float) -> bool:
    return low_hz <= verdict_hz[0] <= verdict_hz[1] <= high_hz


def test_where_the_residuals_are_unlike_the_noise_is_said() -> None:
    third = replace(STANDARD, third_s=1 / (2 * np.pi * 300e6))
    s = 1j * FREQ_HZ / 3e6
    doublet = (1 + s / 20 * 1.1 + s**2) / (1 + s / 20 + s**2)
    for seed in range(3):
        # What a third pole beyond the band leaves is near its top; what a resonance leaves is around it.
        verdict = judge(plain_fit(third.measured(seed)), FREQ_HZ)
        assert verdict.where_hz is not None
        assert len(verdict.where_hz) == 1
        assert within(verdict.where_hz[0], 1e6, 100e6)
        assert "follow a pattern along frequency, mostly between" in verdict.sentence
        assert ", and are " in verdict.sentence
        sweep = STANDARD.measured(seed)
        verdict = judge(plain_fit(replace(sweep, gain=sweep.gain * doublet)), FREQ_HZ)
        assert verdict.where_hz is not None
        assert within(verdict.where_hz[0], 1e6, 9e6)
        assert verdict.where_hz[0][0] < 3e6 < verdict.where_hz[0][1]
        assert verdict.sentence.startswith("the residuals are ")
        assert ", mostly between" in verdict.sentence


def test_too_much_everywhere_is_said_to_be_everywhere_and_of_one_level_where_it_rules() -> None:
    low = NoiseLevels(error_channel=1e-5, return_channel=1e-5, relative=5e-4)
    verdict = judge(plain_fit(STANDARD.measured(3), noise=low), FREQ_HZ)
    assert verdict.where_hz == ()
    assert verdict.sentence.endswith("as the scatter allows, throughout the band")
    # The error receiver's floor rules where the loop gain is above relative/floor = 50: below about 300 kHz.
    quiet_error = NoiseLevels(error_channel=1e-5, return_channel=2e-5, relative=1e-3)
    verdict = judge(plain_fit(STANDARD.measured(3), noise=quiet_error), FREQ_HZ)
    assert verdict.where_hz is not None
    assert within(verdict.where_hz[0], 10.0, 600e3)


def test_adequate_residuals_have_no_place_and_without_frequencies_nothing_is_said_of_it(good: list[Solution]) -> None:
    assert judge(good[0], FREQ_HZ).where_hz == ()
    assert judge(good[0], FREQ_HZ).sentence == "residuals look like the noise"
    low = NoiseLevels(error_channel=1e-5, return_channel=1e-5, relative=5e-4)
    verdict = judge(plain_fit(STANDARD.measured(3), noise=low))
    assert verdict.where_hz is None
    assert verdict.sentence.endswith("2 times as large as the scatter allows")
