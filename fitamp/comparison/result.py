"""What a comparison returns: rows, verdict, advice, parasitic capacitance; frozen."""

from __future__ import annotations

import html
from dataclasses import dataclass
from enum import StrEnum

from fitamp.design import Design
from fitamp.elements import ElementEstimate
from fitamp.estimate import Estimate
from fitamp.fitting import FitWarning, LoopFit

__all__ = ["Advice", "Comparison", "Nulling", "Parasitic", "Route", "Row", "Verdict", "Window"]


class Nulling(StrEnum):
    """Verdict on the nulling resistor."""

    AS_DESIGNED = "as-designed"
    TOO_LITTLE = "too-little"
    TOO_MUCH = "too-much"
    WRONG_SIDE = "wrong-side"
    AT_INFINITY = "at-infinity"
    UNDECIDED = "undecided"


class Route(StrEnum):
    """From what the zero time comes that a verdict rests on."""

    CIRCUIT = "circuit"
    BEHAVIOUR = "behaviour"

    @property
    def phrase(self) -> str:
        """The same in words."""
        if self is Route.CIRCUIT:
            return "the elements of the exact circuit, fitted within the design's spreads"
        return "two poles and a zero, with the third pole as the design expects it"


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One quantity, designed against measured.

    designed : exact, from the design alone; designed_as_measured : through the sweep's band, weights and model
    deviation : (measured − designed as measured)/|designed as measured|; for margins in degrees or dB the difference
        None where that is not known, and for a zero time designed so small that it counts as none
    sigma : that difference in standard errors of the measurement
    low, high : limits (None where open); inside : True or False only if the whole 95 % interval agrees
    """

    quantity: str
    designed: float | None
    designed_as_measured: float | None
    measured: Estimate
    deviation: float | None
    sigma: float | None
    low: float | None
    high: float | None
    inside: bool | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Window:
    """Zero times that count as designed, in seconds, and where the window comes from."""

    low_s: float
    high_s: float
    source: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Verdict:
    """Verdict on the nulling resistor, with its reason in one sentence and the quantity that decides it.

    route : from what the zero time and gm2·Rz come
    """

    nulling: Nulling
    reason: str
    route: Route
    zero_time_s: Estimate
    gm2_rz: Estimate
    window: Window


@dataclass(frozen=True, slots=True, kw_only=True)
class Advice:
    """What to change: the resistor's change that puts the zero at the designed place, and a sentence."""

    rz_change_ohm: Estimate
    sentence: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Parasitic:
    """Capacitance that is there and was not designed, and the sentence on what that assumes.

    load_total_f is everything at the output; load_f that without designed and bench load. first_stage_f is what the
    first stage's output has beyond the designed C1; undetermined unless the sweep itself shows the third pole.
    """

    load_total_f: Estimate
    load_f: Estimate
    first_stage_f: Estimate
    sentence: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Comparison:
    """A sweep fitted and held against its design.

    elements : those behind the sweep, with the design's spreads, whichever route decided; None for a design without
        elements, or where no circuit could be fitted. The verdict's zero time is from the same circuit with its load
        free by a factor of two
    notes : contradictions between sweep, design and bench, beside the fit's own warnings
    """

    design: Design
    fit: LoopFit
    designed_fit: LoopFit | None
    elements: ElementEstimate | None
    rows: tuple[Row, ...]
    verdict: Verdict
    advice: Advice
    parasitic: Parasitic | None
    notes: tuple[FitWarning, ...]

    @property
    def is_described(self) -> bool:
        """Whether the model that decided describes the sweep."""
        return self.verdict.route is Route.CIRCUIT or self.fit.adequacy.adequate

    @property
    def broken_limits(self) -> tuple[str, ...]:
        """Quantities other than the zero that are outside their limits beyond doubt."""
        return tuple(row.quantity for row in self.rows if row.inside is False and row.quantity != "zero_time_s")

    def row(self, quantity: str) -> Row:
        """The row of a quantity.

        Raises
        ------
        KeyError
            When there is no such row.
        """
        for row in self.rows:
            if row.quantity == quantity:
                return row
        raise KeyError(quantity)

    def __str__(self) -> str:
        lines = [
            f"verdict  {self.verdict.nulling.value}: {self.verdict.reason}",
            f"route    {self.verdict.route.value}: {self.verdict.route.phrase}",
            f"advice   {self.advice.sentence}",
        ]
        if self.parasitic is not None:
            lines.append(f"load     {self.parasitic.sentence}")
        return "\n".join(lines)

    __repr__ = __str__

    def _repr_html_(self) -> str:
        return f"<pre>{html.escape(str(self))}</pre>"
