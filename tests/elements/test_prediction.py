"""What the part would do with another load or resistor: curves against the exact part, bands against their promise."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal
from stepped_parts import BASE, DESIGN, NOMINAL, STEPS, drawn, swept

from fitamp.design import Bench
from fitamp.elements import Against, ElementEstimate, estimate_elements, predict
from fitamp.elements.prediction import resistors_about, sampled_vectors
from fitamp.errors import UsageError
from fitamp.margins import closed_loop_step, margins

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))
DIE = drawn(5)


@pytest.fixture(scope="module")
def stepped() -> ElementEstimate:
    return estimate_elements(swept(DIE, STEPS, 4, bench_load_f=0.0), BARE, conditions=STEPS)


@pytest.fixture(scope="module")
def single() -> ElementEstimate:
    return estimate_elements(swept(DIE, [BASE], 4, bench_load_f=0.0), BARE)


def test_loads_that_were_never_measured_are_foretold(stepped: ElementEstimate) -> None:
    loads_f = [1e-12, 6e-12, 20e-12]
    found = predict(stepped, load_f=loads_f, samples=60)
    assert found.against is Against.LOAD
    assert found.against.unit == "F"
    assert found.estimated_at == pytest.approx(DIE.CL, rel=0.01)
    assert found.designed_at == NOMINAL.CL
    for index, load_f in enumerate(loads_f):
        true = DIE.with_changes(CL=load_f).transfer()
        seen, step = margins(true), closed_loop_step(true)
        for name, value in (
            ("crossover_hz", seen.crossover_hz),
            ("phase_margin_deg", seen.phase_margin_deg),
            ("overshoot", step.overshoot),
            ("settling_s", step.settling_s),
        ):
            band = dict(found.items())[name]
            assert value is not None
            # The bands are as narrow as the elements are sure; twice their width holds it surely.
            reach = max(2 * (band.high[index] - band.low[index]), 1e-9)
            assert abs(band.value[index] - value) <= reach
            assert band.low[index] <= band.value[index] <= band.high[index]


def test_the_designed_curve_is_that_of_the_design(stepped: ElementEstimate) -> None:
    found = predict(stepped, rz_ohm=[0.0, 1300.0], samples=20)
    assert found.against is Against.RESISTOR
    for index, rz_ohm in enumerate((0.0, 1300.0)):
        expected = margins(NOMINAL.with_changes(Rz=rz_ohm).transfer())
        assert found.phase_margin_deg.designed[index] == pytest.approx(expected.phase_margin_deg)


def test_what_one_sweep_knows_of_added_loads_is_surer_than_of_whole_ones(single: ElementEstimate) -> None:
    added = predict(single, load_added_f=[0.0, 1e-12], samples=40).phase_margin_deg
    whole = predict(single, load_f=[DIE.CL, DIE.CL + 1e-12], samples=40).phase_margin_deg
    widths = [band.high - band.low for band in (added, whole)]
    # As it stands on the bench the margin was measured.
    assert widths[0][0] < 0.1
    assert widths[1][0] > 20 * widths[0][0]
    assert (widths[0] < widths[1]).all()


def test_bands_of_margins_are_those_of_samples(single: ElementEstimate) -> None:
    # Linear propagation against the spread of the same quantity over samples of the estimate.
    loads_f = np.array([2e-12, 8e-12])
    band = predict(single, load_f=loads_f, samples=20).phase_margin_deg
    drawn_margins = [
        [margins(replace(part, CL=load_f).transfer()).phase_margin_deg for load_f in loads_f]
        for part in (single.circuit.loaded(vector) for vector in sampled_vectors(single, 300, 7))
    ]
    spread = np.std(np.array(drawn_margins, dtype=float), axis=0)
    assert_allclose((band.high - band.low) / (2 * single.quantile), spread, rtol=0.12)


def test_samples_are_those_of_the_estimate(single: ElementEstimate) -> None:
    vectors = sampled_vectors(single, 400, 1)
    assert_allclose(vectors.mean(axis=0), single.vector, atol=0.1 * np.sqrt(np.diag(single.covariance)).max())
    assert_allclose(np.cov(vectors.T), single.covariance, atol=0.2 * np.diag(single.covariance).max())
    assert_array_equal(vectors, sampled_vectors(single, 400, 1))


def test_bands_of_overshoot_end_at_zero_and_are_the_same_each_time(single: ElementEstimate) -> None:
    loads_f = np.geomspace(2e-12, 20e-12, 5)
    first, second = (predict(single, load_f=loads_f, samples=50) for _ in range(2))
    assert (first.overshoot.low >= 0.0).all()
    assert first.overshoot.high[-1] > first.overshoot.value[-1] > first.overshoot.low[-1]
    assert_array_equal(first.settling_s.high, second.settling_s.high)


def test_without_a_crossover_there_is_no_margin(stepped: ElementEstimate) -> None:
    weak = replace(stepped.circuit, nominal=replace(NOMINAL, beta=1e-5))
    estimate = replace(stepped, solution=replace(stepped.solution, circuit=weak))
    found = predict(estimate, load_f=[4e-12], samples=10)
    assert math.isnan(found.phase_margin_deg.value[0])
    assert math.isnan(found.phase_margin_deg.high[0])


def test_loads_and_resistors_are_chosen_where_none_are_given(stepped: ElementEstimate) -> None:
    found = predict(stepped, samples=10)
    assert found.at[0] == pytest.approx(stepped.amplifier.CL / 4)
    assert found.at[-1] == pytest.approx(stepped.amplifier.CL * 4)
    resistors = resistors_about(stepped)
    assert resistors[0] == 0.0
    assert resistors[-1] == pytest.approx(2.5 * NOMINAL.Rz)


def test_what_cannot_be_is_refused(stepped: ElementEstimate) -> None:
    with pytest.raises(UsageError, match="give one of load_f, load_added_f and rz_ohm"):
        predict(stepped, load_f=[1e-12], rz_ohm=[0.0])
    with pytest.raises(UsageError, match="finite loads above 0 F"):
        predict(stepped, load_f=[0.0])
    with pytest.raises(UsageError, match="finite added loads of 0 F or more"):
        predict(stepped, load_added_f=[-1e-12])
    with pytest.raises(UsageError, match="finite resistors of 0 Ω or more"):
        predict(stepped, rz_ohm=[math.nan])
    with pytest.raises(UsageError, match="at least one"):
        predict(stepped, rz_ohm=[])
