"""Through sweeps: the delay and its standard error, what is no pure delay or no through sweep, and dividing it out."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import ArrayLike
from repeated_sweeps import loop

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.through import DepartureKind, ThroughDelay, divided_by_through, through_delay
from fitamp.errors import SweepError
from fitamp.fitting import DelayPrior, fit_sweep
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep

FREQ_HZ: FloatArray = np.geomspace(10.0, 200e6, 281)
DELAY_S = 0.412e-9
Shape = Callable[[FloatArray], ArrayLike]


def through(
    seed: int = 1, *, shape: Shape | None = None, scatter: float = 1e-3, freq_hz: FloatArray = FREQ_HZ
) -> Sweep:
    """Both receivers on one node, behind cables of 0.412 ns difference and what `shape` makes of it."""
    rng = np.random.default_rng(seed)
    noise = scatter * (rng.standard_normal(len(freq_hz)) + 1j * rng.standard_normal(len(freq_hz))) / np.sqrt(2)
    gain = np.exp(-2j * np.pi * freq_hz * DELAY_S) * (1 + noise)
    if shape is not None:
        gain = gain * np.asarray(shape(freq_hz))
    return Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file="through.csv", sha256="5e"))


def kinds(found: ThroughDelay) -> list[str]:
    return [departure.kind.value for departure in found.departures]


def test_the_delay_comes_with_its_error_and_its_source() -> None:
    found = through_delay(through(scatter=0.02))
    assert found.delay_s == pytest.approx(DELAY_S, abs=3 * found.stderr_s)
    # Σω² is half the points of an e-fold, 16.7, times the highest ω²: 0.02/√2 over 2π · 200 MHz · √8.3 is 3.9 ps.
    assert found.stderr_s == pytest.approx(3.9e-12, rel=0.4)
    assert str(found).startswith("delay 4")
    assert str(found).endswith(" ps, measured with a through sweep through.csv")
    assert (found.file, found.sha256, found.points) == ("through.csv", "5e", 281)
    assert found.scatter == pytest.approx(0.02, rel=0.15)
    assert found.is_pure_delay
    assert found.sentence == "flat, and a pure delay, within its noise"


def test_a_clean_through_sweep_is_seldom_blamed() -> None:
    # 0.3 % for each of gain, flatness and phase: of 100 at most 4, which 1 % would exceed once in 300 times.
    found = [through_delay(through(seed)) for seed in range(100)]
    assert sum(not one.is_pure_delay for one in found) <= 4
    in_sigma = np.array([(one.delay_s - DELAY_S) / one.stderr_s for one in found])
    assert np.mean(np.abs(in_sigma) < 1.96) >= 0.88  # 95 % less three standard errors of 100 draws
    assert abs(in_sigma.mean()) < 0.35


def test_a_sagging_magnitude_is_placed() -> None:
    found = through_delay(through(shape=lambda f: 1 / (1 + 1j * f / 1.5e9)))
    (departure,) = (one for one in found.departures if one.kind is DepartureKind.MAGNITUDE)
    # −10 log10(1 + (f/1.5 GHz)²) is −0.02 dB at 100 MHz and −0.08 dB at 200 MHz.
    assert departure.f_max_hz == pytest.approx(200e6)
    assert -0.08 < departure.amount < -0.02
    assert "magnitude −0.0" in found.sentence
    assert "to 200.0 MHz (" in found.sentence
    # The lag of a single pole far above the band is a delay of 1/(2π · 1.5 GHz), as good as.
    assert found.delay_s == pytest.approx(DELAY_S + 106.1e-12, abs=2e-12)


def test_a_gain_that_is_not_one_is_said() -> None:
    found = through_delay(through(shape=lambda f: np.full(len(f), 0.95 + 0j)))
    assert kinds(found) == ["gain"]
    assert "gain −0.45 dB all over, and so in T(0)" in found.sentence
    assert found.gain == pytest.approx(0.95, rel=1e-3)


def test_a_phase_that_is_no_delay_widens_the_error() -> None:
    # Losses of a long cable by skin effect go with the root of the frequency, and turn the phase as much.
    pure, lossy = (
        through_delay(through(shape=shape)) for shape in (None, lambda f: np.exp(-(1 + 1j) * 0.02 * np.sqrt(f / 200e6)))
    )
    assert DepartureKind.PHASE.value in kinds(lossy)
    assert lossy.stderr_s > 5 * pure.stderr_s
    # Over the top decade, 0.02/ω at 200 MHz to 0.063/ω at 20 MHz: 16 ps to 50 ps more than the delay alone.
    assert 8e-12 < lossy.delay_s - DELAY_S < 50e-12


def test_a_coupled_receiver_does_not_move_the_delay() -> None:
    found = through_delay(through(shape=lambda f: 1 / (1 - 3j / f)))
    (departure,) = (one for one in found.departures if one.kind is DepartureKind.PHASE)
    assert departure.f_min_hz == 10.0
    assert departure.amount > 5
    assert found.delay_s == pytest.approx(DELAY_S, abs=3e-12)


def test_a_glitch_is_left_out() -> None:
    found = through_delay(through(shape=lambda f: np.where(np.arange(len(f)) == 150, 1.2 + 0j, 1.0)))
    (out,) = found.left_out
    assert out.f_hz == FREQ_HZ[150]
    assert found.points == 280
    assert found.is_pure_delay


@pytest.mark.parametrize(
    ("sweep", "words"),
    [
        (through(shape=loop), r"magnitude runs from 82 dB to -\d+ dB, where two receivers on one node read 0 dB"),
        (through(shape=lambda f: np.full(len(f), 0.03 + 0j)), r"magnitude runs from -30 dB to -30 dB"),
        (through(shape=lambda f: np.zeros(len(f), dtype=complex)), r"it is 0 throughout"),
        (through(scatter=300.0, shape=lambda f: np.full(len(f), 0.01 + 0j)), r"its phase follows no delay"),
    ],
)
def test_what_is_no_through_sweep_is_refused(sweep: Sweep, words: str) -> None:
    with pytest.raises(SweepError, match=rf"^through\.csv: this is no through sweep: .*{words}"):
        through_delay(sweep)


def test_a_handful_of_points_is_refused() -> None:
    with pytest.raises(SweepError, match=r"^through\.csv: 8 points, a through sweep needs 12 or more"):
        through_delay(through(freq_hz=FREQ_HZ[:8]))


def test_a_computed_through_sweep_has_its_delay_and_nothing_else() -> None:
    found = through_delay(through(scatter=0.0))
    assert found.delay_s == pytest.approx(DELAY_S, rel=1e-9)
    assert found.is_pure_delay
    assert found.left_out == ()


def test_with_the_measured_delay_the_zero_is_where_it_is() -> None:
    noise = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
    gain = loop(FREQ_HZ) * np.exp(-2j * np.pi * FREQ_HZ * DELAY_S)
    sweep = Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(gain, noise, np.random.default_rng(2)))
    found = through_delay(through())
    fit = fit_sweep(sweep, delay=DelayPrior(mean_s=found.delay_s, sd_s=found.stderr_s))
    zero = fit.parameters.zero_time_s
    assert zero.value == pytest.approx(1 / (2 * np.pi * 110e6), abs=3 * (zero.stderr or 0.0))


def bent(freq_hz: FloatArray) -> ComplexArray:
    """An inverting read-out whose magnitude sags and ripples."""
    return np.asarray(-(1 + 0.02 * np.cos(freq_hz / 40e6)) / (1 + 1j * freq_hz / 1e9))


def test_what_is_divided_out_leaves_the_loop() -> None:
    bench = bent(FREQ_HZ) * np.exp(-2j * np.pi * FREQ_HZ * DELAY_S)
    sweep = Sweep(freq_hz=FREQ_HZ[5::3], gain=-(loop(FREQ_HZ) * bench)[5::3], origin=Origin(file="a.csv"))
    divided = divided_by_through(sweep, through(shape=bent, scatter=1e-5))
    assert len(divided) == len(sweep)
    assert divided.gain / loop(divided.freq_hz) == pytest.approx(1.0, abs=1e-4)
    decision = divided.decisions[-1]
    assert (decision.topic, decision.choice) == ("through sweep", "divided out")
    assert "through.csv" in decision.reason


def test_between_its_points_the_through_sweep_is_interpolated() -> None:
    between = np.sqrt(FREQ_HZ[:-1] * FREQ_HZ[1:])
    bench = bent(between) * np.exp(-2j * np.pi * between * 80e-9)
    sweep = Sweep(freq_hz=between, gain=-loop(between) * bench)
    long_cables = through(shape=lambda f: bent(f) * np.exp(-2j * np.pi * f * (80e-9 - DELAY_S)), scatter=0.0)
    # 80 ns turn by a full turn from point to point at the top, so the delay has to be taken out before.
    assert divided_by_through(sweep, long_cables).gain / loop(between) == pytest.approx(1.0, abs=2e-3)


def test_beyond_the_band_of_the_through_sweep_nothing_is_kept() -> None:
    narrow = through(freq_hz=FREQ_HZ[100:200])
    divided = divided_by_through(Sweep(freq_hz=FREQ_HZ, gain=loop(FREQ_HZ)), narrow)
    assert divided.freq_hz.tolist() == FREQ_HZ[100:200].tolist()
    assert len(divided.left_out) == 181
    assert divided.left_out[0].reason == "outside the band of the through sweep through.csv"
    above = Sweep(freq_hz=np.array([1e9, 2e9]), gain=np.array([1.0, 0.5]), origin=Origin(file="a.csv"))
    with pytest.raises(SweepError, match=r"^a\.csv: no point lies in the band of the through sweep through\.csv, 4\.0"):
        divided_by_through(above, narrow)


def test_its_noise_is_added() -> None:
    noise = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
    divided = divided_by_through(Sweep(freq_hz=FREQ_HZ, gain=loop(FREQ_HZ), noise=noise), through(scatter=1e-3))
    assert divided.noise is not None
    assert divided.noise.relative == pytest.approx(np.sqrt(2) * 1e-3, rel=0.05)
    assert divided.noise.error_channel == 2e-5


def test_bad_points_of_the_through_sweep_are_bridged() -> None:
    spoilt = through(shape=lambda f: np.where(np.arange(len(f)) == 150, 1.2 + 0j, 1.0), scatter=1e-4)
    divided = divided_by_through(Sweep(freq_hz=FREQ_HZ, gain=loop(FREQ_HZ)), spoilt)
    assert np.abs(divided.gain * np.exp(-2j * np.pi * FREQ_HZ * DELAY_S) / loop(FREQ_HZ) - 1).max() < 1e-3
