"""The classic straight lines: points, line, band, and what they say against the truth and against the joint fit."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import BASE, DESIGN, NOMINAL, STEPS, drawn, swept

from fitamp.design import Bench
from fitamp.elements import Condition, ElementEstimate, LineFit, LineKind, estimate_elements, line_fits
from fitamp.elements.lines import Line

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))
DIE = drawn(5)
LOADS = tuple(Condition(load_added_f=load_f) for load_f in (0.0, 4e-12, 8e-12, 16e-12))


@pytest.fixture(scope="module")
def stepped() -> ElementEstimate:
    return estimate_elements(swept(DIE, STEPS, 4, bench_load_f=0.0), BARE, conditions=STEPS)


def within(line: LineFit, slope: float, intercept: float) -> None:
    for found, expected in ((line.slope, slope), (line.intercept, intercept)):
        assert found.value is not None
        assert found.stderr is not None
        assert abs(found.value - expected) < 3.5 * found.stderr
        assert found.stderr < 0.03 * abs(expected)


def test_both_lines_are_those_of_the_part(stepped: ElementEstimate) -> None:
    pole2, zero = line_fits(stepped)
    assert (pole2.kind, zero.kind) == (LineKind.POLE2, LineKind.ZERO)
    # Hand calculation: slope (C1 + Cc)/(gm2·Cc), but for what R1, R2 and Rz add, below 2 % here; the intercept is the
    # hand formula of the second pole as a time.
    slope = (DIE.C1 + DIE.Cc) / (DIE.gm2 * DIE.Cc)
    assert pole2.slope.value == pytest.approx(slope, rel=0.02)
    assert pole2.intercept.value == pytest.approx(1 / (2 * np.pi * DIE.pole2_approx_hz), rel=0.02)
    within(zero, DIE.Cc, DIE.zero_time_s)
    assert zero.meaning == zero.slope
    for line in (pole2, zero):
        within(line, line.joint.slope, line.joint.intercept)


def test_points_are_those_of_the_sweeps(stepped: ElementEstimate) -> None:
    pole2, zero = line_fits(stepped)
    assert pole2.files == ("step0.csv", "step1.csv", "step2.csv")
    assert_allclose(pole2.x, [0.0, 5e-12, 15e-12])
    assert len(zero.files) == 5
    assert_allclose(np.sort(zero.x), [-400.0, 0.0, 0.0, 0.0, 500.0])
    assert (pole2.freedom, zero.freedom) == (1, 3)
    zeros = [fit.parameters.zero_time_s.value for fit in stepped.fits]
    assert_allclose(zero.y, np.array(zeros, dtype=float))


def test_the_load_beyond_the_design_is_found_by_the_line() -> None:
    # C1 as designed, so that the line's assumption holds; 1 pF that nobody designed.
    die = NOMINAL.with_changes(CL=5e-12, gm2=1.75e-3)
    design = replace(DESIGN, bench=Bench(load_f=2e-12, load_spread=0.02, delay_s=0.0))
    estimate = estimate_elements(swept(die, LOADS, 3), design, conditions=LOADS)
    (pole2,) = line_fits(estimate)
    meaning = pole2.meaning
    assert meaning.value is not None
    assert meaning.stderr is not None
    assert abs(meaning.value - 1e-12) < 3 * meaning.stderr
    # Bench 2 pF ± 2 % and C1 ± 20 % of 0.2 pF in series with Cc are its error, hardly the points.
    assert meaning.stderr == pytest.approx(np.hypot(0.04e-12, 0.04e-12 * (1.8 / 2.0) ** 2), rel=0.15)
    joint = estimate.parasitics.load_f
    assert joint.value is not None
    assert joint.stderr is not None
    assert abs(meaning.value - joint.value) < 3 * np.hypot(meaning.stderr, joint.stderr)


def test_weighted_least_squares_is_that_of_numpy(stepped: ElementEstimate) -> None:
    # numpy.polyfit with weights, its covariance not scaled, is the second opinion.
    for line in line_fits(stepped):
        scale = np.ptp(line.x)
        coefficients, covariance = np.polyfit(line.x / scale, line.y, 1, w=1 / line.y_stderr, cov="unscaled")
        assert line.slope.value == pytest.approx(coefficients[0] / scale, rel=1e-9)
        assert line.intercept.value == pytest.approx(coefficients[1], rel=1e-9)
        widened = max(line.chi_square / line.freedom, 1.0)
        assert line.covariance[1, 1] == pytest.approx(covariance[0, 0] / scale**2 * widened, rel=1e-9)
        assert line.covariance[0, 1] == pytest.approx(covariance[0, 1] / scale * widened, rel=1e-9)


def test_the_band_is_narrowest_among_the_points(stepped: ElementEstimate) -> None:
    _, zero = line_fits(stepped)
    low, high = zero.band([-2000.0, 0.0, 2000.0])
    assert_allclose((low + high) / 2, zero.line.at([-2000.0, 0.0, 2000.0]))
    width = high - low
    assert width[1] < width[0]
    assert width[1] < width[2]
    assert width[1] == pytest.approx(2 * zero.quantile * (zero.intercept.stderr or 0.0))


def test_without_steps_there_is_no_line() -> None:
    assert line_fits(estimate_elements(swept(DIE, [BASE], 4, bench_load_f=0.0), BARE)) == ()


def test_a_sweep_that_was_left_out_is_no_point() -> None:
    conditions = (*STEPS, Condition(load_added_f=10e-12))
    sweeps = swept(DIE, conditions, 4, bench_load_f=0.0)
    sweeps[2] = swept(DIE.with_changes(CL=1.05 * DIE.CL), conditions, 4, bench_load_f=0.0)[2]
    pole2 = line_fits(estimate_elements(sweeps, BARE, conditions=conditions))[0]
    assert pole2.files == ("step0.csv", "step1.csv", "step5.csv")


def test_a_line_is_a_line() -> None:
    assert_allclose(Line(intercept=1.0, slope=2.0).at([0.0, 3.0]), [1.0, 7.0])
