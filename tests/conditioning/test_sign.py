"""The sign of the read-out: what the band shows, and when it has to be asked for."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.sign import settle_sign
from fitamp.errors import SweepError
from fitamp.sweep import LeftOut, Origin, Sign, Sweep

TWO_PI = 2 * np.pi


def loop_gain(
    freq_hz: FloatArray, *, dc_gain: float = 1e4, pole2_hz: float = 5e7, zero_time_s: float = 1e-9, delay_s: float = 0.0
) -> ComplexArray:
    """Textbook T with a gain-bandwidth of 10 MHz: its sign is known because it is built positive at DC."""
    s = 1j * TWO_PI * freq_hz
    poles = (1 + s * dc_gain / (TWO_PI * 1e7)) * (1 + s / (TWO_PI * pole2_hz))
    return np.asarray(dc_gain * (1 + s * zero_time_s) / poles * np.exp(-s * delay_s))


def sweep_of(freq_hz: FloatArray, gain: ComplexArray) -> Sweep:
    return Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file="bench.csv"))


@pytest.mark.parametrize(
    "start_hz", [1.0, 1e3, 1e5, 1e6], ids=["flat part", "at pole 1", "integrator", "near crossover"]
)
@pytest.mark.parametrize("pole2_hz", [5e5, 5e6, 5e7])
@pytest.mark.parametrize("zero_time_s", [2e-8, 1e-9, 0.0, -2e-9])
@pytest.mark.parametrize("count", [15, 101])
def test_sign_is_recognised_wherever_the_band_starts(
    start_hz: float, pole2_hz: float, zero_time_s: float, count: int
) -> None:
    freq_hz = np.geomspace(start_hz, 1e8, count)
    gain = loop_gain(freq_hz, pole2_hz=pole2_hz, zero_time_s=zero_time_s, delay_s=1e-9)
    if start_hz == 1e6 and (pole2_hz == 5e5 or count == 15):
        freq_hz, gain = freq_hz[:4], gain[:4]  # only some points are above crossover; they have to do
    as_read = settle_sign(sweep_of(freq_hz, gain))
    assert as_read.sign is Sign.AS_READ
    assert np.array_equal(as_read.gain, gain)
    inverted = settle_sign(sweep_of(freq_hz, -gain))
    assert inverted.sign is Sign.INVERTED
    assert np.array_equal(inverted.gain, gain)


def test_phase_decides_on_the_integrator_slope_as_bode_says() -> None:
    # Bode 1945 (from memory): slope -1 goes with -90 degrees; the same magnitude at +90 degrees is inverted.
    freq_hz = np.geomspace(1e3, 1e6, 31)
    for phase_deg, sign in ((-90, Sign.AS_READ), (-60, Sign.AS_READ), (-140, Sign.AS_READ), (90, Sign.INVERTED)):
        gain = 1e7 / freq_hz * np.exp(1j * np.radians(phase_deg))
        assert settle_sign(sweep_of(freq_hz, gain)).sign is sign


def test_double_integrator_at_180_degrees_is_not_taken_for_an_inversion() -> None:
    freq_hz = np.geomspace(1e3, 1e6, 31)
    assert settle_sign(sweep_of(freq_hz, (-((1e7 / freq_hz) ** 2)).astype(complex))).sign is Sign.AS_READ


@pytest.mark.parametrize("phase_deg", [-180, -170, -10, 0])
def test_phase_between_the_two_answers_is_asked_for(phase_deg: float) -> None:
    freq_hz = np.geomspace(1e3, 1e6, 31)
    gain = 1e7 / freq_hz * np.exp(1j * np.radians(phase_deg))
    apart = 80 if phase_deg in (-170, -10) else 90
    seen = (
        f"from 1.000 kHz to 31.62 kHz the phase is {apart}° away from what the slope of the magnitude asks for (median)"
    )
    whole = f"bench.csv: cannot tell whether the sweep holds T or -T: {seen}; give --sign as-read or --sign inverted"
    with pytest.raises(SweepError, match=f"^{re.escape(whole)}$"):
        settle_sign(sweep_of(freq_hz, gain))


@pytest.mark.parametrize(
    ("gain", "reason"),
    [
        (np.append([2.0, 1.5], np.full(19, 0.5)), "its magnitude exceeds 1 at fewer than three points"),
        (np.zeros(21), "its magnitude exceeds 1 at fewer than three points"),
        (np.tile([1e4, 1e1, 1e3], 7), "its magnitude scatters too much"),
        (np.tile([100, -100, 100], 7), "its phase scatters too much"),
    ],
)
def test_band_that_shows_nothing_is_asked_for(gain: ComplexArray, reason: str) -> None:
    with pytest.raises(SweepError, match=reason):
        settle_sign(sweep_of(np.geomspace(1, 1e8, 21), gain.astype(complex)))


def test_magnitude_that_never_exceeds_1_may_be_no_loop_gain() -> None:
    sweep = replace(
        sweep_of(np.geomspace(1, 1e8, 21), np.full(21, 0.01 - 0j)), origin=Origin(file="a.s2p", trace="S12")
    )
    whole = (
        "a.s2p: the magnitude of S12 never exceeds 1 (-40.0 dB at most), which loop gain does below crossover; is it "
        "loop gain? if so, give --sign as-read or --sign inverted; if not, choose another trace or column"
    )
    with pytest.raises(SweepError, match=f"^{re.escape(whole)}$"):
        settle_sign(sweep)
    assert settle_sign(sweep, Sign.AS_READ).sign is Sign.AS_READ


def receiver_ratio(
    freq_hz: FloatArray, t: ComplexArray, *, error_channel: float, seed: int, crosstalk: complex = 0.0
) -> ComplexArray:
    """T as the ratio of two receivers at drive 1, the error receiver with noise and crosstalk of this size."""
    rng = np.random.default_rng(seed)
    noise = error_channel / np.sqrt(2) * (rng.normal(size=len(freq_hz)) + 1j * rng.normal(size=len(freq_hz)))
    return np.asarray(t / (1 + t) / (1 / (1 + t) + noise + crosstalk))


@pytest.mark.parametrize("seed", range(8))
def test_steady_middle_decides_over_a_low_end_of_noise(seed: int) -> None:
    # Noise three times the error signal over the flat part: the lowest two decades have no phase left.
    freq_hz = np.geomspace(20, 2e8, 121)
    gain = receiver_ratio(freq_hz, loop_gain(freq_hz, zero_time_s=-1e-9), error_channel=3e-4, seed=seed)
    assert np.ptp(np.angle(gain[:20])) > np.pi
    assert settle_sign(sweep_of(freq_hz, gain)).sign is Sign.AS_READ
    assert settle_sign(sweep_of(freq_hz, -gain)).sign is Sign.INVERTED


def test_crosstalk_into_the_error_receiver_never_turns_the_sign() -> None:
    # It makes a flat low end of any phase, also of 180 degrees; the falling part then says otherwise.
    freq_hz = np.geomspace(20, 2e8, 121)
    t = loop_gain(freq_hz, dc_gain=1e5)
    signs = []
    for degrees in range(0, 360, 15):
        crosstalk = 1e-3 * np.exp(1j * np.radians(degrees))
        gain = receiver_ratio(freq_hz, t, error_channel=1e-5, seed=7, crosstalk=crosstalk)
        signs.append(sign_or_none(sweep_of(freq_hz, gain)))
    assert Sign.INVERTED not in signs
    assert {Sign.AS_READ, None} == set(signs)


def sign_or_none(sweep: Sweep) -> Sign | None:
    try:
        return settle_sign(sweep).sign
    except SweepError:
        return None


def test_receiver_noise_never_turns_the_sign() -> None:
    # Ratio of two noisy receivers (drive 1), noise up to three times the error signal at the low end: T is
    # meaningless there, so the answer may be to ask, but it must not be wrong.
    rng = np.random.default_rng(7)
    settled = 0
    for dc_gain in (1e3, 1e4, 1e5, 1e6):
        for count in (7, 15, 61, 201):
            for _ in range(6):
                freq_hz = np.geomspace(rng.choice([1.0, 10.0, 1e3]), 1e8, count)
                t = loop_gain(freq_hz, dc_gain=dc_gain)
                noise = 2e-5 * (rng.normal(size=(2, count)) + 1j * rng.normal(size=(2, count)))
                gain = (t / (1 + t) + noise[0]) / (1 / (1 + t) + noise[1])
                sign = sign_or_none(sweep_of(freq_hz, -gain))
                assert sign is not Sign.AS_READ
                settled += sign is Sign.INVERTED
    assert settled >= 0.75 * 4 * 4 * 6


def test_some_outliers_do_not_turn_the_sign() -> None:
    freq_hz = np.geomspace(10, 1e8, 71)
    gain = loop_gain(freq_hz)
    gain[[3, 20]] *= -1
    assert settle_sign(sweep_of(freq_hz, gain)).sign is Sign.AS_READ


def test_decision_says_what_was_seen() -> None:
    freq_hz = np.geomspace(10, 1e8, 71)
    decision = settle_sign(sweep_of(freq_hz, -loop_gain(freq_hz))).decisions[-1]
    assert (decision.topic, decision.choice) == ("sign", "inverted")
    assert decision.reason.startswith("from 10.00 Hz to ")
    assert "the phase is 17" in decision.reason  # 170-odd degrees off
    assert decision.reason.endswith("away from what the slope of the magnitude asks for (median)")


def test_given_sign_is_taken_and_a_contradiction_stated() -> None:
    freq_hz = np.geomspace(10, 1e8, 71)
    sweep = sweep_of(freq_hz, loop_gain(freq_hz))
    same = settle_sign(sweep, Sign.AS_READ)
    assert (same.sign, same.decisions[-1].reason) == (Sign.AS_READ, "as given")
    turned = settle_sign(sweep, Sign.INVERTED)
    assert turned.sign is Sign.INVERTED
    assert np.array_equal(turned.gain, -sweep.gain)
    assert turned.decisions[-1].reason.startswith("as given; the band by itself says as-read: ")
    flat = sweep_of(freq_hz, np.full(71, 0.1 + 0j))
    assert settle_sign(flat, Sign.INVERTED).decisions[-1].reason == "as given"


def test_points_left_out_are_turned_with_the_rest() -> None:
    freq_hz = np.geomspace(10, 1e8, 71)
    sweep = Sweep(
        freq_hz=freq_hz, gain=-loop_gain(freq_hz), left_out=(LeftOut(f_hz=0.0, gain=-1e4 + 0j, reason="0 Hz"),)
    )
    assert settle_sign(sweep).left_out == (LeftOut(f_hz=0.0, gain=1e4 + 0j, reason="0 Hz"),)


def test_settled_or_open_sign_stays_unless_told_otherwise() -> None:
    freq_hz = np.geomspace(10, 1e8, 71)
    read = sweep_of(freq_hz, -loop_gain(freq_hz))
    assert settle_sign(read, Sign.UNKNOWN) is read
    settled = settle_sign(read)
    assert settle_sign(settled) is settled
    assert settle_sign(settled, Sign.INVERTED) is settled
    back = settle_sign(settled, Sign.AS_READ)
    assert back.sign is Sign.AS_READ
    assert np.array_equal(back.gain, read.gain)
    again = settle_sign(back, Sign.INVERTED)
    assert np.array_equal(again.gain, settled.gain)
