"""More than two poles and a zero: every root found with an honest error, and nothing found that is not there."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest

from fitamp.arrays import ComplexArray
from fitamp.fitting import DelayPrior, FarPolePrior, LoopFit, Pole2Prior, WarningCode, fit_sweep
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
FREQ_HZ = np.geomspace(10, 100e6, 281)
POLES_HZ, ZEROS_HZ = (-1.2e3, -58e6), (-116e6,)
SIGMAS = 4.5


def pair(distance_hz: float, quality: float) -> tuple[complex, complex]:
    """A complex pair by its distance from the origin and its quality; a negative quality is unstable."""
    root = distance_hz * complex(-1 / (2 * quality), np.sqrt(1 - 1 / (4 * quality**2)))
    return root, root.conjugate()


def loop(poles_hz: Sequence[complex] = (), zeros_hz: Sequence[complex] = ()) -> Transfer:
    return Transfer(dc_gain=10**4.1, poles_hz=(*POLES_HZ, *poles_hz), zeros_hz=(*ZEROS_HZ, *zeros_hz))


def fitted(gain: ComplexArray, seed: int) -> LoopFit:
    return fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(gain, NOISE, np.random.default_rng(seed))))


def check_roots(fit: LoopFit, true: Transfer) -> None:
    """As many roots as there are, each within its own error of a true one."""
    for found, truth in ((fit.named_poles, true.poles_hz), (fit.named_zeros, true.zeros_hz)):
        assert len(found) == len(truth)
        for _, root in found:
            assert root.covariance is not None
            nearest = min(truth, key=lambda other: abs(other - root.value_hz))
            off = np.array([(root.value_hz - nearest).real, (root.value_hz - nearest).imag])
            deviations = np.sqrt(np.diag(root.covariance))
            assert (np.abs(off) <= SIGMAS * deviations).all()
            assert np.linalg.norm(deviations) < 0.1 * abs(nearest)


@pytest.mark.parametrize(
    ("true", "resonances", "doublets"),
    [
        (loop((-20e6,), (-40e6,)), 0, 1),
        (loop((-1e6,), (-1.2e6,)), 0, 1),
        (loop((*pair(30e6, 20), -1e6), (*pair(31e6, 20), -1.15e6)), 1, 1),
        (loop((*pair(9e6, 10),), (*pair(9.4e6, 12),)), 1, 0),
    ],
    ids=["mirror", "slow doublet", "resonance and doublet", "resonance"],
)
def test_every_root_is_found_with_its_error(true: Transfer, resonances: int, doublets: int) -> None:
    fit = fitted(true.evaluate(FREQ_HZ), 3)
    assert (len(fit.resonant_poles) // 2, len(fit.doublet_poles)) == (resonances, doublets)
    assert fit.model_name == "vector-fit"
    assert fit.adequacy.adequate
    check_roots(fit, true)
    codes = {warning.code for warning in fit.warnings}
    assert (WarningCode.RESONANCE in codes, WarningCode.DOUBLET in codes) == (resonances > 0, doublets > 0)


def test_a_third_pole_inside_the_band_is_named_so() -> None:
    true = Transfer(dc_gain=10**4.1, poles_hz=(-1.2e3, -20e6, -50e6), zeros_hz=(-40e6,))
    fit = fitted(true.evaluate(FREQ_HZ), 4)
    assert [name for name, _ in fit.named_poles] == ["pole 1", "pole 2", "pole 3"]
    check_roots(fit, true)


def test_an_unstable_pair_is_reported_not_mirrored() -> None:
    true = loop(pair(30e6, -50), pair(30.6e6, 20))
    fit = fitted(true.evaluate(FREQ_HZ), 5)
    check_roots(fit, true)
    assert all(pole.value_hz.real > 0 for pole in fit.resonant_poles)
    (message,) = (warning.message for warning in fit.warnings if warning.code is WarningCode.UNSTABLE_ROOT)
    assert "right half plane" in message


@pytest.mark.parametrize(("at_hz", "db", "degrees"), [(1e5, 0.1, 0.5), (20e6, 0.5, -2.0), (80e6, 0.3, 0.0)])
def test_a_range_step_is_fitted_with_its_error_and_leaves_the_roots_alone(
    at_hz: float, db: float, degrees: float
) -> None:
    true = loop()
    size = 10 ** (db / 20) * np.exp(1j * np.radians(degrees))
    fit = fitted(true.evaluate(FREQ_HZ) * np.where(at_hz < FREQ_HZ, size, 1.0), 6)
    (step,) = fit.range_steps
    below, above = FREQ_HZ[at_hz > FREQ_HZ][-1], FREQ_HZ[at_hz < FREQ_HZ][0]
    assert below <= step.f_hz <= above
    for estimate, truth in ((step.size_db, db), (step.turn_deg, degrees)):
        assert estimate.value is not None
        assert estimate.stderr is not None
        assert abs(estimate.value - truth) < SIGMAS * estimate.stderr
    assert step.size_db.stderr is not None
    assert step.size_db.stderr < 0.03
    assert fit.model_name == "two-pole-one-zero"
    check_roots(fit, true)
    assert WarningCode.RANGE_STEP in {warning.code for warning in fit.warnings}


def test_a_resonance_beside_a_range_step() -> None:
    true = loop(pair(30e6, 20), pair(30.6e6, 20))
    fit = fitted(true.evaluate(FREQ_HZ) * np.where(FREQ_HZ > 1e6, 1.023, 1.0), 7)
    assert len(fit.range_steps) == 1
    check_roots(fit, true)


def test_nothing_is_added_to_a_clean_sweep() -> None:
    for seed in range(12):
        fit = fitted(loop().evaluate(FREQ_HZ), 100 + seed)
        assert not fit.solution.model.factors
        assert fit.model_name == "two-pole-one-zero"


def test_with_a_design_the_doublet_below_pole_2_is_not_taken_for_it() -> None:
    """Nearness alone would take 4 MHz for pole 2; rough knowledge of pole 2 says otherwise."""
    true = loop((-4e6,), (-8e6,))
    sweep = Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(true.evaluate(FREQ_HZ), NOISE, np.random.default_rng(8)))
    prior = Pole2Prior(time_s=1 / (2 * np.pi * 50e6), ln_sd=np.log(2))
    fit = fit_sweep(sweep, pole2=prior, far_pole=FarPolePrior(), delay=DelayPrior())
    poles = {name: abs(root.value_hz) for name, root in fit.named_poles}
    assert poles["pole 2"] == pytest.approx(58e6, rel=0.02)
    assert poles["doublet"] == pytest.approx(4e6, rel=0.02)
    check_roots(fit, true)


def test_points_on_a_resonance_come_back_once_it_is_known() -> None:
    """Before the resonance is in the model its flank stands apart from the neighbours, as bad points do."""
    true = Transfer(dc_gain=1.2e4, poles_hz=(-1.1e3, -40e6, *pair(40e6, 15)), zeros_hz=(-131e6, *pair(43e6, 15)))
    freq_hz = np.geomspace(10, 300e6, 301)
    gain = simulate_bench(true.evaluate(freq_hz), NOISE, np.random.default_rng(1))
    glitch = 40
    gain[glitch] *= 5
    fit = fit_sweep(Sweep(freq_hz=freq_hz, gain=gain))
    assert [point.f_hz for point in fit.sweep.left_out] == [freq_hz[glitch]]
    check_roots(fit, true)


def test_a_further_pole_in_band_is_not_taken_for_pole_2_where_a_design_expects_that() -> None:
    """Pole 2 and zero were once taken for a doublet, the further pole for pole 2, and the zero for one at infinity."""
    true = loop((-40e6,))
    sweep = Sweep(freq_hz=FREQ_HZ, gain=simulate_bench(true.evaluate(FREQ_HZ), NOISE, np.random.default_rng(9)))
    prior = Pole2Prior(time_s=1 / (2 * np.pi * 66e6), ln_sd=np.log(2))
    fit = fit_sweep(sweep, pole2=prior, far_pole=FarPolePrior(), delay=DelayPrior())
    assert [name for name, _ in fit.named_poles] == ["pole 1", "pole 2", "further pole"]
    assert WarningCode.FURTHER_POLE in {warning.code for warning in fit.warnings}
    check_roots(fit, true)


def test_a_bad_point_is_no_resonance() -> None:
    """A resonance narrower than the distance between points can be bent through any single one."""
    gain = simulate_bench(loop().evaluate(FREQ_HZ), NOISE, np.random.default_rng(10))
    gain[250] *= 1.3
    fit = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain), keep_all=True)
    assert not fit.resonant_poles
