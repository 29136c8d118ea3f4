"""The zero by the circuit: right where two poles and a zero are not, and set aside where there is a doubt."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, DESIGN, FREQ_HZ, NOMINAL, SPREADS, drawn, measured, noise_free

from fitamp.amplifier import Elements
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.comparison.circuit_zero import CircuitZero, zero_by_circuit
from fitamp.comparison.expectation import fit_with_design
from fitamp.design import Bench, Design
from fitamp.elements import ElementEstimate, Parameter, estimate_elements
from fitamp.errors import FitError
from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit
from fitamp.sweep import Sweep

SPREAD_AT_MOST = 2.6  # of 6 to 12 pulls, whose largest is beyond that once in ten to twenty such draws


def both(sweep: Sweep, design: Design = DESIGN) -> tuple[LoopFit, CircuitZero]:
    """The fit of two poles and a zero, and the circuit's answer to the same sweep."""
    fit = fit_with_design(sweep, design)
    found = zero_by_circuit(fit, design)
    assert isinstance(found, CircuitZero)
    return fit, found


def true_zero_s(part: Elements) -> float:
    """Zero time of the whole compensation, the overlap capacitor's share in it: Cc·(Rz − 1/gm2) − Cgd/gm2."""
    return part.Cc * (part.Rz - 1 / part.gm2) - part.Cgd / part.gm2


def pull(estimate: Estimate, truth: float) -> float:
    """Standard errors off the truth."""
    assert estimate.value is not None
    assert estimate.stderr is not None
    return (estimate.value - truth) / estimate.stderr


def held(estimate: Estimate, truth: float) -> bool:
    """Whether the 95 % interval holds the truth."""
    low, high = estimate.ci95
    assert low is not None
    assert high is not None
    return low <= truth <= high


@pytest.mark.parametrize("resistor_ohm", [0.0, 300.0, 625.0, 1300.0, 2860.0])
def test_an_exact_sweep_gives_the_parts_own_zero(resistor_ohm: float) -> None:
    part = NOMINAL.with_changes(Rz=resistor_ohm)
    _, found = both(noise_free(part))
    assert found.doubt is None
    # Priors that do not expect this resistor pull at the rest, by next to nothing.
    assert abs(pull(found.zero_time_s, true_zero_s(part))) < 0.02
    assert found.gm2_rz.value == pytest.approx(part.nulling_product, abs=1e-3)
    assert found.rz_change_ohm.value == pytest.approx((1.215e-9 - true_zero_s(part)) / NOMINAL.Cc, abs=1.0)
    assert found.rz_ohm == pytest.approx(resistor_ohm, abs=0.5)


def test_a_mirror_off_its_place_costs_a_quarter_of_the_error() -> None:
    nominal = NOMINAL.with_changes(mirror_pole_hz=300e6)
    design = Design.from_elements(nominal, spreads=SPREADS | {"mirror_pole_hz": 0.15}, bench=BENCH)
    for seed, (factor, resistor_ohm) in enumerate([(0.85, 1300.0), (1.15, 625.0), (1.2, 300.0)]):
        part = nominal.with_changes(Rz=resistor_ohm, mirror_pole_hz=factor * 300e6)
        fit, found = both(measured(part, seed), design)
        assert found.doubt is None
        assert abs(pull(found.zero_time_s, true_zero_s(part))) < SPREAD_AT_MOST
        assert (found.zero_time_s.stderr or 1.0) < 0.4 * (fit.parameters.zero_time_s.stderr or 0.0)


def test_an_overlap_capacitor_off_its_place_is_not_made_up_for_by_the_zero() -> None:
    # Taken as exactly designed, as two poles and a zero have it, a fifth more or less moves the zero by ten errors.
    nominal = NOMINAL.with_changes(Cgd=10e-15)
    design = Design.from_elements(nominal, spreads=SPREADS | {"Cgd": 0.2}, bench=BENCH)
    without, having = [], []
    for seed, (factor, resistor_ohm) in enumerate([(1.2, 1300.0), (1.2, 625.0), (0.8, 625.0), (0.8, 1300.0)]):
        part = nominal.with_changes(Rz=resistor_ohm, Cgd=factor * 10e-15)
        fit, found = both(measured(part, 10 + seed), design)
        assert found.doubt is None
        without.append(abs(pull(fit.parameters.zero_time_s, true_zero_s(part))))
        having.append(abs(pull(found.zero_time_s, true_zero_s(part))))
    assert max(having) < SPREAD_AT_MOST
    assert max(without) > 5


@pytest.mark.parametrize("resistor_ohm", [0.0, 625.0, 1300.0])
def test_a_forgotten_probe_is_not_made_up_for_by_the_zero(resistor_ohm: float) -> None:
    # 5 pF more than the design and its bench know of, seen up to 8 MHz, a sixth of pole 2. By the spread of CL as
    # designed they would be twenty-five standard deviations.
    freq_hz = np.geomspace(10, 8e6, 101)
    part = NOMINAL.with_changes(CL=NOMINAL.CL + 5e-12, Rz=resistor_ohm)
    for seed in range(3):
        fit, found = both(measured(part, seed, freq_hz=freq_hz))
        assert abs(pull(found.zero_time_s, true_zero_s(part))) < SPREAD_AT_MOST
        assert found.parasitics.load_f.value == pytest.approx(5e-12, abs=2.5 * (found.parasitics.load_f.stderr or 0.0))
        # And no more is made of the load than the sweep tells.
        assert (found.zero_time_s.stderr or 0.0) > 0.7 * (fit.parameters.zero_time_s.stderr or 1.0)


def test_a_missing_resistor_has_its_intervals_on_the_right_side_of_nothing() -> None:
    rng = np.random.default_rng(61)
    zeros, products, at_bound = 0, 0, 0
    for seed in range(24):
        die = drawn(rng, SPREADS).with_changes(Rz=0.0)
        _, found = both(measured(die, seed))
        assert found.gm2_rz.ci95[0] is not None
        assert found.gm2_rz.ci95[0] >= 0
        zeros += held(found.zero_time_s, true_zero_s(die))
        products += held(found.gm2_rz, 0.0)
        at_bound += found.solution.unbounded is not None
    # 24 intervals of 95 %: 20 or fewer hold the truth in 1 of 150 such draws, by the binomial distribution.
    assert zeros >= 21
    assert products >= 21
    # Half of the estimates would be negative.
    assert 5 <= at_bound <= 19


def test_the_change_of_rz_is_uncertain_as_the_parts_cc_is() -> None:
    rng = np.random.default_rng(62)
    covered = 0
    for seed in range(16):
        die = drawn(rng, SPREADS).with_changes(Rz=float(rng.choice([0.0, 300.0, 2200.0])))
        _, found = both(measured(die, seed))
        covered += held(found.rz_change_ohm, (1.215e-9 - true_zero_s(die)) / die.Cc)
    # 14 or more of 16 hold in 96 of 100 such draws.
    assert covered >= 14


def test_a_delay_that_nobody_stated_bends_the_valley_and_the_interval_follows() -> None:
    # At n = 1 the curvature alone says ±0.4 ns here and there, where chi-square ends within 0.1 ns.
    design = Design.from_elements(NOMINAL, spreads=SPREADS, bench=Bench(load_f=2e-12, load_spread=0.05))
    part = NOMINAL.with_changes(Rz=625.0)
    for seed in range(4):
        _, found = both(measured(part, seed), design)
        assert held(found.zero_time_s, 0.0)
        assert (found.zero_time_s.stderr or 1.0) < 0.1e-9
        assert held(found.gm2_rz, 1.0)


def test_a_zero_on_the_other_side_of_a_delay_that_nobody_stated_is_looked_for() -> None:
    # −1.1 ns with a delay of 0.4 ns, or +1.4 ns with 2.4 ns: up to half of pole 2 either describes the sweep.
    design = Design.from_elements(NOMINAL, spreads=SPREADS, bench=Bench(load_f=2e-12, load_spread=0.05))
    part = NOMINAL.with_changes(Rz=0.0)
    split = 0
    for seed in range(4):
        _, found = both(measured(part, seed, freq_hz=np.geomspace(10, 15e6, 121)), design)
        split += found.is_split
        assert found.doubt is not None or held(found.zero_time_s, true_zero_s(part))
    assert split >= 2
    _, known = both(measured(part, 0, freq_hz=np.geomspace(10, 15e6, 121)))
    assert not known.is_split


# Doubts


def resonance(freq_hz: FloatArray, at_hz: float) -> ComplexArray:
    """A pole pair with a zero pair 2 % farther out, both of a quality of 20."""
    s = 1j * freq_hz / at_hz
    z = s / 1.02
    return np.asarray((1 + z / 20 + z**2) / (1 + s / 20 + s**2))


def test_a_resonance_is_not_the_circuits() -> None:
    freq_hz = np.geomspace(10, 200e6, 281)
    sweep = measured(NOMINAL, 63, freq_hz=freq_hz)
    _, found = both(replace(sweep, gain=sweep.gain * resonance(freq_hz, 30e6)))
    assert (
        found.doubt == "what is there beside the amplifier (a resonance, a doublet, a range step) is not the circuit's"
    )


def test_a_sweep_of_something_else_is_not_described() -> None:
    # A broad pole-zero pair in the band, of which neither design nor circuit knows.
    sweep = measured(NOMINAL, 64)
    odd = (1 + 1j * FREQ_HZ / 2.2e6) / (1 + 1j * FREQ_HZ / 2e6)
    fit = fit_with_design(sweep, DESIGN)
    found = zero_by_circuit(replace(fit, sweep=replace(fit.sweep, gain=fit.sweep.gain * odd)), DESIGN)
    assert isinstance(found, CircuitZero)
    assert found.doubt is not None
    assert found.doubt.startswith("the circuit does not describe the sweep: the residuals")


@pytest.fixture(scope="module")
def healthy() -> LoopFit:
    return fit_with_design(measured(NOMINAL, 65), DESIGN)


def doubt_of(fit: LoopFit, design: Design = DESIGN) -> str:
    """The doubt about the circuit of a fit."""
    found = zero_by_circuit(fit, design)
    assert isinstance(found, CircuitZero)
    assert found.doubt is not None
    return found.doubt


def test_another_answer_than_that_of_two_poles_and_a_zero_is_one_too_many(healthy: LoopFit) -> None:
    assert isinstance(found := zero_by_circuit(healthy, DESIGN), CircuitZero)
    assert found.doubt is None
    elsewhere = Estimate.gaussian(1.0e-9, 2e-12, quantile=1.96)
    fit = replace(healthy, parameters=replace(healthy.parameters, zero_time_s=elsewhere))
    assert "the circuit puts the zero time at 1.2" in doubt_of(fit)
    assert "two poles and a zero at 1.0000 ± 0.0020 ns" in doubt_of(fit)


def test_what_two_poles_and_a_zero_see_the_circuit_must_see(healthy: LoopFit, monkeypatch: pytest.MonkeyPatch) -> None:
    # 20 % smaller residuals: chi-square of 2·141 numbers less by a third.
    smaller = 0.8 * healthy.residuals()
    monkeypatch.setattr(LoopFit, "residuals", lambda _: smaller)
    assert doubt_of(healthy).startswith("the circuit leaves more of the sweep unexplained than two poles and a zero do")


def with_changed_estimate(monkeypatch: pytest.MonkeyPatch, changes: Mapping[str, object]) -> None:
    """Let the element estimate come out otherwise."""
    genuine = estimate_elements

    def changed(*args: object, **kwargs: object) -> ElementEstimate:
        estimate: ElementEstimate = genuine(*args, **kwargs)  # type: ignore[arg-type]  # passed through as given
        return replace(estimate, **changes)  # type: ignore[arg-type]  # fields by name

    monkeypatch.setattr("fitamp.comparison.circuit_zero.estimate_elements", changed)


def test_two_sets_of_elements_are_a_doubt_and_the_other_zero_is_kept(
    healthy: LoopFit, monkeypatch: pytest.MonkeyPatch
) -> None:
    other = NOMINAL.with_changes(Rz=200.0, Cgd=1e-15)
    with_changed_estimate(monkeypatch, {"other_valley": other})
    found = zero_by_circuit(healthy, DESIGN)
    assert isinstance(found, CircuitZero)
    assert found.doubt == "two sets of elements describe the sweep equally well"
    assert found.of_other_set is not None
    assert found.of_other_set.value == pytest.approx(true_zero_s(other))
    assert found.of_other_set.stderr == found.zero_time_s.stderr


def test_a_circuit_that_cannot_be_fitted_is_a_sentence(healthy: LoopFit, monkeypatch: pytest.MonkeyPatch) -> None:
    def failing(*_: object, **__: object) -> None:
        raise FitError("part.csv: no start leads to a circuit")

    monkeypatch.setattr("fitamp.comparison.circuit_zero.estimate_elements", failing)
    assert zero_by_circuit(healthy, DESIGN) == "no circuit could be fitted: part.csv: no start leads to a circuit"


def test_a_band_without_the_zero_leaves_it_open() -> None:
    fit = fit_with_design(measured(NOMINAL, 66, freq_hz=np.geomspace(10, 0.5e6, 101)), DESIGN)
    assert doubt_of(fit) == "the circuit leaves the zero open"


def test_the_load_alone_is_set_free(healthy: LoopFit) -> None:
    found = zero_by_circuit(healthy, DESIGN)
    assert isinstance(found, CircuitZero)
    own, free = found.estimate.circuit.parameters, found.solution.circuit.parameters
    changed = [other for one, other in zip(own, free, strict=True) if one != other]
    assert changed == [Parameter(name="CL", scale=4e-12, prior_sd=float(np.log(2)))]
    # Where the design marks it as under test it has no prior at all, and stays so.
    tested = zero_by_circuit(healthy, replace(DESIGN, under_test=DESIGN.under_test | {"CL"}))
    assert isinstance(tested, CircuitZero)
    assert tested.solution.circuit == tested.estimate.circuit
