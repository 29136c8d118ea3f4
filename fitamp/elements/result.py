"""What an element estimate returns: frozen, every field declared, `Known` where a number cannot be had."""

from __future__ import annotations

from dataclasses import dataclass, fields
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.design import Design
from fitamp.elements.circuit import MIRROR_POLE, Circuit
from fitamp.elements.condition import Condition
from fitamp.elements.solving import CircuitSolution
from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit
from fitamp.fitting.adequacy import Adequacy
from fitamp.sweep import Sweep

__all__ = [
    "DerivedQuantities",
    "ElementEstimate",
    "ElementNote",
    "ElementNoteCode",
    "ElementParasitics",
    "EstimatedElement",
    "SweepCheck",
]

# From here on more of what is known of an element came from the data than from the design.
MOSTLY_INFORMED = 0.5


class ElementNoteCode(StrEnum):
    """What a reader of an element estimate must know; stable names for scripts."""

    PART_CHANGED = "part-changed"
    CIRCUIT_INADEQUATE = "circuit-inadequate"
    NOT_CONVERGED = "not-converged"
    TWO_VALLEYS = "two-valleys"
    FAR_FROM_DESIGN = "far-from-design"
    RESISTOR_AT_LEAST = "resistor-at-least"
    UNDETERMINED = "undetermined"
    NOT_INFORMED = "not-informed"
    DELAY_NOT_STATED = "delay-not-stated"
    TEMPERATURES_DIFFER = "temperatures-differ"
    FACTOR_TAKEN_OVER = "factor-taken-over"


@dataclass(frozen=True, slots=True, kw_only=True)
class ElementNote:
    """A note with a stable code and a plain sentence; `files` are the sweeps it is about, empty for all."""

    code: ElementNoteCode
    message: str
    files: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class EstimatedElement:
    """One element, or one number of the bench, in SI units.

    name, unit : "gm1" … "Rz", "Cgd", "mirror_pole_hz", "bench_load_f", "bench_delay_s"; "S", "Ω", "F", "Hz", "s"
    designed : None for a bench delay that is not stated
    estimate : best value, standard error and 95 % interval. Of an element that is held as designed the value alone
    informed : share of what is known that came from the data, 0 to 1: one minus posterior variance over prior variance
        of the logarithm (of the value itself for Rz and the delay). 0 means that the design's own spread was handed
        back, 1 that the design plays no part. Without a prior it is 1 where the data determine the value, else 0
    spread : relative standard deviation of the prior (absolute, in s, for the delay); None without a prior
    held : whether the number was not estimated because the design gives it no spread
    """

    name: str
    unit: str
    designed: float | None
    estimate: Estimate
    informed: float
    spread: float | None
    held: bool = False

    @property
    def is_informed(self) -> bool:
        """Whether more came from the data than from the design."""
        return self.informed >= MOSTLY_INFORMED

    @property
    def deviation(self) -> float | None:
        """(estimate − designed)/designed; None where either is missing or the design has 0."""
        if self.estimate.value is None or not self.designed:
            return None
        return self.estimate.value / self.designed - 1


@dataclass(frozen=True, slots=True, kw_only=True)
class DerivedQuantities:
    """What follows from the elements, with the bench's load on them and nothing added, without the bench's delay.

    zero_time_s : Cc·(Rz − 1/gm2) − Cgd/gm2, above 0 in the left half plane; gm2_rz : gm2·Rz
    poles as positive distances (of a pair, the distance of either); overshoot as a fraction of the final value;
    settling to within 1 % of it. Margins include a mirror pole and the loop's own delay.
    """

    zero_time_s: Estimate
    gm2_rz: Estimate
    dc_gain: Estimate
    gain_bandwidth_hz: Estimate
    pole1_hz: Estimate
    pole2_hz: Estimate
    pole3_hz: Estimate
    crossover_hz: Estimate
    phase_margin_deg: Estimate
    gain_margin_db: Estimate
    overshoot: Estimate
    settling_s: Estimate

    def items(self) -> tuple[tuple[str, Estimate], ...]:
        """(name, estimate) pairs in declared order."""
        return tuple((field.name, getattr(self, field.name)) for field in fields(self))


@dataclass(frozen=True, slots=True, kw_only=True)
class ElementParasitics:
    """Capacitance that nobody designed, in F, by the sweeps: the design's spread of the very element plays no part.

    load_total_f : CL with the bench's load; load_f : load_total_f less designed CL less the bench's load as stated,
        its spread in the error; first_stage_f : C1 less the designed C1
    """

    load_total_f: Estimate
    load_f: Estimate
    first_stage_f: Estimate


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepCheck:
    """Whether one sweep belongs to the elements that all share.

    adequacy : its residuals against its noise, all elements shared
    change_chance : chance of a misfit like this sweep's if the part is the same in all; None for a single sweep
    changed : whether that is too small to be chance, and this is the sweep that stands apart, or may be
    left_out : whether the estimate was made without it, because it plainly stands apart
    suspect : the element whose deviation in this sweep alone explains most of it; suspect_change : by how much it
        would be larger there, in SI units. Both None where nothing changed
    """

    file: str
    condition: Condition
    points: int
    adequacy: Adequacy
    change_chance: float | None
    changed: bool = False
    left_out: bool = False
    suspect: str | None = None
    suspect_change: Estimate | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ElementEstimate:
    """Elements estimated from one or many sweeps of one part.

    sweeps, conditions : what was given, without bad points; also a sweep that stands apart from the others
    elements : gm1, R1, C1, gm2, R2, CL, Cc, Rz, and Cgd and mirror_pole_hz where the design has them
    bench : the bench's load and delay, where there are such
    other_valley : other elements that the sweeps do not exclude, where there are such
    fits : two poles and a zero fitted to each sweep, with the design's expectation for what was added
    solution : the vector and the sweeps it was fitted to
    covariance : of the vector, shape (p, p), for those who derive further quantities with `circuit`
    quantile : Student's t by which 95 % intervals are wider than a standard error
    """

    design: Design
    sweeps: tuple[Sweep, ...]
    conditions: tuple[Condition, ...]
    elements: tuple[EstimatedElement, ...]
    bench: tuple[EstimatedElement, ...]
    derived: DerivedQuantities
    parasitics: ElementParasitics
    checks: tuple[SweepCheck, ...]
    notes: tuple[ElementNote, ...]
    other_valley: Elements | None
    fits: tuple[LoopFit, ...]
    solution: CircuitSolution
    covariance: FloatArray
    quantile: float

    @property
    def circuit(self) -> Circuit:
        """The model of the vector."""
        return self.solution.circuit

    @property
    def vector(self) -> FloatArray:
        """The estimated vector, shape (p,), in the order of ``circuit.names``."""
        return self.solution.values

    @property
    def amplifier(self) -> Elements:
        """The estimated elements as an amplifier, without what the bench adds."""
        return self.circuit.elements(self.vector)

    @property
    def is_consistent(self) -> bool:
        """Whether every sweep belongs to the same elements."""
        return not any(check.changed for check in self.checks)

    @property
    def is_trustworthy(self) -> bool:
        """Whether the fit converged in one valley and describes every sweep that was not left out."""
        return (
            self.solution.optimum.converged
            and self.other_valley is None
            and all(check.left_out or (check.adequacy.adequate and not check.changed) for check in self.checks)
        )

    @property
    def zero_time_s(self) -> Estimate:
        """Zero time; above 0 in the left half plane."""
        return self.derived.zero_time_s

    def element(self, name: str) -> EstimatedElement:
        """One element or number of the bench by name.

        Raises
        ------
        KeyError
            When there is none of that name.
        """
        for one in (*self.elements, *self.bench):
            if one.name == name:
                return one
        known = ", ".join((*ELEMENT_NAMES, "Cgd", MIRROR_POLE))
        raise KeyError(f"no element {name!r} was estimated; there may be {known}")

    def evaluate(self, freq_hz: ArrayLike, condition: Condition | None = None) -> ComplexArray:
        """Loop gain as the bench would see it under a condition, shape (n,)."""
        freq = np.atleast_1d(np.asarray(freq_hz, dtype=float))
        return self.circuit.gain(self.vector, freq, condition or Condition())
