"""Bad points: found where they are, named, and none found in what is clean, wrong but smooth, or structure."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp import DelayPrior, FarPolePrior, simulate_bench
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.spurs import find_spurs, without_spurs
from fitamp.fitting import fit_sweep
from fitamp.sweep import NoiseLevels, Sweep

# All invented: the standard bench of the accuracy script.
FREQ_HZ: FloatArray = np.geomspace(10.0, 100e6, 281)
NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)


def loop(freq_hz: FloatArray = FREQ_HZ, *, third_hz: float = np.inf) -> ComplexArray:
    poles = (1 + 1j * freq_hz / 1.2e3) * (1 + 1j * freq_hz / 58e6) * (1 + 1j * freq_hz / third_hz)
    return np.asarray(10 ** (82 / 20) * (1 + 1j * freq_hz / 116e6) / poles)


def resonance(*, at_hz: float, quality: float, apart: float) -> ComplexArray:
    """A zero pair over a pole pair, `apart` from each other relative to their frequency."""

    def pair(pair_hz: float) -> ComplexArray:
        return np.asarray(1 + 1j * FREQ_HZ / (quality * pair_hz) - (FREQ_HZ / pair_hz) ** 2)

    return np.asarray(pair(at_hz * (1 + apart)) / pair(at_hz))


def measured(gain: ComplexArray, seed: int) -> Sweep:
    return Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(gain, NOISE, np.random.default_rng(seed)))


def white(seed: int, count: int = 281) -> ComplexArray:
    draws = np.random.default_rng(seed).standard_normal((2, count))
    return np.asarray(draws[0] + 1j * draws[1])


@pytest.mark.parametrize("count", [12, 16, 40, 281])
def test_white_noise_loses_points_in_fewer_than_one_sweep_in_twenty(count: int) -> None:
    freq_hz = np.geomspace(10.0, 100e6, count)
    assert sum(bool(find_spurs(freq_hz, white(seed, count))) for seed in range(400)) <= 20


@pytest.mark.parametrize(
    "gain",
    [
        loop(),
        loop(third_hz=200e6),
        loop() * resonance(at_hz=30e6, quality=20, apart=0.02),
        loop() * resonance(at_hz=3e6, quality=100, apart=0.02),
    ],
    ids=["two poles", "third pole", "resonance", "narrow resonance"],
)
def test_clean_sweeps_keep_their_points(gain: ComplexArray) -> None:
    # 5 % are allowed: of 12 sweeps at most 2, which 5 % would exceed once in 50 times.
    assert sum(bool(fit_sweep(measured(gain, seed)).sweep.left_out) for seed in range(12)) <= 2


@pytest.mark.parametrize(("index", "factor"), [(150, 1.3), (200, 0.7), (264, 1.1), (280, 1.3), (120, 1000.0)])
def test_a_single_bad_reading_is_left_out_with_its_frequency_and_the_fit_is_as_without_it(
    index: int, factor: float
) -> None:
    clean = measured(loop(), 5)
    gain = clean.gain.copy()
    gain[index] *= factor
    found = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain))
    (out,) = found.sweep.left_out
    assert out.f_hz == FREQ_HZ[index]
    assert out.gain == gain[index]
    assert out.reason.endswith("σ off its neighbours")
    without = fit_sweep(clean.without(np.arange(281) != index, "by hand"))
    for (name, seen), (_, expected) in zip(found.parameters.items(), without.parameters.items(), strict=True):
        assert seen.value == pytest.approx(expected.value, rel=1e-4, abs=1e-14), name


def test_a_known_lag_does_not_keep_bad_points_in() -> None:
    gain = measured(loop(), 6).gain.copy()
    gain[210] *= 1.3
    found = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain), far_pole=FarPolePrior(), delay=DelayPrior())
    assert [point.f_hz for point in found.sweep.left_out] == [FREQ_HZ[210]]


def test_everything_is_kept_on_request_and_what_it_looks_like_said() -> None:
    gain = measured(loop(), 5).gain.copy()
    gain[200] *= 1.3
    found = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain), keep_all=True)
    assert len(found.sweep) == 281
    # A single high point may as well be taken for a very narrow resonance.
    assert {warning.code.value for warning in found.warnings} & {"outlying-points", "resonance"}


def test_too_many_bad_points_all_stay_and_the_alarm_speaks() -> None:
    gain = measured(loop(), 5).gain.copy()
    rng = np.random.default_rng(1)
    # Where the relative error rules, every fourth reading is 10 % off.
    gain[120::4] *= 1 + 0.1 * np.exp(2j * np.pi * rng.random(len(gain[120::4])))
    found = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain))
    assert found.sweep.left_out == ()
    assert len(found.sweep) == 281


def test_mains_lines_are_named() -> None:
    residuals = white(3)
    for line_hz in (50.0, 180.0):
        residuals[np.argmin(np.abs(FREQ_HZ - line_hz))] = 9.0
    sweep = Sweep(freq_hz=FREQ_HZ, gain=loop())
    reasons = [point.reason for point in without_spurs(sweep, residuals).left_out]
    assert len(reasons) == 2
    assert reasons[0].startswith("mains line: 50 Hz, ")
    assert reasons[1].startswith("mains line: 3rd harmonic of 60 Hz, ")


def test_a_line_as_wide_as_the_receiver_goes_as_a_whole_and_a_bump_elsewhere_stays() -> None:
    freq_hz = np.arange(1.0, 282.0)
    bump = 20 * np.exp(-0.5 * (np.arange(-2, 3) / 1.2) ** 2)
    residuals = white(4)
    residuals[147:152] += bump
    residuals[220:225] += bump
    # The peak goes first, and then what is left of its flanks.
    reasons: dict[float, str] = {}
    while spurs := find_spurs(freq_hz, residuals):
        reasons |= {float(freq_hz[spur.index]): spur.reason for spur in spurs}
        keep = ~np.isin(freq_hz, list(reasons))
        freq_hz, residuals = freq_hz[keep], residuals[keep]
    assert reasons.keys() >= {149.0, 150.0, 151.0}
    assert all("3rd harmonic of 50 Hz" in reason for reason in reasons.values())


def test_neither_step_nor_smooth_misfit_is_a_spur() -> None:
    position = np.linspace(0.0, 1.0, 281)
    step = np.where(position > 0.6, 80.0, 0.0)
    smooth = 300 * np.sin(12 * position) + 500 * position**3
    for seed in range(10):
        assert find_spurs(FREQ_HZ, white(seed) + step) == ()
        assert find_spurs(FREQ_HZ, white(seed) + smooth) == ()


@pytest.mark.parametrize("bend", [20.0, 100.0, 400.0])
def test_a_bend_at_the_end_of_the_band_is_no_spur(bend: float) -> None:
    # A forgotten third pole: the misfit grows ever faster towards the top.
    misfit = bend * np.linspace(0.0, 1.0, 281) ** 12
    assert sum(bool(find_spurs(FREQ_HZ, white(seed) + misfit)) for seed in range(60)) <= 6


def test_a_sweep_without_spurs_is_the_same_object() -> None:
    sweep = measured(loop(), 1)
    assert without_spurs(sweep, np.zeros(281, dtype=complex)) is sweep
