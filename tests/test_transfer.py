"""Transfer functions: roots, polynomials, evaluation."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest
from numpy.testing import assert_allclose
from scipy import signal

from fitamp.transfer import Transfer

TWO_PI = 2 * math.pi


def pair(magnitude_hz: float, angle_rad: float) -> tuple[complex, complex]:
    root = magnitude_hz * cmath.exp(1j * angle_rad)
    return root, root.conjugate()


# Gain, poles and zeros in Hz: one to seven poles, pairs, right-half-plane roots, spreads of up to eight decades.
CASES = [
    Transfer(dc_gain=1e4, poles_hz=(-100.0,)),
    Transfer(dc_gain=1e4, poles_hz=(-100.0, -2.2e6), zeros_hz=(1e7,)),
    Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6), zeros_hz=(-110e6,)),
    Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6, -0.9e9), zeros_hz=(-110e6,)),
    Transfer(dc_gain=1e5, poles_hz=(-10.0, -1e6, -1e9), zeros_hz=(-1.01e6,)),
    Transfer(dc_gain=1e3, poles_hz=(-1e3, *pair(1e6, 2.0))),
    Transfer(dc_gain=50.0, poles_hz=(*pair(1e5, 1.6), *pair(1e8, 1.7)), zeros_hz=pair(2e6, 1.2)),
    Transfer(dc_gain=-3.0, poles_hz=(1e3, -1e5)),
    Transfer(dc_gain=1e6, poles_hz=(-1.0, -1e2, -1e4, -1e6, -1e8), zeros_hz=(-3e4, 5e7)),
    Transfer(dc_gain=80.0, poles_hz=(-1e3, -2e3, -4e3, -8e3)),
    Transfer(dc_gain=2.0, poles_hz=(-1e2, *pair(3e3, 2.5), *pair(4e5, 1.8), *pair(1e10, 3.0)), zeros_hz=(-1e4,)),
    Transfer(dc_gain=1e4, poles_hz=(-100.0, -2.2e6), zeros_hz=(1e7,), delay_s=1e-9),
]


@pytest.mark.parametrize("response", CASES, ids=str)
def test_polynomials_and_back_keep_every_root_to_1e_12(response: Transfer) -> None:
    numerator, denominator = response.polynomials()
    again = Transfer.from_polynomials(numerator, denominator, delay_s=response.delay_s)
    assert again.dc_gain == response.dc_gain
    assert again.delay_s == response.delay_s
    assert_allclose(again.poles_hz, response.poles_hz, rtol=1e-12)
    assert_allclose(again.zeros_hz, response.zeros_hz, rtol=1e-12)
    for root in again.poles_hz + again.zeros_hz:
        assert root.conjugate() in again.poles_hz + again.zeros_hz


@pytest.mark.parametrize("response", CASES, ids=str)
def test_response_agrees_with_scipy(response: Transfer) -> None:
    # Second opinion: scipy.signal.freqs_zpk, which has s-plane roots in rad/s and the gain at infinity.
    freq_hz = np.logspace(0, 10, 101)
    zeros, poles = np.array(response.zeros_hz) * TWO_PI, np.array(response.poles_hz) * TWO_PI
    gain = response.dc_gain * np.prod(-poles) / np.prod(-zeros)
    _, expected = signal.freqs_zpk(zeros, poles, gain.real, worN=TWO_PI * freq_hz)
    expected = expected * np.exp(-1j * TWO_PI * freq_hz * response.delay_s)
    assert_allclose(response.evaluate(freq_hz), expected, rtol=1e-11)


@pytest.mark.parametrize("response", CASES, ids=str)
def test_polynomials_agree_with_scipy(response: Transfer) -> None:
    zeros, poles = np.array(response.zeros_hz) * TWO_PI, np.array(response.poles_hz) * TWO_PI
    tops, bottoms = signal.zpk2tf(zeros, poles, 1.0)
    numerator, denominator = response.polynomials()
    assert_allclose(numerator, response.dc_gain * np.real(tops)[::-1] / np.real(tops)[-1], rtol=1e-10)
    assert_allclose(denominator, np.real(bottoms)[::-1] / np.real(bottoms)[-1], rtol=1e-10)


def test_evaluation_keeps_the_shape() -> None:
    response = CASES[1]
    assert response.evaluate(1e3).shape == ()
    assert response.evaluate([1e3]).shape == (1,)
    assert response.evaluate(np.full((2, 3), 1e3)).shape == (2, 3)
    assert response.evaluate(0.0) == response.dc_gain


def test_second_pole_at_2p2_gbw_leaves_60_degrees() -> None:
    # Allen & Holberg, CMOS Analog Circuit Design, 2nd ed., sec. 6.2, from memory: zero at 10 GBW in the right half
    # plane, second pole at 2.2 GBW -> 60 deg. The book takes crossover at GBW and rounds 2.2; unrounded it is 59.85.
    response = Transfer(dc_gain=1e4, poles_hz=(-100.0, -2.2e6), zeros_hz=(10e6,))
    assert response.gain_bandwidth_hz == pytest.approx(1e6)
    assert 180 + np.degrees(np.angle(response.evaluate(1e6))) == pytest.approx(60.0, abs=0.5)


def test_zero_time_has_the_sign_of_the_half_plane() -> None:
    # By definition the zero of 1 + s·τ is s = −1/τ.
    left = Transfer(dc_gain=1.0, poles_hz=(-1.0,), zeros_hz=(-1e6,))
    right = Transfer(dc_gain=1.0, poles_hz=(-1.0,), zeros_hz=(1e6,))
    none = Transfer(dc_gain=1.0, poles_hz=(-1.0,))
    assert left.zero_time_s == pytest.approx(1 / (TWO_PI * 1e6))
    assert right.zero_time_s == -left.zero_time_s
    assert none.zero_time_s == 0
    both = left.cascade(right)
    assert both.zero_time_s == 0
    assert both.zeros_hz == (-1e6, 1e6)


def test_zero_time_is_the_numerator_coefficient_of_s() -> None:
    for response in CASES:
        numerator, _ = response.polynomials()
        slope = numerator[1] / numerator[0] if len(numerator) > 1 else 0.0
        assert response.zero_time_s == pytest.approx(slope, rel=1e-12, abs=1e-30)


def test_left_and_right_half_plane_zero_have_equal_magnitude_and_opposite_phase() -> None:
    # Fact of the trade (common practice).
    freq_hz = np.logspace(3, 9, 25)
    left = Transfer(dc_gain=1.0, poles_hz=(), zeros_hz=(-1e6,)).evaluate(freq_hz)
    right = Transfer(dc_gain=1.0, poles_hz=(), zeros_hz=(1e6,)).evaluate(freq_hz)
    assert_allclose(np.abs(left), np.abs(right), rtol=1e-15)
    assert_allclose(np.angle(left), -np.angle(right), rtol=1e-15)


def test_cascade_is_the_product() -> None:
    freq_hz = np.logspace(1, 9, 33)
    for other in CASES:
        product = CASES[-1].cascade(other)
        assert_allclose(product.evaluate(freq_hz), CASES[-1].evaluate(freq_hz) * other.evaluate(freq_hz), rtol=1e-13)


def test_roots_are_kept_nearest_the_origin_first() -> None:
    response = Transfer(dc_gain=1.0, poles_hz=(-1e6, *pair(1e3, -2.0), -5.0))
    assert response.poles_hz[0] == -5.0
    assert response.poles_hz[-1] == -1e6
    assert response.poles_hz[1].imag > 0
    assert response.poles_hz[2] == response.poles_hz[1].conjugate()


def test_text_names_gain_roots_and_side() -> None:
    response = Transfer(dc_gain=-1e4, poles_hz=(-1.2e3, *pair(58e6, 2 * math.pi / 3)), zeros_hz=(110e6,), delay_s=1e-9)
    assert str(response) == (
        "80.0 dB, inverting; pole 1.200 kHz; pole pair 58.00 MHz, Q 1; "
        "zero 110.0 MHz (right half plane); delay 1.000 ns"
    )


def test_zeros_at_the_end_of_a_polynomial_are_left_off() -> None:
    response = Transfer.from_polynomials([10.0, 0.0], [2.0, 1.0, 0.0])
    assert response.dc_gain == 5.0
    assert response.zeros_hz == ()
    assert_allclose(response.poles_hz, [-2 / TWO_PI])


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"dc_gain": math.nan, "poles_hz": (-1.0,)}, "DC gain must be finite"),
        ({"dc_gain": 0.0, "poles_hz": (-1.0,)}, "DC gain must be finite and not 0"),
        ({"dc_gain": 1.0, "poles_hz": (0.0,)}, "pole must be finite and not at the origin"),
        ({"dc_gain": 1.0, "poles_hz": (-1.0,), "zeros_hz": (math.inf,)}, "zero must be finite"),
        ({"dc_gain": 1.0, "poles_hz": (-1 + 1j,)}, "lacks its conjugate"),
        ({"dc_gain": 1.0, "poles_hz": (-1 - 1j,)}, "lacks its conjugate"),
        ({"dc_gain": 1.0, "poles_hz": (-1 - 1j, -1 + 1.001j)}, "lacks its conjugate"),
        ({"dc_gain": 1.0, "poles_hz": (-1.0,), "delay_s": -1e-9}, "delay must be 0 s or more"),
    ],
)
def test_what_is_no_transfer_function_is_refused(arguments: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Transfer(**arguments)  # type: ignore[arg-type]  # wrong values on purpose, by keyword


@pytest.mark.parametrize("faulty", [[], [0.0, 1.0], [1.0, math.nan], [[1.0], [2.0]]])
def test_what_is_no_polynomial_is_refused(faulty: list[float]) -> None:
    with pytest.raises(ValueError, match="numerator must be a row of finite coefficients"):
        Transfer.from_polynomials(faulty, [1.0, 1.0])
    with pytest.raises(ValueError, match="denominator must be a row of finite coefficients"):
        Transfer.from_polynomials([1.0], faulty)
