"""Repeats: averaged without bias, with the noise of their differences, and with what none of them can be blamed for."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from repeated_sweeps import DC_GAIN, FREQ_HZ, NOISE, loop, repeats

from fitamp.conditioning.repeats import average_repeats
from fitamp.errors import SweepError, UsageError
from fitamp.fitting import fit_sweep
from fitamp.fitting.adequacy import judge
from fitamp.sweep import Concern, LeftOut, NoiseLevels, Sign, Sweep

LEVELS = ("error_channel", "return_channel", "relative")


def topics(sweep: Sweep) -> list[str]:
    return [decision.topic for decision in sweep.decisions]


def test_an_average_of_the_loop_gain_itself_is_biased_and_this_is_not() -> None:
    # For z complex normal about e with variance σ², the mean of 1/z is (1 − exp(−|e|²/σ²))/e: averaging over the angle
    # leaves only the z nearer to e than 0 is (mean value property of 1/z; by hand). With σ = |e| 37 % are lost.
    drowned = NoiseLevels(error_channel=1 / DC_GAIN, return_channel=1e-5, relative=1e-4)
    low = FREQ_HZ[FREQ_HZ < 120.0]
    sweeps = repeats(200, 1, noise=drowned, freq_hz=np.linspace(low[0], low[-1], 40))
    naive = np.mean([sweep.gain for sweep in sweeps])
    assert abs(naive) / DC_GAIN == pytest.approx(1 - np.exp(-1), abs=0.05)
    # 40 · 200 readings leave 1.1 % of the error channel.
    averaged = average_repeats(sweeps, keep_all=True)
    assert (1 / np.mean(1 / averaged.gain)).real / DC_GAIN == pytest.approx(1.0, abs=0.04)


@pytest.mark.parametrize("count", [2, 5])
def test_the_noise_of_the_average_is_found(count: int) -> None:
    found = [average_repeats(repeats(count, seed)).noise for seed in range(20)]
    for name in LEVELS[::2]:
        levels = [getattr(noise, name) for noise in found if noise is not None]
        assert np.mean(levels) * np.sqrt(count) == pytest.approx(getattr(NOISE, name), rel=0.03)
    assert found[0] is not None
    assert (found[0].source, found[0].repeats) == (f"from {count} repeats", count)


@pytest.mark.parametrize("count", [2, 5])
def test_fits_of_averages_err_as_much_as_they_say(count: int) -> None:
    truth = {"dc_gain": DC_GAIN, "pole1_hz": 1.2e3, "pole2_hz": 58e6, "zero_time_s": 1 / (2 * np.pi * 110e6)}
    in_sigma = []
    for seed in range(15):
        fit = fit_sweep(average_repeats(repeats(count, 100 + seed)))
        assert fit.adequacy.adequate
        for name, true in truth.items():
            estimate = getattr(fit.parameters, name)
            in_sigma.append((estimate.value - true) / estimate.stderr)
    # 15 · 4 values, the four of a fit correlated: mean square 1 ± 0.25, mean 0 ± 0.2.
    assert np.mean(np.square(in_sigma)) == pytest.approx(1.0, abs=0.6)
    assert abs(np.mean(in_sigma)) < 0.5


@pytest.mark.parametrize(("count", "variance"), [(2, 2.0), (5, 1.25)])
def test_a_fit_is_judged_by_how_well_the_repeats_know_the_noise(count: int, variance: float) -> None:
    # The residuals' mean square has variance 1/n, that of the noise 1/(n (K − 1)) more.
    solution = fit_sweep(average_repeats(repeats(count, 7))).solution
    as_given = replace(solution, noise=replace(solution.noise, source="given", repeats=0))
    assert judge(as_given).level / judge(solution).level == pytest.approx(np.sqrt(variance))


def test_five_repeats_halve_the_standard_error_and_more() -> None:
    sweeps = repeats(5, 3)
    one, five = (fit_sweep(sweep).parameters.zero_time_s.stderr for sweep in (sweeps[0], average_repeats(sweeps)))
    assert one is not None
    assert five is not None
    assert one / five == pytest.approx(np.sqrt(5), rel=0.25)


def test_one_repeat_is_the_sweep_itself() -> None:
    (sweep,) = repeats(1, 1)
    assert average_repeats([sweep]) is sweep
    assert average_repeats([sweep], noise=NOISE).noise == NOISE


def test_a_noise_that_is_known_is_taken_over_the_root() -> None:
    noise = average_repeats(repeats(4, 1), noise=NOISE).noise
    assert noise is not None
    assert [getattr(noise, name) for name in LEVELS] == [1e-5, 1e-5, 5e-4]
    assert (noise.source, noise.repeats) == ("given, for the mean of 4 repeats", 0)


def test_the_average_says_of_what_it_is() -> None:
    sweeps = repeats(3, 1)
    sweeps = [sweep.with_decision("trace", "S21", f"in {sweep.origin.file}") for sweep in sweeps]
    average = average_repeats([sweeps[0], sweeps[1].with_decision("order", "reversed", ""), sweeps[2]])
    assert average.origin.file == "average of A.csv, B.csv and C.csv"
    assert [origin.file for origin in average.origin.averaged] == ["A.csv", "B.csv", "C.csv"]
    assert topics(average) == ["trace", "repeats"]
    said = average.decisions[1]
    assert (said.choice, said.concern) == ("average of 3", Concern.RESULT)
    assert said.reason.startswith("A.csv, B.csv, C.csv; ")
    many = average_repeats(repeats(6, 1)).origin.file
    assert many == "average of A.csv and 5 more"


def test_sweeps_of_one_name_are_numbered() -> None:
    sweeps = [replace(sweep, origin=replace(sweep.origin, file="(in memory)")) for sweep in repeats(2, 1)]
    assert average_repeats(sweeps).origin.file == "average of repeat 1 of (in memory) and repeat 2 of (in memory)"


def test_an_average_survives_its_data_frame() -> None:
    average = average_repeats(repeats(3, 1, changes={1: 1.01}))
    assert Concern.CAUTION in [decision.concern for decision in average.decisions]
    assert Sweep.from_frame(average.to_frame()) == average


def test_a_point_left_out_of_one_repeat_is_left_out_of_all() -> None:
    sweeps = repeats(3, 1)
    keep = np.arange(281) != 100
    average = average_repeats([sweeps[0], sweeps[1].without(keep, "glitch"), sweeps[2]])
    assert len(average) == 280
    assert [(point.f_hz, point.reason) for point in average.left_out] == [(FREQ_HZ[100], "B.csv: glitch")]
    assert average.left_out[0].gain == sweeps[1].gain[100]


def test_what_all_leave_out_is_listed_once() -> None:
    at_zero = LeftOut(f_hz=0.0, gain=1 + 0j, reason="0 Hz")
    average = average_repeats([replace(sweep, left_out=(at_zero,)) for sweep in repeats(2, 1)])
    assert [(point.f_hz, point.reason) for point in average.left_out] == [(0.0, "A.csv: 0 Hz")]


@pytest.mark.parametrize(("count", "blamed"), [(2, "A.csv or B.csv"), (3, "C.csv"), (5, "C.csv")])
def test_a_glitch_of_one_repeat_is_left_out_with_its_name(count: int, blamed: str) -> None:
    factor = np.where(np.arange(281) == 150, 1.3, 1.0)
    sweeps = repeats(count, 2, changes={min(2, count - 1): factor})
    (out,) = average_repeats(sweeps).left_out
    assert out.f_hz == FREQ_HZ[150]
    assert out.reason.startswith(f"{blamed}: ")
    assert out.reason.endswith(" σ off its neighbours")
    assert len(average_repeats(sweeps, keep_all=True)) == 281


def test_clean_repeats_seldom_lose_a_point() -> None:
    # Each repeat asks for 2 % of false alarms; of 30 sets of 3 at most 5, which 6 % would exceed once in 200 times.
    assert sum(bool(average_repeats(repeats(3, 500 + seed)).left_out) for seed in range(30)) <= 5


def test_frequencies_as_two_files_round_them_are_the_same() -> None:
    first, second = repeats(2, 1)
    rounded = np.array([float(f"{f:.6e}") for f in FREQ_HZ])
    average = average_repeats([first, replace(second, freq_hz=rounded)])
    assert np.array_equal(average.freq_hz, FREQ_HZ)


def test_few_points_are_averaged_and_leave_the_noise_open() -> None:
    average = average_repeats(repeats(2, 1, freq_hz=np.geomspace(1e3, 1e6, 8)))
    assert average.noise is None
    assert average.gain == pytest.approx(loop(average.freq_hz), rel=0.2)


def test_what_cannot_be_averaged_is_refused_in_one_line() -> None:
    first, second = repeats(2, 1)
    other = replace(second, freq_hz=FREQ_HZ * 1.001)
    with pytest.raises(SweepError, match=r"^B\.csv: point 1 is at 10\.01 Hz, but that of A\.csv at 10 Hz; repeats"):
        average_repeats([first, other])
    fewer = Sweep(freq_hz=FREQ_HZ[:-1], gain=second.gain[:-1], origin=second.origin)
    with pytest.raises(SweepError, match=r"^B\.csv: 280 points, but A\.csv has 281; repeats have the same frequencies"):
        average_repeats([first, fewer])
    with pytest.raises(SweepError, match=r"^B\.csv: its sign is inverted, that of A\.csv as-read; .* give --sign"):
        average_repeats([replace(first, sign=Sign.AS_READ), replace(second, sign=Sign.INVERTED)])
    with pytest.raises(SweepError, match=r"^B\.csv: holds the very numbers of A\.csv, so it is no repeat"):
        average_repeats([first, replace(first, origin=second.origin)])
    with pytest.raises(SweepError, match=r"^B\.csv: loop gain is exactly -1 at 10 Hz"):
        average_repeats([first, replace(second, gain=np.where(FREQ_HZ == 10.0, -1.0, second.gain))])
    gone = tuple(LeftOut(f_hz=f, gain=1 + 0j, reason="") for f in FREQ_HZ.tolist())
    with pytest.raises(SweepError, match=r"^A\.csv: no frequency is in all repeats"):
        average_repeats([first, replace(second, left_out=gone)])
    # 1/(1 + T) is 0.5 in one and −0.5 in the other.
    cancelling = [replace(first, gain=np.full(281, 1.0)), replace(second, gain=np.full(281, -3.0))]
    with pytest.raises(SweepError, match=r"^A\.csv: the repeats cancel"):
        average_repeats(cancelling)
    with pytest.raises(UsageError, match="takes one sweep or more"):
        average_repeats([])
