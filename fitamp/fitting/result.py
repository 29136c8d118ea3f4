"""What a fit returns: frozen, every field declared, `Known` where a number cannot be had."""

from __future__ import annotations

import html
from dataclasses import dataclass, fields
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.estimate import Estimate
from fitamp.fitting.adequacy import Adequacy
from fitamp.fitting.two_pole import Solution
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer
from fitamp.units import si, si_with_error

__all__ = [
    "FitWarning",
    "FittedMargins",
    "FittedParameters",
    "FittedStep",
    "LoopFit",
    "Root",
    "WarningCode",
    "ZeroPlace",
    "ZeroSeen",
]

MODEL_NAME = "two-pole-one-zero"
# With further roots, as vector fitting of rising order suggests them.
RICHER_MODEL_NAME = "vector-fit"


class ZeroPlace(StrEnum):
    """Where the zero is, as far as the sweep alone can tell."""

    LEFT = "left"
    RIGHT = "right"
    INFINITY = "infinity"
    UNDECIDED = "undecided"


class WarningCode(StrEnum):
    """What a reader of a fit must know; stable names for scripts."""

    MODEL_INADEQUATE = "model-inadequate"
    POLE1_BELOW_BAND = "pole1-below-band"
    POLE2_ABOVE_BAND = "pole2-above-band"
    ZERO_UNDETERMINED = "zero-undetermined"
    LAG_AMBIGUITY = "lag-ambiguity"
    LAG_FITTED = "lag-fitted"
    CROSSOVER_OUTSIDE_BAND = "crossover-outside-band"
    NO_CROSSOVER = "no-crossover"
    OUTLYING_POINTS = "outlying-points"
    RESONANCE = "resonance"
    DOUBLET = "doublet"
    FURTHER_POLE = "further-pole"
    RANGE_STEP = "range-step"
    UNSTABLE_ROOT = "unstable-root"
    DELAY_NOT_STATED = "delay-not-stated"
    DELAY_CONTRADICTED = "delay-contradicted"
    FAR_FROM_DESIGN = "far-from-design"
    PRODUCT_NEGATIVE = "product-negative"
    CIRCUIT_SET_ASIDE = "circuit-set-aside"


@dataclass(frozen=True, slots=True, kw_only=True)
class FitWarning:
    """A warning with a stable code and a plain sentence."""

    code: WarningCode
    message: str


@dataclass(frozen=True, slots=True, kw_only=True)
class FittedParameters:
    """Estimates of the model's quantities, SI units; poles as positive distances.

    zero_pole2_split_s is τz − a2/a1, about τz − 1/pole 2: what remains known where the zero lies on pole 2 or both lie
    above the band.
    """

    dc_gain: Estimate
    gain_bandwidth_hz: Estimate
    pole1_hz: Estimate
    pole2_hz: Estimate
    zero_time_s: Estimate
    delay_s: Estimate
    far_pole_s: Estimate
    zero_pole2_split_s: Estimate

    def items(self) -> tuple[tuple[str, Estimate], ...]:
        """(name, estimate) pairs in declared order."""
        return tuple((field.name, getattr(self, field.name)) for field in fields(self))


@dataclass(frozen=True, slots=True, kw_only=True)
class FittedMargins:
    """Margins and closed-loop step of the fitted response, without the path delay of the bench.

    overshoot is a fraction of the final value; settling_s is to within 1 % of it.
    """

    crossover_hz: Estimate
    phase_margin_deg: Estimate
    gain_margin_db: Estimate
    overshoot: Estimate
    settling_s: Estimate

    def items(self) -> tuple[tuple[str, Estimate], ...]:
        """(name, estimate) pairs in declared order."""
        return tuple((field.name, getattr(self, field.name)) for field in fields(self))


@dataclass(frozen=True, slots=True, kw_only=True)
class Root:
    """A pole or zero as s-plane root over 2π (Hz), with the covariance of (re, im), shape (2, 2), where measured."""

    value_hz: complex
    covariance: FloatArray | None


@dataclass(frozen=True, slots=True, kw_only=True)
class FittedStep:
    """A receiver's change of range at `f_hz`: from there on all that was read is larger and turned by so much."""

    f_hz: float
    size_db: Estimate
    turn_deg: Estimate


@dataclass(frozen=True, slots=True, kw_only=True)
class ZeroSeen:
    """Half plane of the zero and its distance; an open end of `ci95_hz` reaches to infinity."""

    half_plane: ZeroPlace
    frequency_hz: float | None
    ci95_hz: tuple[float | None, float | None]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LoopFit:
    """A two-pole, one-zero loop gain fitted to a sweep.

    response : gain and all roots at the optimum, without path delay and without what was known beforehand
    resonant_poles, resonant_zeros : roots of resonances beside the two poles and the zero, empty where none was needed;
        of each pair the upper half first
    doublet_poles, doublet_zeros : real pole-zero pairs beside them, in the same order
    further_poles : single real poles beside them, inside the band
    range_steps : steps of a receiver's range that were fitted; they are the bench's and not in `response`
    solution : parameter vector, covariance and residuals, for those who derive further quantities
    quantile : Student's t by which 95 % intervals are wider than a standard error
    """

    sweep: Sweep
    response: Transfer
    parameters: FittedParameters
    zero: ZeroSeen
    poles: tuple[Root, ...]
    zeros: tuple[Root, ...]
    resonant_poles: tuple[Root, ...]
    resonant_zeros: tuple[Root, ...]
    doublet_poles: tuple[Root, ...]
    doublet_zeros: tuple[Root, ...]
    further_poles: tuple[Root, ...]
    range_steps: tuple[FittedStep, ...]
    margins: FittedMargins
    adequacy: Adequacy
    warnings: tuple[FitWarning, ...]
    solution: Solution
    quantile: float

    @property
    def noise(self) -> NoiseLevels:
        """The noise by which the residuals were weighted."""
        return self.solution.noise

    @property
    def model_name(self) -> str:
        """Name of the model in reports and JSON."""
        return RICHER_MODEL_NAME if self.resonant_poles or self.doublet_poles or self.further_poles else MODEL_NAME

    @property
    def named_poles(self) -> tuple[tuple[str, Root], ...]:
        """Every pole with its name; the third is named so wherever it was fitted, in band or above."""
        names = [f"pole {count}" for count in range(1, len(self.poles) + 1)]
        named = _named(names, self.poles, self.resonant_poles, self.doublet_poles)
        return (*named, *(("further pole", pole) for pole in self.further_poles))

    @property
    def named_zeros(self) -> tuple[tuple[str, Root], ...]:
        """Every zero with its name."""
        return _named(["zero"] * len(self.zeros), self.zeros, self.resonant_zeros, self.doublet_zeros)

    @property
    def covariance(self) -> FloatArray:
        """Covariance of the parameter vector, widened where the model is not adequate."""
        return np.asarray(self.solution.covariance * self.adequacy.inflation)

    def evaluate(self, freq_hz: ArrayLike) -> ComplexArray:
        """Fitted loop gain as the bench sees it (delay and known factor included), shape (n,)."""
        return self.solution.model.gain(self.solution.values, np.atleast_1d(np.asarray(freq_hz, dtype=float)))

    def residuals(self) -> ComplexArray:
        """Loop-equation residuals in standard deviations per component, shape (n,)."""
        return self.solution.residuals

    def __str__(self) -> str:
        rows = self._rows()
        width = max(len(row[0]) for row in rows)
        return "\n".join(f"{name:<{width}}  {text}" for name, text in rows)

    __repr__ = __str__

    def _repr_html_(self) -> str:
        cells = (f"<tr><th>{html.escape(n)}</th><td>{html.escape(t)}</td></tr>" for n, t in self._rows())
        return f"<table>{''.join(cells)}</table>"

    def _rows(self) -> list[tuple[str, str]]:
        rows = [("file", self.sweep.origin.file), ("model", f"{self.model_name}; {self.adequacy.sentence}")]
        rows += [(name, text_of(name, estimate)) for name, estimate in self.parameters.items()]
        rows.append(("zero", self.zero.half_plane.value))
        rows += [(name, text_of(name, estimate)) for name, estimate in self.margins.items()]
        rows += [(f"warning: {warning.code.value}", warning.message) for warning in self.warnings]
        return rows


def _named(
    names: list[str], own: tuple[Root, ...], resonant: tuple[Root, ...], doublets: tuple[Root, ...]
) -> tuple[tuple[str, Root], ...]:
    all_names = [*names, *["resonance"] * len(resonant), *["doublet"] * len(doublets)]
    return tuple(zip(all_names, (*own, *resonant, *doublets), strict=True))


# What each quantity is called.
LABELS = {
    "dc_gain": "T(0)",
    "gain_bandwidth_hz": "gain-bandwidth",
    "pole1_hz": "pole 1",
    "pole2_hz": "pole 2",
    "zero_time_s": "zero time τz",
    "delay_s": "path delay",
    "far_pole_s": "third pole time",
    "zero_pole2_split_s": "τz − 1/pole 2",
    "crossover_hz": "crossover",
    "phase_margin_deg": "phase margin",
    "gain_margin_db": "gain margin",
    "overshoot": "overshoot",
    "settling_s": "settling to 1 %",
}
# How each quantity is written: unit by the end of its name.
_UNIT_BY_SUFFIX = {"_hz": "Hz", "_s": "s", "_deg": "°", "_db": "dB", "_f": "F", "_ohm": "Ω"}


def unit_of(quantity: str) -> str:
    """SI unit of a quantity by the suffix of its name; V/V for a plain gain."""
    for suffix, unit in _UNIT_BY_SUFFIX.items():
        if quantity.endswith(suffix):
            return unit
    return "V/V" if quantity == "dc_gain" else ""


def text_of(quantity: str, estimate: Estimate) -> str:
    """An estimate as text, such as "58.23 ± 0.12 MHz", "above 1.2 GHz" or "undetermined"."""
    unit = unit_of(quantity)
    low, high = estimate.ci95
    if estimate.is_measured:
        return si_with_error(estimate.value, estimate.stderr, unit)
    if estimate.value is not None:
        return si(estimate.value, unit)
    if low is not None and high is not None:
        return f"{si(low, unit)} to {si(high, unit)}"
    if low is not None:
        return f"above {si(low, unit)}"
    if high is not None:
        return f"below {si(high, unit)}"
    return "undetermined"
