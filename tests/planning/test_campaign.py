"""Information of sweeps before they are taken, against differences, algebra and what adding sweeps must do."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from planned_parts import DESIGN, NOMINAL, OWN_SPREADS, added

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.arrays import FloatArray
from fitamp.design import Design, HalfPlane, Roots
from fitamp.elements import information
from fitamp.errors import UsageError
from fitamp.planning import DEFAULT_NOISE, PlannedSweep
from fitamp.planning.campaign import Die, designed_die
from fitamp.sweep import NoiseLevels

STEPS = [added(), added(10.0), added(0.0, -400.0), added(20.0, 500.0), added(top_hz=300e6)]


def _by_differences(die: Die, sweep: PlannedSweep) -> FloatArray:
    """Information from central differences of the polynomial form of the loop gain, a real and an imaginary part each.

    For Gaussian noise of a complex variance v it is the sum of 2·Re(conj(∂T/∂i)·∂T/∂j)/v over the points (S. M. Kay,
    Fundamentals of Statistical Signal Processing: Estimation Theory, 1993, ch. 15, from memory), where v is that of T
    as both receivers read it.
    """

    def gain(values: FloatArray) -> FloatArray:
        part = die.circuit.loaded(values, sweep.condition)
        delay_s = die.circuit.physical(values)["bench_delay_s"]
        ideal = part.transfer().evaluate(sweep.freq_hz)
        return np.asarray(ideal * np.exp(-2j * np.pi * sweep.freq_hz * delay_s))

    columns = []
    for index in range(len(die.values)):
        step = np.zeros(len(die.values))
        step[index] = 1e-5
        columns.append((gain(die.values + step) - gain(die.values - step)) / 2e-5)
    slopes, loop = np.stack(columns, axis=1), gain(die.values)
    error, back, relative = (
        level / np.sqrt(sweep.averages) for level in (die.noise.error_channel, die.noise.return_channel, 1e-3)
    )
    # T = returned/error; the receivers see T/(1+T) and 1/(1+T).
    variance = np.abs(1 + loop) ** 2 * (back**2 + np.abs(loop) ** 2 * error**2) + np.abs(loop) ** 2 * relative**2
    weighted = slopes * np.sqrt(2 / variance)[:, np.newaxis]
    return np.asarray((weighted.conj().T @ weighted).real)


@pytest.mark.parametrize("sweep", [added(), added(10.0, -400.0), added(5.0, 500.0, averages=4)])
@pytest.mark.parametrize("design", [DESIGN, OWN_SPREADS])
def test_information_is_that_of_differences(design: Design, sweep: PlannedSweep) -> None:
    die = designed_die(design, DEFAULT_NOISE)
    triangle = die.triangle(sweep)
    size = np.sqrt(np.diag(triangle.T @ triangle))
    assert_allclose(
        triangle.T @ triangle / np.outer(size, size), _by_differences(die, sweep) / np.outer(size, size), atol=2e-6
    )


def test_information_is_that_of_the_elements_package() -> None:
    die = designed_die(OWN_SPREADS, DEFAULT_NOISE)
    sweep = added(5.0, 500.0)
    expected = information(die.circuit, die.values, sweep.freq_hz, DEFAULT_NOISE, condition=sweep.condition)
    triangle = die.triangle(sweep)
    assert_allclose(triangle.T @ triangle, expected, rtol=1e-9, atol=1e-9 * np.abs(expected).max())


def test_one_unknown_factor_is_known_to_the_noise_over_the_root_of_the_points() -> None:
    # T is proportional to gm1: n points with the relative complex error r give ln gm1 to r/√(2n), by weighted means.
    spreads = dict.fromkeys(("R1", "C1", "gm2", "R2", "CL", "Cc", "Rz"), 0.0)
    design = Design.from_elements(NOMINAL, spreads=spreads, under_test=("gm1",), bench=DESIGN.bench)
    noise = NoiseLevels(error_channel=0.0, return_channel=0.0, relative=1e-3)
    die = designed_die(design, noise)
    assert die.circuit.names == ("gm1",)
    covariance = die.covariance([die.triangle(added(averages=4))])
    assert covariance[0, 0] == pytest.approx(1e-6 / (2 * 281 * 4), rel=1e-9)


@pytest.mark.parametrize("design", [DESIGN, OWN_SPREADS])
def test_more_sweeps_never_tell_less(design: Design) -> None:
    die = designed_die(design, DEFAULT_NOISE)
    triangles = [die.triangle(step) for step in STEPS]
    for count in range(len(STEPS)):
        for chosen in combinations(range(len(STEPS)), count):
            before = die.covariance([triangles[index] for index in chosen])
            for other in set(range(len(STEPS))) - set(chosen):
                after = die.covariance([triangles[index] for index in (*chosen, other)])
                # In every direction, not only along the axes: before − after has no negative eigenvalue.
                size = np.sqrt(np.diag(before))
                eigenvalues = np.linalg.eigvalsh((before - after) / np.outer(size, size))
                assert eigenvalues.min() > -1e-9


def test_without_sweeps_the_priors_are_handed_back() -> None:
    die = designed_die(DESIGN, DEFAULT_NOISE)
    sds = dict(zip(die.circuit.names, np.sqrt(np.diag(die.covariance())), strict=True))
    assert sds.pop("Rz") == pytest.approx(0.2 * NOMINAL.nulling_product)
    assert list(sds.values()) == pytest.approx([0.2] * 7)


def test_a_prior_can_be_left_out() -> None:
    die = designed_die(DESIGN, DEFAULT_NOISE)
    index = die.circuit.index("CL")
    assert index is not None
    assert die.covariance(without_prior_of=index)[index, index] > 10.0
    triangles = [die.triangle(added(load)) for load in (0.0, 5.0, 20.0)]
    with_prior, without = die.covariance(triangles), die.covariance(triangles, without_prior_of=index)
    assert with_prior[index, index] < without[index, index] < 1e-3


def test_a_resistance_that_is_not_there_cannot_be_taken_away() -> None:
    die = designed_die(DESIGN, DEFAULT_NOISE)
    with pytest.raises(UsageError, match=r"−1\.4 kΩ leaves −100 Ω in series with Cc, less than none; take it off"):
        die.triangle(added(0.0, -1400.0))


def test_parts_are_drawn_from_the_spreads_also_of_what_is_under_test() -> None:
    die = designed_die(OWN_SPREADS, DEFAULT_NOISE)
    rng = np.random.default_rng(5)
    drawn = np.array([die.drawn(rng, least_rz_ohm=1000.0).values for _ in range(4000)])
    scatter = dict(zip(die.circuit.names, drawn.std(axis=0), strict=True))
    # 4000 draws: ±1.1 % each.
    assert scatter["gm2"] == pytest.approx(0.08, rel=0.05)
    assert scatter["CL"] == pytest.approx(0.05, rel=0.05)
    assert scatter["bench_delay_s"] == 0.0
    index = die.circuit.index("Rz")
    resistors = drawn[:, index] / NOMINAL.gm2
    assert resistors.min() == pytest.approx(1000.0)
    assert np.median(resistors) == pytest.approx(1300.0, rel=0.02)
    assert np.percentile(resistors, 84) == pytest.approx(1300 * 1.12, rel=0.02)


def test_a_design_that_holds_everything_leaves_nothing_to_tell() -> None:
    held = Design.from_elements(
        NOMINAL, spreads=dict.fromkeys(ELEMENT_NAMES, 0.0), under_test=(), bench=DESIGN.bench, file="held.toml"
    )
    with pytest.raises(UsageError, match=r"held\.toml: every element is held by a spread of 0"):
        designed_die(held, DEFAULT_NOISE)


def test_a_design_by_roots_has_no_elements_to_plan_for() -> None:
    roots = Roots(dc_gain=12000, pole1_hz=1.1e3, pole2_hz=60e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)
    with pytest.raises(UsageError, match=r"elements can only be estimated for a design with \[elements\]"):
        designed_die(Design.from_roots(roots), DEFAULT_NOISE)
