"""The door to element values: `estimate_elements`, from sweeps and a design to elements with intervals."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.arrays import frozen_float
from fitamp.design import Design
from fitamp.elements.agreement import agreed
from fitamp.elements.behavioural import behavioural_fit
from fitamp.elements.circuit import BENCH_DELAY, BENCH_LOAD, MIRROR_POLE, UNITS, Circuit
from fitamp.elements.condition import Condition
from fitamp.elements.derived import derived_quantities, element_parasitics
from fitamp.elements.intervals import estimate_number
from fitamp.elements.notes import notes_on
from fitamp.elements.posterior import informed_shares
from fitamp.elements.residual import Measured
from fitamp.elements.result import ElementEstimate, EstimatedElement
from fitamp.elements.search import Found, floored, search
from fitamp.elements.taken import with_what_is_beside
from fitamp.errors import UsageError
from fitamp.estimate import Estimate, two_sided_95
from fitamp.fitting import LoopFit
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["estimate_elements"]

# What the noise levels of a sweep take from its degrees of freedom.
LEVELS = 5


def estimate_elements(
    sweeps: Sweep | Sequence[Sweep],
    design: Design,
    *,
    conditions: Condition | Sequence[Condition] | None = None,
    under_test: Iterable[str] = (),
    noise: NoiseLevels | None = None,
    fits: Sequence[LoopFit] | None = None,
    keep_all: bool = False,
) -> ElementEstimate:
    """Estimate the elements of one part from one or many sweeps of it.

    Parameters
    ----------
    sweeps
        Loop gain of the same part, positive real at DC. One sweep tells five numbers or so about eight elements and
        hands the rest of the design's spreads back; two or three added loads and resistances tell them all.
    design
        With elements. Its spreads are lognormal priors, one standard deviation of the logarithm; of Rz, which may be
        0, and of the bench's delay they are Gaussian. What has no spread (0) is held.
    conditions
        What was added in each sweep; nothing where None.
    under_test
        Elements without prior, in addition to those that the design has under test (Rz unless it says otherwise).
    noise
        Noise levels of all sweeps; where neither this nor ``sweep.noise`` is given they are estimated, sweep by sweep.
    fits
        Fits of two poles and a zero to these very sweeps, where there are such; else they are made.
    keep_all
        Keep glitches and mains lines, which are otherwise left out, and a sweep that plainly shows another part than
        all others do.

    Returns
    -------
    ElementEstimate
        Of a sweep that the circuit does not describe, or that stands apart from the others, the notes say so.

    Raises
    ------
    UsageError
        When the arguments do not belong together, or the design gives roots.
    FitError
        When a sweep cannot be fitted.

    Notes
    -----
    The exact third-order circuit is fitted to all sweeps together, by the loop-equation residual; the mode of the
    posterior is found by least squares with the priors as further residuals (A. Gelman and others, Bayesian Data
    Analysis, ch. 14), and intervals follow from its curvature in the logarithms, or from profiles.
    """
    given = [sweeps] if isinstance(sweeps, Sweep) else list(sweeps)
    states = _conditions(conditions, len(given))
    _check(given, design, states, fits)
    circuit = Circuit.from_design(design, under_test=under_test)
    if fits is None:
        fits = [
            behavioural_fit(sweep, design, state, noise=noise, keep_all=keep_all)
            for sweep, state in zip(given, states, strict=True)
        ]
    is_given = [noise is not None or sweep.noise is not None for sweep in given]
    measured = [
        Measured(sweep=fit.sweep, condition=state, noise=floored(noise or fit.noise))
        for fit, state in zip(fits, states, strict=True)
    ]
    found = search(circuit, measured, fits, noise_is_given=is_given)
    freedom = sum(1e9 if given else len(one.sweep) - LEVELS for given, one in zip(is_given, measured, strict=True))
    return _result(design, found, measured, fits, quantile=two_sided_95(freedom), keep_all=keep_all)


def _result(
    design: Design,
    found: Found,
    measured: Sequence[Measured],
    fits: Sequence[LoopFit],
    *,
    quantile: float,
    keep_all: bool,
) -> ElementEstimate:
    agreement = agreed(with_what_is_beside(found.best, fits), quantile=quantile, keep_all=keep_all)
    solution = agreement.solution
    circuit = solution.circuit
    covariance = solution.covariance
    shares = informed_shares(circuit, covariance)
    agree = agreement.contradiction is None
    if agreement.contradiction is not None:
        covariance = covariance + agreement.contradiction
    estimates = {
        name: (
            estimate_number(solution, index, covariance, quantile=quantile, may_profile=agree),
            float(shares[index]),
        )
        for index, name in enumerate(circuit.names)
    }
    present = [
        name for name in (*ELEMENT_NAMES, "Cgd", MIRROR_POLE) if name in ELEMENT_NAMES or _nominal(circuit, name)
    ]
    on_bench = [name for name in (BENCH_LOAD, BENCH_DELAY) if name in estimates or _nominal(circuit, name)]
    elements, bench = (
        tuple(_estimated(name, circuit, design, estimates) for name in names) for names in (present, on_bench)
    )
    other = found.other
    result = ElementEstimate(
        design=design,
        sweeps=tuple(one.sweep for one in measured),
        conditions=tuple(one.condition for one in measured),
        elements=elements,
        bench=bench,
        derived=derived_quantities(circuit, solution.values, covariance, quantile=quantile),
        parasitics=element_parasitics(solution, quantile=quantile),
        checks=agreement.checks,
        notes=(),
        other_valley=None if other is None else other.circuit.elements(other.values),
        fits=tuple(fits),
        solution=solution,
        covariance=frozen_float(covariance),
        quantile=quantile,
    )
    return replace(result, notes=notes_on(result))


def _estimated(
    name: str, circuit: Circuit, design: Design, estimates: dict[str, tuple[Estimate, float]]
) -> EstimatedElement:
    designed = _nominal(circuit, name)
    if name == BENCH_DELAY and design.bench.delay_s is None:
        designed = None
    if name not in estimates:
        held = Estimate(value=designed, stderr=None, ci95=(None, None))
        return EstimatedElement(
            name=name, unit=UNITS[name], designed=designed, estimate=held, informed=0.0, spread=0.0, held=True
        )
    estimate, informed = estimates[name]
    parameter = circuit.parameters[circuit.names.index(name)]
    spread = parameter.prior_sd
    if spread is not None and not parameter.is_log:
        spread *= parameter.scale / (designed if name == "Rz" and designed else 1.0)
    return EstimatedElement(
        name=name, unit=UNITS[name], designed=designed, estimate=estimate, informed=informed, spread=spread
    )


def _nominal(circuit: Circuit, name: str) -> float | None:
    if name == BENCH_LOAD:
        return circuit.bench_load_f
    if name == BENCH_DELAY:
        return circuit.bench_delay_s
    value: float | None = getattr(circuit.nominal, name)
    return value


def _conditions(conditions: Condition | Sequence[Condition] | None, count: int) -> list[Condition]:
    if conditions is None:
        return [Condition()] * count
    return [conditions] if isinstance(conditions, Condition) else list(conditions)


def _check(
    sweeps: Sequence[Sweep], design: Design, conditions: Sequence[Condition], fits: Sequence[LoopFit] | None
) -> None:
    if not isinstance(design, Design) or not all(isinstance(sweep, Sweep) for sweep in sweeps):
        raise UsageError("estimate_elements takes sweeps and a design: read them with read_sweep and read_design")
    if not sweeps:
        raise UsageError("there is no sweep to estimate elements from; give at least one")
    for what, others in (("conditions", conditions), ("fits", fits)):
        if others is not None and len(others) != len(sweeps):
            raise UsageError(f"{len(sweeps)} sweeps, but {len(others)} {what}; give one for each sweep")
