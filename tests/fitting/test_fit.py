"""The fit of a whole sweep: exact data, data without the answer, refusals, and the result as an object."""

from __future__ import annotations

import copy
import pickle
from dataclasses import FrozenInstanceError, replace

import numpy as np
import pytest
from bench_loops import FREQ_HZ, NOISE, STANDARD, Loop
from scipy import signal

from fitamp.amplifier import Elements
from fitamp.errors import FitError
from fitamp.estimate import Estimate, Known
from fitamp.fitting import DelayPrior, FarPolePrior, LoopFit, WarningCode, ZeroPlace, fit_sweep
from fitamp.sweep import NoiseLevels, Origin, Sweep
from fitamp.transfer import Transfer

# Zero time in units of 1/ω2: right, left, far left, none.
RIGHT, LEFT, NEAR, NONE = -0.5, 0.5, 3.0, 0.0
EXACT = [
    (1.0, 100e3, RIGHT),
    (1.0, 1e6, LEFT),
    (1.0, 10e6, NONE),
    (100.0, 1e6, NEAR),
    (100.0, 10e6, RIGHT),
    (100.0, 100e6, LEFT),
    (1.2e3, 100e3, NONE),
    (1.2e3, 1e6, RIGHT),
    (1.2e3, 58e6, NEAR),
    (1.2e3, 100e6, NONE),
    (10e3, 100e3, RIGHT),
    (10e3, 1e6, LEFT),
    (10e3, 10e6, NONE),
    (10e3, 58e6, RIGHT),
]
PAIRS = [(1e6 + 3e6j, RIGHT), (1e6 + 3e6j, LEFT), (1e3 + 10e3j, NONE), (10e6 + 5e6j, NEAR)]


def in_ci95(estimate: Estimate, truth: float) -> bool:
    low, high = estimate.ci95
    return (low is None or low <= truth) and (high is None or truth <= high)


def codes(fit: LoopFit) -> set[WarningCode]:
    return {warning.code for warning in fit.warnings}


def check_exact(loop: Loop, place: ZeroPlace) -> None:
    fit = fit_sweep(loop.exact())
    poles = sorted((-pole.value_hz for pole in fit.poles), key=lambda pole: (abs(pole), -pole.imag))
    truth = sorted((loop.pole1_hz, loop.pole2_hz), key=lambda pole: (abs(pole), -pole.imag))
    assert poles == pytest.approx(truth, rel=1e-6)
    scale_s = abs(loop.zero_time_s) or 1 / (2 * np.pi * abs(loop.pole2_hz))
    assert fit.parameters.zero_time_s.value == pytest.approx(loop.zero_time_s, abs=1e-6 * scale_s)
    assert fit.parameters.dc_gain.value == pytest.approx(loop.dc_gain, rel=1e-6)
    assert all(
        root.covariance is not None and np.sqrt(np.trace(root.covariance)) < 1e-6 * abs(root.value_hz)
        for root in fit.poles
    )
    assert fit.adequacy.adequate
    # Without a zero the sweep alone cannot exclude a lag that makes up for one: to say nothing is right too.
    assert fit.zero.half_plane in ({place, ZeroPlace.UNDECIDED} if place is ZeroPlace.INFINITY else {place})
    # A crossover above the band is a fact of some of these loops.
    assert codes(fit) <= {WarningCode.LAG_AMBIGUITY, WarningCode.CROSSOVER_OUTSIDE_BAND, WarningCode.NO_CROSSOVER}


def place_of(share: float) -> ZeroPlace:
    return ZeroPlace.LEFT if share > 0 else ZeroPlace.RIGHT if share < 0 else ZeroPlace.INFINITY


@pytest.mark.parametrize(("pole1_hz", "pole2_hz", "share"), EXACT)
def test_exact_sweeps_give_their_roots_back(pole1_hz: float, pole2_hz: float, share: float) -> None:
    loop = Loop(pole1_hz=pole1_hz, pole2_hz=pole2_hz, zero_time_s=share / (2 * np.pi * pole2_hz))
    check_exact(loop, place_of(share))


@pytest.mark.parametrize(("pole_hz", "share"), PAIRS)
def test_exact_sweeps_with_a_pair_give_their_roots_back(pole_hz: complex, share: float) -> None:
    loop = Loop(
        dc_gain=1e3,
        pole1_hz=pole_hz,
        pole2_hz=pole_hz.conjugate(),
        zero_time_s=share / (2 * np.pi * abs(pole_hz)),
    )
    check_exact(loop, place_of(share))


def test_response_is_that_of_scipy_for_the_same_roots() -> None:
    fit = fit_sweep(STANDARD.exact())
    roots = [2 * np.pi * np.array([root.value_hz for root in found]) for found in (fit.zeros, fit.poles)]
    gain = STANDARD.dc_gain * np.prod(-roots[1]).real / np.prod(-roots[0]).real
    _, expected = signal.freqresp((roots[0], roots[1], gain), 2 * np.pi * FREQ_HZ)
    assert fit.evaluate(FREQ_HZ) == pytest.approx(expected, rel=1e-9)


def test_complex_pair_with_noise_has_a_covariance_of_its_parts() -> None:
    loop = Loop(dc_gain=1e3, pole1_hz=1e6 + 3e6j, pole2_hz=1e6 - 3e6j, zero_time_s=1 / (2 * np.pi * 5e6))
    errors, spreads = [], []
    for seed in range(15):
        fit = fit_sweep(loop.measured(seed))
        upper, lower = sorted(fit.poles, key=lambda root: -root.value_hz.imag)
        assert upper.value_hz == lower.value_hz.conjugate()
        assert upper.covariance is not None
        assert lower.covariance is not None
        # A conjugate errs alike in the real part and oppositely in the imaginary one.
        assert lower.covariance == pytest.approx(upper.covariance * [[1, -1], [-1, 1]], rel=1e-3, abs=1e-3)
        miss = upper.value_hz - (-1e6 + 3e6j)
        errors.append([miss.real, miss.imag])
        spreads.append(upper.covariance)
    spread = np.mean(spreads, axis=0)
    assert np.sqrt(np.diag(spread)) == pytest.approx([5e3, 5e3], rel=0.9)  # some parts in a thousand: not wide, not 0
    # The squared length of an error in units of its covariance is chi-square with 2 degrees of freedom; the mean of 15
    # has the mean 2 and the standard deviation 0.52.
    lengths = [np.array(e) @ np.linalg.inv(c) @ np.array(e) for e, c in zip(errors, spreads, strict=True)]
    assert 0.8 < np.mean(lengths) < 3.5


# What the band cannot tell. Truth must lie inside the stated ends; 20 seeds at 95 % miss up to 4 with p = 0.997.
SEEDS = range(20)


def test_a_band_that_starts_above_pole_1_gives_bounds_and_the_gain_bandwidth() -> None:
    freq_hz = np.geomspace(10e6, 400e6, 81)
    fits = [fit_sweep(STANDARD.measured(seed, freq_hz=freq_hz)) for seed in SEEDS]
    assert sum(in_ci95(fit.parameters.pole1_hz, 1.2e3) for fit in fits) >= 16
    assert sum(in_ci95(fit.parameters.dc_gain, STANDARD.dc_gain) for fit in fits) >= 16
    bounded = [fit for fit in fits if fit.parameters.pole1_hz.known is Known.UPPER_BOUND]
    assert len(bounded) >= 10
    for fit in bounded:
        assert fit.parameters.dc_gain.known is Known.LOWER_BOUND
        assert fit.parameters.dc_gain.value is None
        assert WarningCode.POLE1_BELOW_BAND in codes(fit)
    for fit in fits:
        assert fit.parameters.gain_bandwidth_hz.value == pytest.approx(STANDARD.dc_gain * 1.2e3, rel=1e-3)
        assert fit.zero.half_plane is ZeroPlace.LEFT


@pytest.mark.parametrize(("top_hz", "seeds", "at_least"), [(300e3, range(3), 2), (2e6, range(6), 4), (5e6, SEEDS, 16)])
def test_a_band_that_ends_below_pole_2_gives_a_bound_and_the_split(top_hz: float, seeds: range, at_least: int) -> None:
    freq_hz = np.geomspace(100.0, top_hz, 81)
    fits = [fit_sweep(STANDARD.measured(seed, freq_hz=freq_hz)) for seed in seeds]
    split_s = STANDARD.zero_time_s - 1 / (2 * np.pi * 58e6)
    assert sum(in_ci95(fit.parameters.pole2_hz, 58e6) for fit in fits) >= at_least
    assert sum(in_ci95(fit.parameters.zero_time_s, STANDARD.zero_time_s) for fit in fits) >= at_least
    assert sum(in_ci95(fit.parameters.zero_pole2_split_s, split_s) for fit in fits) >= at_least
    for fit in fits:
        pole2 = fit.parameters.pole2_hz
        if pole2.value is None:
            assert WarningCode.POLE2_ABOVE_BAND in codes(fit)
        else:
            # A number is stated only with an error that keeps it near.
            assert pole2.stderr is not None
            assert pole2.stderr < pole2.value
            assert 58e6 / 5 < pole2.value < 58e6 * 5
        assert fit.zero.half_plane is not ZeroPlace.RIGHT
        assert fit.parameters.zero_pole2_split_s.is_measured
    if top_hz < 5e6:
        assert sum(fit.parameters.pole2_hz.value is None for fit in fits) >= at_least // 2


def test_a_zero_on_pole_2_leaves_only_their_split() -> None:
    loop = replace(STANDARD, zero_time_s=1 / (2 * np.pi * 58e6))
    fits = [fit_sweep(loop.measured(seed)) for seed in range(4)]
    for fit in fits:
        split = fit.parameters.zero_pole2_split_s
        assert split.stderr is not None
        assert split.value == pytest.approx(0.0, abs=4 * split.stderr)
        assert split.stderr < 2e-2 * loop.zero_time_s
        assert fit.zero.half_plane is not ZeroPlace.RIGHT
    assert sum(in_ci95(fit.parameters.zero_pole2_split_s, 0.0) for fit in fits) >= 3
    assert all(in_ci95(fit.parameters.zero_time_s, loop.zero_time_s) for fit in fits)
    assert all(in_ci95(fit.parameters.pole2_hz, 58e6) for fit in fits)
    assert sum(fit.parameters.pole2_hz.value is None for fit in fits) >= 2


def test_a_sweep_of_one_pole_says_so_without_inventing_a_second() -> None:
    fit = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=np.asarray(1e4 / (1 + 1j * FREQ_HZ / 100), dtype=complex)))
    assert fit.parameters.pole1_hz.value == pytest.approx(100, rel=1e-9)
    assert fit.parameters.pole2_hz.value is None
    assert fit.parameters.gain_bandwidth_hz.value == pytest.approx(1e6, rel=1e-6)
    assert fit.zero.half_plane is ZeroPlace.UNDECIDED


def test_an_integrator_has_a_gain_bandwidth_and_no_pole_1() -> None:
    freq_hz = np.geomspace(10e3, 100e6, 120)
    loop = replace(STANDARD, pole1_hz=1e-4, dc_gain=1e11)
    fit = fit_sweep(loop.measured(1, freq_hz=freq_hz))
    assert fit.parameters.gain_bandwidth_hz.value == pytest.approx(1e7, rel=1e-3)
    assert fit.parameters.pole1_hz.known is Known.UPPER_BOUND
    assert fit.parameters.dc_gain.known is Known.LOWER_BOUND
    assert in_ci95(fit.parameters.pole1_hz, 1e-4)
    assert fit.parameters.pole2_hz.value == pytest.approx(58e6, rel=0.01)


# A third pole or a delay at n = 1 looks like a zero in the right half plane (exact circuit: no zero at all).
N1 = Elements(gm1=200e-6, R1=1e6, C1=0.1e-12, gm2=1.6e-3, R2=100e3, CL=5e-12, Cc=2e-12, Rz=1 / 1.6e-3)


@pytest.mark.parametrize("seed", range(5))
def test_a_nulled_stage_is_not_called_right_half_plane_for_its_third_pole(seed: int) -> None:
    exact = N1.transfer()
    assert exact.zeros_hz == ()
    noisy = _through_the_bench(exact, seed)
    fit = fit_sweep(noisy)
    assert fit.zero.half_plane not in {ZeroPlace.RIGHT, ZeroPlace.LEFT}
    assert WarningCode.LAG_AMBIGUITY in codes(fit)
    # The plain number is far on the right by its own error; that is why the statement must not follow it.
    zero_time = fit.parameters.zero_time_s
    assert zero_time.value is not None
    assert zero_time.stderr is not None
    assert zero_time.value < -10 * zero_time.stderr


def test_with_the_third_pole_expected_the_nulled_stage_has_its_zero_at_infinity() -> None:
    third_s = 1 / (2 * np.pi * abs(N1.transfer().poles_hz[2]))
    prior = FarPolePrior(intercept_s=third_s, sd_s=0.1 * third_s)
    fit = fit_sweep(_through_the_bench(N1.transfer(), 1), far_pole=prior, delay=DelayPrior())
    assert fit.zero.half_plane is ZeroPlace.INFINITY
    assert in_ci95(fit.parameters.zero_time_s, 0.0)
    assert fit.parameters.far_pole_s.value == pytest.approx(third_s, rel=0.3)


def test_an_unknown_delay_is_not_called_a_zero_at_n_1() -> None:
    stated = 0
    for seed in range(6):
        fit = fit_sweep(replace(STANDARD, zero_time_s=0.0, delay_s=0.5e-9).measured(seed))
        stated += fit.zero.half_plane in {ZeroPlace.RIGHT, ZeroPlace.LEFT}
        assert WarningCode.LAG_FITTED in codes(fit)
        assert in_ci95(fit.parameters.zero_time_s, 0.0)
        assert in_ci95(fit.parameters.delay_s, 0.5e-9)
    # Said at 95 %: one in six may be wrong by chance (p = 0.97); by curvature alone it is half of them.
    assert stated <= 1


def test_a_known_delay_leaves_the_zero_where_it_is() -> None:
    loop = replace(STANDARD, delay_s=0.5e-9)
    fit = fit_sweep(loop.measured(4), delay=DelayPrior(mean_s=0.5e-9, sd_s=0.01e-9), far_pole=FarPolePrior())
    assert in_ci95(fit.parameters.zero_time_s, loop.zero_time_s)
    assert fit.zero.half_plane is ZeroPlace.LEFT
    assert WarningCode.LAG_AMBIGUITY not in codes(fit)
    assert fit.evaluate(FREQ_HZ[:200]) == pytest.approx(loop.gain(FREQ_HZ[:200]), rel=0.05)
    assert fit.response.delay_s == 0


def test_a_known_factor_is_taken_out_of_the_roots() -> None:
    mirror = Transfer(dc_gain=1.0, poles_hz=(-90e6,), zeros_hz=(-180e6,))
    sweep = Sweep(freq_hz=FREQ_HZ, gain=STANDARD.gain() * mirror.evaluate(FREQ_HZ))
    fit = fit_sweep(sweep, known=mirror)
    assert sorted(abs(root.value_hz) for root in fit.poles) == pytest.approx([1.2e3, 58e6], rel=1e-6)
    assert fit.parameters.zero_time_s.value == pytest.approx(STANDARD.zero_time_s, rel=1e-6)


def _through_the_bench(exact: Transfer, seed: int) -> Sweep:
    """The standard bench's reading of a response that is not a `Loop`."""
    reading = STANDARD.measured(seed).gain / STANDARD.gain()
    # The scatter of the standard loop, whose size along frequency is nearly the same, carried over as a ratio.
    return Sweep(freq_hz=FREQ_HZ, gain=exact.evaluate(FREQ_HZ) * reading)


def test_given_noise_levels_are_used_and_those_of_the_sweep_without_them() -> None:
    sweep = STANDARD.measured(1)
    assert fit_sweep(sweep).noise.source == "estimated from the sweep"
    assert fit_sweep(sweep, noise=NOISE).noise == NOISE
    doubled = NoiseLevels(error_channel=4e-5, return_channel=4e-5, relative=2e-3)
    with_own = replace(sweep, noise=doubled)
    assert fit_sweep(with_own).noise == doubled
    assert fit_sweep(with_own, noise=NOISE).noise == NOISE
    # Twice the noise, twice the error, for the estimate itself does not move.
    once, twice = fit_sweep(with_own, noise=NOISE), fit_sweep(with_own)
    for (_, one), (_, two) in zip(once.parameters.items()[:5], twice.parameters.items()[:5], strict=True):
        assert one.stderr is not None
        assert two.stderr == pytest.approx(2 * one.stderr, rel=1e-6)
        assert two.value == pytest.approx(one.value, rel=1e-9)


FEW_HZ = np.geomspace(10.0, 100e6, 81)
NONSENSE = {
    "white noise": np.random.default_rng(1).standard_normal((2, 81)).T @ [1, 1j],
    "flat": np.full(81, 10 + 0j),
    "flat with scatter": 10 + 0.01 * np.random.default_rng(2).standard_normal((2, 81)).T @ [1, 1j],
    "nothing": np.zeros(81, dtype=complex),
    "minus one": np.full(81, -1 + 0j),
    "wrong sign": -STANDARD.gain(FEW_HZ),
    "delay only": 10 * np.exp(-2e-8j * np.pi * FEW_HZ),
}


@pytest.mark.parametrize("name", NONSENSE)
def test_nonsense_is_refused_in_one_line(name: str) -> None:
    sweep = Sweep(freq_hz=FEW_HZ, gain=NONSENSE[name], origin=Origin(file="odd.csv"))
    with pytest.raises(FitError, match=r"^odd\.csv: ") as caught:
        fit_sweep(sweep)
    message = str(caught.value)
    assert "\n" not in message
    assert "; " in message  # what to do


def test_too_few_points_are_refused() -> None:
    sweep = STANDARD.exact(np.geomspace(10.0, 100e6, 11))
    with pytest.raises(FitError, match="11 usable points, a fit needs 12; take a denser or wider sweep"):
        fit_sweep(sweep)


def test_twelve_points_are_enough() -> None:
    freq_hz = np.geomspace(10.0, 100e6, 12)
    fit = fit_sweep(STANDARD.measured(1, freq_hz=freq_hz))
    assert fit.zero.half_plane is ZeroPlace.LEFT
    assert fit.parameters.pole2_hz.value == pytest.approx(58e6, rel=0.02)
    # With noise from so few points the interval is wider than ±1.96 standard errors (Student's t).
    assert fit.quantile > 2.3


def test_result_is_frozen_and_survives_pickling_and_copying() -> None:
    fit = fit_sweep(STANDARD.measured(1))
    with pytest.raises(FrozenInstanceError, match="quantile"):
        fit.quantile = 1.0  # type: ignore[misc]  # the point of the test
    with pytest.raises(ValueError, match="read-only"):
        fit.solution.values[0] = 0.0
    for twin in (pickle.loads(pickle.dumps(fit)), copy.deepcopy(fit)):
        assert twin.parameters == fit.parameters
        assert twin.response == fit.response
        assert twin.zero == fit.zero
        assert twin.sweep == fit.sweep
        assert twin.warnings == fit.warnings
        assert np.array_equal(twin.covariance, fit.covariance)
        assert str(twin) == str(fit)


def test_text_has_every_quantity_and_html_is_inert() -> None:
    hostile = "<script>alert(1)</script>&.csv"
    sweep = replace(STANDARD.measured(1), origin=Origin(file=hostile))
    fit = fit_sweep(sweep)
    text = str(fit)
    for name, _ in (*fit.parameters.items(), *fit.margins.items()):
        assert name in text
    assert hostile in text
    assert repr(fit) == text
    page = fit._repr_html_()
    assert "<script" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;&amp;.csv" in page


def test_a_zero_on_pole_2_leaves_the_split_and_places_neither() -> None:
    """A single-pole response: noise draws the cancelling pair anywhere (seeds 1-12 of them did), the split holds."""
    true = Transfer(dc_gain=10**4.1, poles_hz=(-1.2e3, -58e6), zeros_hz=(-58e6,))
    for seed in range(1, 13):
        fit = fit_sweep(_through_the_bench(true, seed), far_pole=FarPolePrior(), delay=DelayPrior())
        assert fit.parameters.pole2_hz.known is not Known.MEASURED
        split = fit.parameters.zero_pole2_split_s
        assert split.value is not None
        assert split.stderr is not None
        # Of the pair as seen from the top of the band: picoseconds, where pole 2 takes 2.7 ns.
        assert abs(split.value) < 4.5 * split.stderr + 1e-14
        assert split.stderr < 5e-12
