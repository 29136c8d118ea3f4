"""Margins, closed-loop poles and step response against textbooks, python-control and scipy."""

from __future__ import annotations

import math
import warnings
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy import linalg, optimize, signal

from fitamp.amplifier import Elements
from fitamp.closed_loop import step_error
from fitamp.margins import Margins, closed_loop_poles_hz, closed_loop_step, margins
from fitamp.transfer import Transfer

with warnings.catch_warnings():
    # Importing control pulls in matplotlib and others whose deprecations are not ours to judge.
    warnings.simplefilter("ignore")
    import control

TWO_PI = 2 * math.pi
AMPLIFIER = Elements(gm1=160e-6, R1=1e6, C1=0.15e-12, gm2=1.6e-3, R2=50e3, CL=5e-12, Cc=1.8e-12, Rz=1300.0)


def pair(magnitude_hz: float, quality: float) -> tuple[complex, complex]:
    """Return stable conjugate roots of a quality factor above 0.5."""
    damping = 1 / (2 * quality)
    root = magnitude_hz * complex(-damping, math.sqrt(1 - damping**2))
    return root, root.conjugate()


CASES = [
    Transfer(dc_gain=1e4, poles_hz=(-100.0,)),
    Transfer(dc_gain=1e4, poles_hz=(-100.0, -2.2e6), zeros_hz=(1e7,)),
    Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6, -0.9e9), zeros_hz=(-110e6,)),
    Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -12e6, -60e6), zeros_hz=(90e6,)),
    Transfer(dc_gain=1e3, poles_hz=(-1e3, *pair(1.2e6, 0.8))),
    Transfer(dc_gain=1e3, poles_hz=(-1e3, *pair(1e6, 1.2))),
    Transfer(dc_gain=1e3, poles_hz=(-1e3, *pair(30e6, 5.0))),
    Transfer(dc_gain=1e6, poles_hz=(-1.0, -3e6, -1e9, -2e9), zeros_hz=(-4e6,)),
    Transfer(dc_gain=80.0, poles_hz=(-1e3, -2e3, -4e3, -8e3)),
    Transfer(dc_gain=10.0, poles_hz=(-1e3, -2e3, -4e5)),
    Transfer(dc_gain=0.5, poles_hz=(-1e3, *pair(1e4, 3.0))),
    AMPLIFIER.transfer(),
    AMPLIFIER.with_changes(Rz=0).transfer(),
    AMPLIFIER.with_changes(Rz=3e3, Cgd=20e-15, mirror_pole_hz=150e6).transfer(),
    AMPLIFIER.with_changes(Cc=0.3e-12, CL=20e-12).transfer(),
]
STABLE = [response for response in CASES if closed_loop_step(response).stable]


def scaled_system(response: Transfer) -> tuple[Any, float]:
    """Return T as a python-control system with time in units that make its coefficients tame, and that unit in s."""
    numerator, denominator = response.polynomials()
    unit_s = float(denominator[-1] ** (1 / (len(denominator) - 1)))
    tops = numerator / unit_s ** np.arange(len(numerator))
    bottoms = denominator / unit_s ** np.arange(len(denominator))
    return control.tf(tops[::-1], bottoms[::-1]), unit_s


def state_space(response: Transfer) -> tuple[Any, Any, Any]:
    """Return A, B, C of the closed loop, time in s, from first- and second-order blocks in series (scipy)."""
    zeros, poles = np.array(response.zeros_hz) * TWO_PI, np.array(response.poles_hz) * TWO_PI
    scale = float(np.exp(np.mean(np.log(np.abs(poles)))))
    gain = response.dc_gain * np.prod(-poles / scale) / np.prod(-zeros / scale)
    a, b, c, _ = signal.zpk2ss(zeros / scale, poles / scale, gain.real)
    return (a - b @ c) * scale, b * scale, c


@pytest.mark.parametrize("response", CASES, ids=str)
def test_margins_agree_with_python_control(response: Transfer) -> None:
    system, unit_s = scaled_system(response)
    gain_margins, phase_margins, _, w_phase, w_gain, _ = control.stability_margins(system, returnall=True)
    found = margins(response)
    if len(w_gain) == 0:
        assert found.crossover_hz is None
        assert found.phase_margin_deg is None
    else:
        highest = int(np.argmax(w_gain))
        assert found.crossover_hz == pytest.approx(w_gain[highest] / unit_s / TWO_PI, rel=1e-10)
        assert found.phase_margin_deg == pytest.approx(phase_margins[highest], abs=1e-8)
    if len(w_phase) == 0:
        assert found.phase_crossover_hz is None
        assert found.gain_margin_db is None
    else:
        assert len(w_phase) == 1
        assert found.phase_crossover_hz == pytest.approx(w_phase[0] / unit_s / TWO_PI, rel=1e-9)
        assert found.gain_margin_db == pytest.approx(20 * math.log10(gain_margins[0]), abs=1e-7)


@pytest.mark.parametrize("response", CASES, ids=str)
def test_closed_loop_poles_agree_with_python_control(response: Transfer) -> None:
    system, unit_s = scaled_system(response)
    expected = control.poles(control.feedback(system, 1)) / unit_s / TWO_PI
    for pole in closed_loop_poles_hz(response):
        assert np.min(np.abs(expected - pole)) < 1e-7 * abs(pole)
    assert len(closed_loop_poles_hz(response)) == len(expected)


def test_one_pole_and_a_delay_have_the_margins_of_the_closed_form() -> None:
    # |T| = 1 at p·sqrt(T0² − 1) whatever the delay; its phase there is −atan(f/p) − 360°·f·delay.
    crossover_hz = 100.0 * math.sqrt(1e8 - 1)
    lag_deg = math.degrees(math.atan(crossover_hz / 100.0))
    for delay_s in (1e-9, 50e-9, 0.2e-6, 0.6e-6, 2.3e-6):
        found = margins(Transfer(dc_gain=1e4, poles_hz=(-100.0,), delay_s=delay_s))
        assert found.crossover_hz == pytest.approx(crossover_hz, rel=1e-12)
        # With the longest delays the phase is beyond −360°: the margin goes on falling below −180°.
        assert found.phase_margin_deg == pytest.approx(180 - lag_deg - 360 * crossover_hz * delay_s, abs=1e-8)

        def excess(f: float, delay: float = delay_s) -> float:
            return math.atan(f / 100.0) + TWO_PI * f * delay - math.pi

        phase_crossover_hz = optimize.brentq(excess, 1.0, 1 / delay_s, xtol=1e-9, rtol=1e-14)
        assert found.phase_crossover_hz == pytest.approx(phase_crossover_hz, rel=1e-9)
        gain_db = 20 * math.log10(1e4 / math.hypot(1, phase_crossover_hz / 100.0))
        assert found.gain_margin_db == pytest.approx(-gain_db, abs=1e-7)


def test_loop_beyond_minus_360_degrees_is_not_called_safe() -> None:
    response = Transfer(dc_gain=1e4, poles_hz=(-100.0,), delay_s=0.9e-6)
    found = margins(response)
    assert found.phase_margin_deg == pytest.approx(90 - 324, abs=0.1)
    assert found.gain_margin_db is not None
    assert found.gain_margin_db < 0
    assert not closed_loop_step(response).stable


def test_textbook_loop_has_60_degrees() -> None:
    # Allen & Holberg, CMOS Analog Circuit Design, 2nd ed., sec. 6.2, from memory: zero at 10 GBW, second pole at
    # 2.2 GBW -> 60°. The book takes crossover at GBW; at the true one, 7 % lower, 2° more are left.
    found = margins(Transfer(dc_gain=1e4, poles_hz=(-100.0, -2.2e6), zeros_hz=(10e6,)))
    assert found.phase_margin_deg == pytest.approx(60, abs=2.5)
    assert found.crossover_hz == pytest.approx(1e6, rel=0.08)


def test_two_poles_never_reach_minus_180_degrees() -> None:
    found = margins(Transfer(dc_gain=1e6, poles_hz=(-10.0, -1e3)))
    assert found.gain_margin_db is None
    assert found.phase_crossover_hz is None


def test_three_equal_poles_have_their_textbook_margin() -> None:
    # Textbook: three equal poles reach −180° at √3 times the pole, where the gain has fallen by 8.
    found = margins(Transfer(dc_gain=4.0, poles_hz=(-1e3, -1e3, -1e3)))
    assert found.phase_crossover_hz == pytest.approx(1e3 * math.sqrt(3), rel=1e-12)
    assert found.gain_margin_db == pytest.approx(20 * math.log10(2), abs=1e-10)


def test_loop_gain_below_1_has_no_crossover() -> None:
    found = margins(Transfer(dc_gain=0.5, poles_hz=(-1e3, -1e3, -1e3)))
    assert found.crossover_hz is None
    assert found.phase_margin_deg is None
    assert found.gain_margin_db == pytest.approx(20 * math.log10(16), abs=1e-10)


def test_several_crossovers_report_the_highest() -> None:
    # A resonance lifts the gain above 1 again.
    response = Transfer(dc_gain=1e3, poles_hz=(-1e3, *pair(10e6, 100.0)))
    assert np.abs(response.evaluate(5e6)) < 0.5
    found = margins(response)
    assert found.crossover_hz is not None
    assert found.crossover_hz > 10e6
    assert abs(response.evaluate(found.crossover_hz)) == pytest.approx(1, abs=1e-12)
    assert found.phase_margin_deg is not None
    assert found.phase_margin_deg < 0
    assert not closed_loop_step(response).stable


def test_conditionally_stable_loop_reports_the_margin_towards_more_gain() -> None:
    # Three poles and two zeros bring the phase below −180° and back; a far pole pair takes it down for good.
    response = Transfer(dc_gain=1e6, poles_hz=(-1e2, -1e2, -1e2, -1e6, -1e6), zeros_hz=(-3e3, -3e3))
    system, unit_s = scaled_system(response)
    gain_margins, _, _, w_phase, _, _ = control.stability_margins(system, returnall=True)
    assert len(w_phase) == 3
    found = margins(response)
    assert closed_loop_step(response).stable
    assert found.phase_crossover_hz == pytest.approx(w_phase.max() / unit_s / TWO_PI, rel=1e-6)
    assert found.gain_margin_db == pytest.approx(20 * math.log10(gain_margins[np.argmax(w_phase)]), abs=1e-5)
    assert found.gain_margin_db is not None
    assert found.gain_margin_db > 0
    # With so little gain that |T| = 1 comes while the phase is below −180°, only the margin below is left.
    lowered = margins(Transfer(dc_gain=300.0, poles_hz=response.poles_hz, zeros_hz=response.zeros_hz))
    assert lowered.phase_margin_deg is not None
    assert lowered.phase_margin_deg < 0
    assert lowered.phase_crossover_hz == pytest.approx(w_phase.min() / unit_s / TWO_PI, rel=1e-6)


def test_positive_feedback_counts_as_minus_180_degrees() -> None:
    # T = −10/(1 + jf/p): the Nyquist plot encircles −1 once, so it is unstable.
    response = Transfer(dc_gain=-10.0, poles_hz=(-1e3,))
    found = margins(response)
    assert found.phase_margin_deg == pytest.approx(-math.degrees(math.atan(math.sqrt(99))), abs=1e-9)
    assert not closed_loop_step(response).stable


def test_without_poles_there_are_no_margins() -> None:
    nothing = Margins(crossover_hz=None, phase_margin_deg=None, gain_margin_db=None, phase_crossover_hz=None)
    assert margins(Transfer(dc_gain=10.0, poles_hz=())) == nothing


def test_positive_phase_margin_means_stable_where_gain_and_phase_only_fall() -> None:
    # Nyquist's criterion in its textbook special case.
    rng = np.random.default_rng(11)
    stable = 0
    for _ in range(60):
        poles = -(10 ** rng.uniform(2, 6, size=rng.integers(3, 6)))
        delay_s = float(rng.choice([0.0, 1e-7]))
        response = Transfer(dc_gain=10 ** rng.uniform(0.5, 4), poles_hz=tuple(poles), delay_s=delay_s)
        found, step = margins(response), closed_loop_step(response)
        assert found.phase_margin_deg is not None
        assert found.gain_margin_db is not None
        assert step.stable == (found.phase_margin_deg > 0) == (found.gain_margin_db > 0)
        stable += step.stable
    assert 10 < stable < 50


@pytest.mark.parametrize("damping", [0.02, 0.1, 0.3, 0.5, 0.7, 0.8, 0.95])
@pytest.mark.parametrize("band", [0.05, 0.01, 0.001])
def test_second_order_step_is_that_of_the_textbook(damping: float, band: float) -> None:
    # Textbook: overshoot exp(−πζ/√(1 − ζ²)); y(t) = 1 − exp(−ζx)·(cos(βx) + ζ/β·sin(βx)) with β = √(1 − ζ²), x = ωn·t.
    # Three real numbers give T so that its closed loop has exactly this ζ and ωn.
    dc_gain, natural = 1e4, 3e6
    a2 = (1 + dc_gain) / natural**2
    response = Transfer.from_polynomials([dc_gain], [1.0, 2 * damping * math.sqrt(a2 * (1 + dc_gain)), a2])
    step = closed_loop_step(response, band=band)
    beta = math.sqrt(1 - damping**2)
    assert step.overshoot == pytest.approx(math.exp(-math.pi * damping / beta), rel=1e-8)
    # Textbook: the first peak is half a period of the damped frequency after the step.
    assert step.peak_s == pytest.approx(math.pi / (beta * natural), rel=1e-8)
    error_at_peak, slope_at_peak = step_error(response, [math.pi / (beta * natural)])[0]
    assert error_at_peak == pytest.approx(step.overshoot, rel=1e-8)
    assert slope_at_peak == pytest.approx(0.0, abs=1e-8 * natural)
    x = np.linspace(0, 10 / damping, 400_001)
    error = -np.exp(-damping * x) * (np.cos(beta * x) + damping / beta * np.sin(beta * x))
    last = np.flatnonzero(np.abs(error) > band)[-1]
    assert step.settling_s is not None
    assert x[last] <= step.settling_s * natural * (1 + 1e-9)
    assert x[last + 1] >= step.settling_s * natural * (1 - 1e-9)


@pytest.mark.parametrize("response", STABLE, ids=str)
def test_overshoot_agrees_with_python_control(response: Transfer) -> None:
    system, unit_s = scaled_system(response)
    closed = control.feedback(system, 1)
    step = closed_loop_step(response)
    assert step.settling_s is not None
    assert step.overshoot is not None
    # Fine against the fastest pole that can show, long enough to be past the highest peak.
    times = np.linspace(0, 1.5 * step.settling_s / unit_s, 20_001)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # its notes on ill-conditioned conversions; the numbers are judged below
        output = control.step_response(closed, T=times).outputs
    final = response.dc_gain / (1 + response.dc_gain)
    assert step.overshoot == pytest.approx(max(output.max() / final - 1, 0), abs=1e-6)
    outside = np.abs(output / final - 1) > 0.01
    assert times[np.flatnonzero(outside)[-1]] * unit_s == pytest.approx(step.settling_s, rel=2e-4)


@pytest.mark.parametrize("band", [0.05, 1e-3])
@pytest.mark.parametrize("response", STABLE, ids=str)
def test_settled_instant_lies_on_the_edge_of_the_band(response: Transfer, band: float) -> None:
    # The state-space solution by matrix exponential (scipy.linalg.expm) knows nothing of partial fractions.
    a, b, c = state_space(response)
    settling_s = closed_loop_step(response, band=band).settling_s
    assert settling_s is not None

    def error(time_s: float) -> float:
        rest = linalg.expm(a * time_s) @ np.linalg.solve(a, b)
        return float((c @ rest).real.item()) * (1 + response.dc_gain) / response.dc_gain

    assert abs(error(settling_s)) == pytest.approx(band, rel=1e-5)
    assert max(abs(error(settling_s * factor)) for factor in np.geomspace(1.001, 30, 60)) < band


@pytest.mark.parametrize("count", [2, 3, 4])
def test_repeated_closed_loop_poles_settle_as_the_closed_form(count: int) -> None:
    # m equal poles at rate a: 1 − y = exp(−x)·Σ x^k/k!, k < m, x = a·t (the Erlang distribution's tail).
    rate, dc_gain = 2e6, 1e3
    denominator = np.array([math.comb(count, k) * rate**-k for k in range(count + 1)]) * (1 + dc_gain)
    denominator[0] -= dc_gain
    step = closed_loop_step(Transfer.from_polynomials([dc_gain], denominator))

    def tail(x: float) -> float:
        return math.exp(-x) * sum(x**k / math.factorial(k) for k in range(count)) - 0.01

    assert step.settling_s == pytest.approx(optimize.brentq(tail, 1, 30, xtol=1e-13) / rate, rel=1e-6)
    assert step.overshoot == pytest.approx(0, abs=1e-6)


def test_slow_doublet_dominates_fine_settling() -> None:
    # Kamath, Meyer & Gray, IEEE J. Solid-State Circuits 9 (1974) 347, from memory: a doublet below crossover leaves a
    # slow term of relative size about (fz − fp)/fc and time constant 1/(2π·fz).
    fz, fp, fc = 1.0e3, 0.9e3, 1e6
    with_doublet = Transfer(dc_gain=1e6 * fz / fp, poles_hz=(-1.0, -fp), zeros_hz=(-fz,))
    slow = min(closed_loop_poles_hz(with_doublet), key=abs)
    assert slow.real == pytest.approx(-fz, rel=1e-3)
    band = 1e-5
    fine = closed_loop_step(with_doublet, band=band).settling_s
    expected = math.log((fz - fp) / fc / band) / (TWO_PI * fz)
    assert fine == pytest.approx(expected, rel=0.01)
    # A band wide enough for the slow term is reached by the fast one, helped by the slow one of opposite sign.
    coarse = closed_loop_step(with_doublet, band=1e-3).settling_s
    assert coarse == pytest.approx(-math.log(1e-3 + (fz - fp) / fc) / (TWO_PI * fc), rel=1e-3)


@pytest.mark.parametrize("delay_ratio", [0.05, 0.3, 0.6, 1.0])
def test_step_with_delay_agrees_with_the_method_of_steps(delay_ratio: float) -> None:
    # y' = −p·y + p·T0·(1 − y(t − delay)), integrated numerically; delay_ratio is ωc·delay (unstable beyond π/2).
    dc_gain, rate = 200.0, 1e4
    delay_s = delay_ratio / (rate * dc_gain)
    per_delay, count = 400, int(400 * 30 / delay_ratio)
    h = delay_s / per_delay
    decay = math.exp(-rate * h)
    drive = np.zeros(count + 1)  # 1 − y(t − delay), 0 before the step arrives
    output = np.zeros(count + 1)
    drive[per_delay] = 1.0
    for i in range(count):
        if i + 1 > per_delay:
            drive[i + 1] = 1 - output[i + 1 - per_delay]
        start = drive[i] if i >= per_delay else 0.0
        stop = drive[i + 1] if i >= per_delay else 0.0
        output[i + 1] = decay * output[i] + dc_gain * (1 - decay) * (start + stop) / 2
    final = dc_gain / (1 + dc_gain)
    step = closed_loop_step(Transfer(dc_gain=dc_gain, poles_hz=(-rate / TWO_PI,), delay_s=delay_s))
    assert step.overshoot == pytest.approx(max(output.max() / final - 1, 0), abs=1e-4)
    last = np.flatnonzero(np.abs(output / final - 1) > 0.01)[-1]
    assert step.settling_s == pytest.approx(h * (last + 0.5), rel=3e-4)


@pytest.mark.parametrize(
    "quantity",
    [
        lambda t: margins(t).crossover_hz,
        lambda t: margins(t).phase_margin_deg,
        lambda t: margins(t).gain_margin_db,
        lambda t: margins(t).phase_crossover_hz,
        lambda t: closed_loop_step(t).overshoot,
        lambda t: closed_loop_step(t).settling_s,
    ],
)
def test_results_are_smooth_enough_to_differentiate(quantity: Callable[[Transfer], float]) -> None:
    # The same derivative from steps a hundred times apart; a grid left in the results would show at the smaller one.
    base = AMPLIFIER.with_changes(CL=30e-12, Rz=200.0)
    for name in ("Rz", "Cc", "gm2"):
        value = getattr(base, name)

        def slope(step: float, name: str = name, value: float = value) -> float:
            up = quantity(base.with_changes(**{name: value * (1 + step)}).transfer())
            down = quantity(base.with_changes(**{name: value * (1 - step)}).transfer())
            return (up - down) / (2 * step)

        assert slope(1e-6) == pytest.approx(slope(1e-4), rel=1e-4)


def test_gain_that_stays_steps_at_once() -> None:
    # T → T0/3 at high frequency: y jumps to (T0/3)/(1 + T0/3) = 3/4 at t = 0 and rises to 9/10 with one exponential.
    response = Transfer(dc_gain=9.0, poles_hz=(-1e3,), zeros_hz=(-3e3,))
    step = closed_loop_step(response)
    rate = TWO_PI * abs(closed_loop_poles_hz(response)[0])
    assert step.overshoot == 0
    assert step.peak_s is None
    assert step.settling_s == pytest.approx(math.log((1 - 0.75 / 0.9) / 0.01) / rate, rel=1e-9)
    # The other way round it starts above its final value.
    lead = Transfer(dc_gain=9.0, poles_hz=(-3e3,), zeros_hz=(-1e3,))
    assert closed_loop_step(lead).overshoot == pytest.approx((27 / 28) / 0.9 - 1)
    assert closed_loop_step(lead, band=0.5).settling_s == 0


def test_unstable_loop_has_no_step_result() -> None:
    step = closed_loop_step(Transfer(dc_gain=100.0, poles_hz=(-1e3, -1e3, -1e3)), band=0.02)
    assert not step.stable
    assert step.overshoot is None
    assert step.settling_s is None
    assert step.band == 0.02
    # Textbook: three equal poles oscillate from a gain of 8 on.
    assert closed_loop_step(Transfer(dc_gain=7.9999, poles_hz=(-1e3, -1e3, -1e3))).stable
    assert not closed_loop_step(Transfer(dc_gain=8.0001, poles_hz=(-1e3, -1e3, -1e3))).stable
    assert not closed_loop_step(Transfer(dc_gain=-1.0, poles_hz=(-1e3,))).stable
    # T → −1 at high frequency: 1 + T has no s in it any more, the loop cannot be closed.
    assert not closed_loop_step(Transfer(dc_gain=2.0, poles_hz=(-1e3,), zeros_hz=(2e3,))).stable


@pytest.mark.parametrize("band", [0.0, 1.0, -0.1, math.nan])
def test_settling_band_outside_0_to_1_is_refused(band: float) -> None:
    with pytest.raises(ValueError, match="settling band must be between 0 and 1"):
        closed_loop_step(CASES[0], band=band)


def test_more_zeros_than_poles_are_refused() -> None:
    with pytest.raises(ValueError, match="more zeros than poles has no step response"):
        closed_loop_step(Transfer(dc_gain=1.0, poles_hz=(-1e3,), zeros_hz=(-1e4, -1e5)))
