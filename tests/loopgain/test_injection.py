"""Two injections make the loop gain at any impedance ratio, and say what one alone would have made of it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from loop_records import FREQ_HZ, GAIN, NOISE, current_gain, record, voltage_gain_of

from fitamp.errors import SweepError
from fitamp.fitting import fit_sweep
from fitamp.loopgain import Injection, double_injection
from fitamp.sweep import Concern, Sign

RATIOS = [0.01, 0.1, 1.0, 10.0, 100.0]


def by_nodes(freq_hz: float) -> tuple[complex, complex, complex]:
    """Tv, Ti and the unilateral loop's T by Kirchhoff's laws, for a cut between output and input of a stage.

    A transconductance of −3 mS, its input 700 Ω ∥ 5 pF, drives 2 kΩ ∥ 1 pF at its output; output and input are one
    node once the loop is closed. With input and output at one node V nothing else is there, so the loop is cut between
    them: y (output side, driving), x (input side, driven).
    """
    s = 2j * np.pi * freq_hz
    y_in, y_out, gm = 1 / 700 + s * 5e-12, 1 / 2000 + s * 1e-12, 3e-3
    # Voltage source of 1 V in series from y to x: V_x = V_y + 1, and the current through it leaves y and enters x.
    # y: y_out·V_y + gm·V_x + i = 0, x: y_in·V_x − i = 0.
    v_y, v_x, _ = np.linalg.solve(
        np.array([[y_out, gm, 1], [0, y_in, -1], [-1, 1, 0]], dtype=complex), np.array([0, 0, 1], dtype=complex)
    )
    tv = -v_y / v_x
    # Current source of 1 A into the node that y and x make: forward current into x, returned current out of y.
    v = 1 / (y_out + y_in + gm)
    ti = (y_out * v + gm * v) / (y_in * v)
    # Opened, the stage loaded by a copy of its own input.
    return tv, ti, gm / (y_out + y_in)


@pytest.mark.parametrize("freq_hz", [1e3, 1e7, 3e8])
def test_formula_and_ratio_against_kirchhoff(freq_hz: float) -> None:
    grid = freq_hz * np.geomspace(0.5, 2, 9)
    tv, ti, t = np.array([by_nodes(f) for f in grid]).T
    voltage = replace(record(GAIN, "v.csv"), freq_hz=grid, gain=tv)
    result = double_injection(voltage, replace(voltage, gain=ti))
    np.testing.assert_allclose(result.sweep.gain, t, rtol=1e-12)
    s = 2j * np.pi * grid
    z_out, z_in = 1 / (1 / 2000 + s * 1e-12), 1 / (1 / 700 + s * 5e-12)
    np.testing.assert_allclose(result.impedance_ratio, z_out / z_in, rtol=1e-12)


@pytest.mark.parametrize("ratio", RATIOS)
def test_ratio_range_and_both_errors_are_told(ratio: float) -> None:
    rng = np.random.default_rng(3)
    voltage = record(voltage_gain_of(ratio), "v.csv", rng=rng)
    result = double_injection(voltage, record(current_gain(ratio), "i.csv", rng=rng))
    # Averaged over nine neighbours, each known to 30 % or better.
    assert result.impedance_range == pytest.approx((ratio, ratio), rel=0.3)
    wrong = {found.injection: found for found in result.alone}
    assert set(wrong) == {Injection.VOLTAGE, Injection.CURRENT}
    for kind, share in ((Injection.VOLTAGE, ratio), (Injection.CURRENT, 1 / ratio)):
        found = wrong[kind]
        t = GAIN[np.argmin(np.abs(FREQ_HZ - found.worst_hz))]
        exact = 1 + share + share / t
        assert 10 ** (found.magnitude_db / 20) == pytest.approx(abs(exact), rel=0.1)
        assert found.f_max_hz == FREQ_HZ[-1]
    cautions = [d for d in result.sweep.decisions if d.concern is Concern.CAUTION]
    assert [d.topic for d in cautions] == ["one injection", "one injection"]
    assert "voltage injection alone would have been off by" in cautions[0].choice


def test_injection_that_would_have_done_alone_is_not_blamed() -> None:
    rng = np.random.default_rng(4)
    # Below crossover the gain error of 0.1 % hides what 0.02 % of impedance ratio do.
    below = FREQ_HZ < 8e6
    voltage = record(voltage_gain_of(2e-4), "v.csv", rng=rng).without(below, "above")
    result = double_injection(voltage, record(current_gain(2e-4), "i.csv", rng=rng).without(below, "above"))
    assert [found.injection for found in result.alone] == [Injection.CURRENT]


def test_record_of_nothing_but_noise_is_a_caution() -> None:
    rng = np.random.default_rng(4)
    voltage = record(voltage_gain_of(1e-6), "v.csv", rng=rng)
    result = double_injection(voltage, record(current_gain(1e-6), "i.csv", rng=rng))
    assert result.impedance_range is None
    assert result.alone == ()
    (caution,) = [d for d in result.sweep.decisions if d.concern is Concern.CAUTION]
    assert caution.reason.startswith("one of the records is nothing but noise")


@pytest.mark.parametrize("ratio", RATIOS)
def test_standard_errors_are_those_of_the_scatter(ratio: float) -> None:
    rng = np.random.default_rng(8)
    squares = []
    for _ in range(6):
        voltage = record(voltage_gain_of(ratio), "v.csv", rng=rng)
        result = double_injection(voltage, record(current_gain(ratio), "i.csv", rng=rng))
        squares.append(np.abs(result.sweep.gain - GAIN) ** 2 / result.stderr**2)
    for part in np.array_split(np.array(squares), 4, axis=1):
        # Some 420 exponential values, which go together in no way: 5 % of standard error, and the drowned low end.
        assert np.sqrt(part.mean()) == pytest.approx(1, abs=0.2)


@pytest.mark.parametrize("ratio", RATIOS)
def test_fit_agrees_with_that_of_the_loop_gain_itself(ratio: float) -> None:
    rng = np.random.default_rng(21)
    voltage = record(voltage_gain_of(ratio), "v.csv", rng=rng)
    fit = fit_sweep(double_injection(voltage, record(current_gain(ratio), "i.csv", rng=rng)).sweep)
    direct = fit_sweep(record(GAIN, "direct.csv", rng=rng))
    assert fit.adequacy.adequate
    for name in ("pole1_hz", "pole2_hz", "zero_time_s"):
        one, other = getattr(fit.parameters, name), getattr(direct.parameters, name)
        assert abs(one.value - other.value) < 3 * np.hypot(one.stderr, other.stderr)
        assert one.stderr < 2.5 * other.stderr


def test_noise_that_is_known_of_both_records_goes_over_to_the_loop_gain() -> None:
    rng = np.random.default_rng(9)
    voltage, current = voltage_gain_of(0.5), current_gain(0.5)
    records = record(voltage, "v.csv", rng=rng, noise=NOISE), record(current, "i.csv", rng=rng, noise=NOISE)
    noise = double_injection(*records).sweep.noise
    assert noise is not None
    assert noise.source == "both injections: given"
    # Where T is large both error receivers count alike.
    assert noise.error_channel == pytest.approx(np.sqrt(2) * NOISE.error_channel, rel=0.02)
    e = 1 / (1 + GAIN)
    parts = 1 / (1 + voltage), 1 / (1 + current)
    n, r = NOISE.error_channel, NOISE.relative
    exact = sum(n**2 * (abs(p) ** 2 + abs(1 - p) ** 2) + r**2 * abs(p * (1 - p)) ** 2 for p in parts)
    have = (
        noise.return_channel**2 * abs(e) ** 2
        + noise.error_channel**2 * abs(1 - e) ** 2
        + noise.relative**2 * abs(e * (1 - e)) ** 2
        + noise.ratio**2 * abs(e) ** 4
    )
    # Four numbers do not follow it to the last: within 30 % of the standard deviation all along.
    np.testing.assert_allclose(np.sqrt(have / exact), 1, atol=0.3)
    assert double_injection(records[0], record(current, "i.csv")).sweep.noise is None


def test_records_on_other_frequencies_are_refused() -> None:
    voltage = record(voltage_gain_of(1.0), "v.csv")
    current = replace(record(current_gain(1.0), "i.csv"), freq_hz=FREQ_HZ * 1.01)
    with pytest.raises(SweepError, match=r"v\.csv, point 1: 10.00000 Hz is not in i\.csv; both records must be on the"):
        double_injection(voltage, current)


def test_records_that_make_no_loop_gain_are_refused() -> None:
    voltage = record(voltage_gain_of(1.0), "v.csv")
    gain = current_gain(1.0)
    gain[4] = -2 - voltage.gain[4]
    with pytest.raises(SweepError, match=r"v\.csv, point 5 .*with i\.csv it gives no loop gain; check the signs"):
        double_injection(voltage, record(gain, "i.csv"))
    with pytest.raises(SweepError, match=r"i\.csv: its sign is open; settle it"):
        double_injection(voltage, replace(record(current_gain(1.0), "i.csv"), sign=Sign.UNKNOWN))
    few = voltage.without(FREQ_HZ < 12, "few")
    with pytest.raises(SweepError, match=r"v\.csv: 4 points, double injection needs 8 or more"):
        double_injection(few, few)
