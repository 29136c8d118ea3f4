"""What the estimated part would do with another load or another resistor, with bands for what is not known of it.

Crossover and phase margin are smooth, and their bands are those of linear propagation with exact derivatives. Overshoot
ends at 0 and settling jumps where a swing enters its band, so that no derivative tells how far they reach: their bands
are quantiles over samples of the estimate, from a fixed seed, one sample from each of as many slices of every principal
direction (M. D. McKay, R. J. Beckman and W. J. Conover, Technometrics 21, 1979).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike

from fitamp.amplifier import Elements
from fitamp.arrays import FloatArray, frozen_float
from fitamp.elements.circuit import BENCH_LOAD
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
from fitamp.elements.result import ElementEstimate
from fitamp.errors import UsageError
from fitamp.margins import closed_loop_step, margins

__all__ = ["Against", "Band", "Prediction", "predict", "resistors_about"]

# Loads and resistors looked at where none are given: so many, over this range about the part's own.
POINTS = 25
LOAD_RANGE = (0.25, 4.0)
RESISTOR_RANGE = (0.0, 2.5)
SAMPLES = 100
INTERVAL = (0.025, 0.975)

Setting = Callable[[Elements, float], Elements]


class Against(StrEnum):
    """What is varied."""

    LOAD = "load"  # all that is at the output, chip included
    ADDED_LOAD = "added-load"  # beside what chip and bench have
    RESISTOR = "resistor"

    @property
    def unit(self) -> str:
        """Unit of its values."""
        return "Ω" if self is Against.RESISTOR else "F"

    @property
    def replaced(self) -> tuple[str, ...]:
        """Numbers of the vector in whose place it stands."""
        return {"load": ("CL", BENCH_LOAD), "added-load": (), "resistor": ("Rz",)}[self.value]

    def set_to(self, elements: Elements, value: float) -> Elements:
        """An amplifier with this value."""
        if self is Against.RESISTOR:
            return replace(elements, Rz=value)
        return replace(elements, CL=value if self is Against.LOAD else elements.CL + value)

    def of(self, elements: Elements) -> float:
        """The value that an amplifier has."""
        return {"load": elements.CL, "added-load": 0.0, "resistor": elements.Rz}[self.value]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Band:
    """A curve with its 95 % band, shapes (n,); NaN where the quantity does not exist (no crossover, not stable)."""

    value: FloatArray
    low: FloatArray
    high: FloatArray
    designed: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Prediction:
    """The estimated part over its load or its resistor.

    at : whole or added load (F) or nulling resistor (Ω), rising, shape (n,)
    estimated_at, designed_at : where the part is, and where it was designed to be, both with the bench's load
    crossover_hz, phase_margin_deg, overshoot (fraction), settling_s (to 1 %): each with the designed curve beside it
    """

    against: Against
    at: FloatArray
    estimated_at: float
    designed_at: float
    crossover_hz: Band
    phase_margin_deg: Band
    overshoot: Band
    settling_s: Band

    def items(self) -> tuple[tuple[str, Band], ...]:
        """(name, band) pairs."""
        names = ("crossover_hz", "phase_margin_deg", "overshoot", "settling_s")
        return tuple((name, getattr(self, name)) for name in names)


def predict(
    estimate: ElementEstimate,
    *,
    load_f: ArrayLike | None = None,
    load_added_f: ArrayLike | None = None,
    rz_ohm: ArrayLike | None = None,
    samples: int = SAMPLES,
    seed: int = 1,
) -> Prediction:
    """Phase margin, crossover, overshoot and settling of the estimated part over its load or over its resistor.

    Parameters
    ----------
    load_f : array_like, shape (n,)
        Whole loads at the output in F, chip included. Where nothing is given: a quarter to four times the part's own
        on the bench. They count as exact; what is not known of the part's own load has no part in the band.
    load_added_f : array_like, shape (n,)
        Loads in F, 0 or more, beside the part's own on the bench. Where one sweep tells the load only as a ratio, this
        has the narrower band.
    rz_ohm : array_like, shape (n,)
        Nulling resistors in Ω, 0 or more, with the part's own load on the bench.
    samples, seed
        For overshoot and settling.

    Raises
    ------
    UsageError
        When more than one of these is given, or a value is not finite, negative, or a whole load of 0, or there is no
        value at all.
    """
    given = {Against.LOAD: load_f, Against.ADDED_LOAD: load_added_f, Against.RESISTOR: rz_ohm}
    stated = {against: values for against, values in given.items() if values is not None}
    if len(stated) > 1:
        raise UsageError("predict goes over one thing; give one of load_f, load_added_f and rz_ohm")
    against, values = next(iter(stated.items()), (Against.LOAD, None))
    part = estimate.circuit.loaded(estimate.vector)
    design = estimate.circuit.loaded(estimate.circuit.designed)
    at = part.CL * np.geomspace(*LOAD_RANGE, POINTS) if values is None else _checked(values, against)
    designed = np.array([_of_step_and_margins(against.set_to(design, float(value))) for value in at])
    crossover, phase_margin = _linear(estimate, part, against, at, designed[:, :2])
    overshoot, settling = _sampled(estimate, part, against, at, designed[:, 2:], samples=samples, seed=seed)
    return Prediction(
        against=against,
        at=frozen_float(at),
        estimated_at=against.of(part),
        designed_at=against.of(design),
        crossover_hz=crossover,
        phase_margin_deg=phase_margin,
        overshoot=overshoot,
        settling_s=settling,
    )


def resistors_about(estimate: ElementEstimate) -> FloatArray:
    """Resistors to predict over: from none to two and a half times the larger of designed and estimated one."""
    elements = (estimate.amplifier, estimate.circuit.nominal)
    most = max(*(one.Rz for one in elements), *(1 / one.gm2 for one in elements))
    return np.linspace(RESISTOR_RANGE[0] * most, RESISTOR_RANGE[1] * most, POINTS)


def _checked(values: ArrayLike, against: Against) -> FloatArray:
    at = np.unique(np.atleast_1d(np.asarray(values, dtype=float)))
    least = np.finfo(float).tiny if against is Against.LOAD else 0.0
    if len(at) == 0 or not np.isfinite(at).all() or (at < least).any():
        what = {"load": "loads above 0 F", "added-load": "added loads of 0 F or more"}
        raise UsageError(f"predict needs finite {what.get(against.value, 'resistors of 0 Ω or more')}; at least one")
    return np.asarray(at, dtype=float)


def _linear(
    estimate: ElementEstimate, part: Elements, against: Against, at: FloatArray, designed: FloatArray
) -> tuple[Band, Band]:
    rows = []
    for value in at:
        found = quantities_and_slopes(against.set_to(part, float(value)))
        row = []
        for quantity in (Quantity.CROSSOVER, Quantity.PHASE_MARGIN):
            centre, slopes = found[quantity]
            by_values = by_vector(estimate.circuit, estimate.vector, slopes, without=against.replaced)
            reach = estimate.quantile * math.sqrt(max(float(by_values @ estimate.covariance @ by_values), 0.0))
            row.append((math.nan if centre is None else centre, reach))
        rows.append(row)
    (crossover, reach_hz), (phase_margin, reach_deg) = np.moveaxis(np.array(rows), 0, 2)
    with np.errstate(all="ignore"):
        # A frequency keeps its sign: its band is symmetric in the logarithm.
        factor = np.exp(reach_hz / crossover)
    return (
        _band(crossover, crossover / factor, crossover * factor, designed[:, 0]),
        _band(phase_margin, phase_margin - reach_deg, phase_margin + reach_deg, designed[:, 1]),
    )


def _sampled(
    estimate: ElementEstimate,
    part: Elements,
    against: Against,
    at: FloatArray,
    designed: FloatArray,
    *,
    samples: int,
    seed: int,
) -> tuple[Band, Band]:
    centre = np.array([_of_step(against.set_to(part, float(value))) for value in at])
    drawn = [estimate.circuit.loaded(values) for values in sampled_vectors(estimate, samples, seed)]
    cloud = np.array([[_of_step(against.set_to(one, float(value))) for value in at] for one in drawn])
    bands = []
    for column in range(2):
        values = cloud[:, :, column]
        # Of a load with which some samples are not stable no band is known.
        ends = np.quantile(values, INTERVAL, axis=0)
        low, high = np.fmin(ends[0], centre[:, column]), np.fmax(ends[1], centre[:, column])
        exists = np.isfinite(ends).all(axis=0)
        bands.append(
            _band(centre[:, column], np.where(exists, low, np.nan), np.where(exists, high, np.nan), designed[:, column])
        )
    return bands[0], bands[1]


def sampled_vectors(estimate: ElementEstimate, samples: int, seed: int) -> FloatArray:
    """Vectors drawn from the estimate, shape (samples, p), Rz kept at 0 or more."""
    from scipy.special import ndtri

    rng = np.random.default_rng(seed)
    variances, directions = np.linalg.eigh(estimate.covariance)
    count = len(variances)
    slices = np.array([rng.permutation(samples) for _ in range(count)])
    deviates = ndtri((slices + rng.uniform(size=slices.shape)) / samples)
    vectors = estimate.vector + (directions @ (np.sqrt(np.maximum(variances, 0.0))[:, np.newaxis] * deviates)).T
    index = estimate.circuit.index("Rz")
    if index is not None:
        vectors[:, index] = np.maximum(vectors[:, index], 0.0)
    return np.asarray(vectors, dtype=float)


def _of_step(elements: Elements) -> tuple[float, float]:
    step = closed_loop_step(elements.transfer())
    if step.overshoot is None or step.settling_s is None:
        return math.nan, math.nan
    return step.overshoot, step.settling_s


def _of_step_and_margins(elements: Elements) -> tuple[float, float, float, float]:
    seen = margins(elements.transfer())
    crossover, phase_margin = (
        math.nan if value is None else value for value in (seen.crossover_hz, seen.phase_margin_deg)
    )
    return crossover, phase_margin, *_of_step(elements)


def _band(value: FloatArray, low: FloatArray, high: FloatArray, designed: FloatArray) -> Band:
    return Band(
        value=frozen_float(value), low=frozen_float(low), high=frozen_float(high), designed=frozen_float(designed)
    )
