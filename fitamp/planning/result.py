"""What a plan returns: frozen, every field declared, None where a number cannot be had."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from fitamp.design import Design
from fitamp.errors import UsageError
from fitamp.planning.sweeps import PlannedSweep
from fitamp.sweep import NoiseLevels

__all__ = ["Criterion", "Expected", "LimitOutlook", "Outlook", "Plan", "Stage", "Wanted", "is_met"]

# An interval of 95 % reaches so many standard deviations.
QUANTILE = 1.96


class Criterion(StrEnum):
    """What makes one set of sweeps better than another.

    DETERMINANT : the determinant of the elements' covariance, whatever else is unknown marginalised: the volume of
        their joint interval (D-optimality). In it halving one error counts alike for every element
    VARIANCE : the mean variance of the elements, relative to the design (A-optimality): it looks at the worst ones
    WANTED : the largest ratio of a standard deviation to the wanted one; what is met counts no further, and among sets
        alike in that the determinant decides
    """

    DETERMINANT = "determinant"
    VARIANCE = "variance"
    WANTED = "wanted"


@dataclass(frozen=True, slots=True, kw_only=True)
class Wanted:
    """A standard deviation that is wanted, at most, of an element or quantity: relative, or absolute in SI units.

    Raises
    ------
    UsageError
        When not exactly one of the two is given, or it is not above 0.
    """

    name: str
    relative: float | None = None
    absolute: float | None = None

    def __post_init__(self) -> None:
        given = [one for one in (self.relative, self.absolute) if one is not None]
        if len(given) != 1 or not 0 < given[0] < float("inf"):
            raise UsageError(f"{self.name}: expected one standard deviation above 0, relative or absolute")


@dataclass(frozen=True, slots=True, kw_only=True)
class Expected:
    """One element, number of the bench or quantity, and how well it will be known. All in SI units.

    value : where the part is taken to be; None for a quantity that it does not have
    sd : standard deviation to be expected; None where the number stays as good as unknown, 0 where it is held
    before : the same before any further sweep; of a quantity over the parts that the plan is for
    informed : of an element, the share of what will be known that comes from sweeps, 0 to 1; None for a quantity
    over_parts, worst : root mean square and largest of the standard deviations over the parts drawn, at each of them;
        None where none were, or where it is unknown in one
    by_loads, by_resistances : shift of the estimate over the relative error of all added loads, or resistances, where
        they are larger than stated; None where the number, or what the shift would do, is unknown
    """

    name: str
    unit: str
    value: float | None
    sd: float | None
    before: float | None
    informed: float | None = None
    over_parts: float | None = None
    worst: float | None = None
    by_loads: float | None = None
    by_resistances: float | None = None

    @property
    def relative(self) -> float | None:
        """Standard deviation over the value; None where either is missing or the value is 0."""
        return None if self.sd is None or not self.value else self.sd / abs(self.value)


@dataclass(frozen=True, slots=True, kw_only=True)
class LimitOutlook:
    """How far the part's expected value is from the design's limit on a quantity.

    low, high : None where open; sigma : distance to the nearer end, in standard deviations, below 0 outside
    """

    quantity: str
    low: float | None
    high: float | None
    sigma: float | None

    @property
    def is_decidable(self) -> bool:
        """Whether the 95 % interval of such a part would lie wholly inside or outside."""
        return self.sigma is not None and abs(self.sigma) > QUANTILE


@dataclass(frozen=True, slots=True, kw_only=True)
class Outlook:
    """Whether the verdict on the zero would be decided.

    region : verdict of a part with its zero where it is taken to be
    edge_sigma : distance of that zero time from the nearest edge of the region, in standard deviations to be expected
    half_plane_sigma : its distance from 0, where the zero passes through infinity
    undecided_share : of parts drawn from the design's spreads (or, with sweeps taken, from where those leave the part),
        the share whose 95 % interval would reach over an edge
    limits : the same for the design's other limits, where the plan knows the quantity
    All but region and limits are None where the zero time stays unknown.
    """

    region: str
    edge_sigma: float | None
    half_plane_sigma: float | None
    undecided_share: float | None
    limits: tuple[LimitOutlook, ...]

    @property
    def is_decidable(self) -> bool:
        """Whether the 95 % interval of such a part would lie in one region."""
        return self.edge_sigma is not None and self.edge_sigma > QUANTILE


@dataclass(frozen=True, slots=True, kw_only=True)
class Stage:
    """What is to be expected after some sweeps.

    sweeps : all that are planned so far, in their order; none in the first stage of a plan
    elements, bench, quantities : as `Expected`; elements in the order of the circuit
    """

    sweeps: tuple[PlannedSweep, ...]
    elements: tuple[Expected, ...]
    bench: tuple[Expected, ...]
    quantities: tuple[Expected, ...]
    outlook: Outlook

    def of(self, name: str) -> Expected:
        """One element, number of the bench or quantity by name.

        Raises
        ------
        KeyError
            When there is none of that name.
        """
        for one in (*self.elements, *self.bench, *self.quantities):
            if one.name == name:
                return one
        raise KeyError(name)


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """The best sweeps from a list, and what is to be expected after each.

    noise : levels of one sweep that is not averaged
    candidates : what was to choose from
    taken : how many sweeps were taken already; then the plan is for the part where they put it, else for the design's
        centre
    cautions : what is to know of an estimate from them that is not trustworthy, weightiest first
    stages : before any further sweep, then after each one chosen, in the order in which each adds most
    further : the last stage with the best of those left; None where none is left
    everything : what all candidates together would tell
    criterion, is_exhaustive : how the sweeps were chosen; whether every set of that size was looked at
    wanted : standard deviations in SI units by name
    parts_drawn : how many parts `over_parts` and `worst` are over
    """

    design: Design
    noise: NoiseLevels
    candidates: tuple[PlannedSweep, ...]
    taken: int
    cautions: tuple[str, ...]
    stages: tuple[Stage, ...]
    further: Stage | None
    everything: Stage
    criterion: Criterion
    is_exhaustive: bool
    wanted: tuple[tuple[str, float], ...]
    parts_drawn: int

    @property
    def sweeps(self) -> tuple[PlannedSweep, ...]:
        """The sweeps chosen, in their order."""
        return self.last.sweeps

    @property
    def last(self) -> Stage:
        """What is to be expected after all of them."""
        return self.stages[-1]

    @property
    def missed(self) -> tuple[str, ...]:
        """What is wanted more surely than these sweeps tell it."""
        return self._missed_by(self.last)

    @property
    def out_of_reach(self) -> tuple[str, ...]:
        """What is wanted more surely than all candidates together tell it."""
        return self._missed_by(self.everything)

    def _missed_by(self, stage: Stage) -> tuple[str, ...]:
        return tuple(name for name, sd in self.wanted if not is_met(stage.of(name).sd, sd))


def is_met(sd: float | None, wanted: float) -> bool:
    """Whether an expected standard deviation is the wanted one or smaller."""
    # A wish at the very number that is met is met, whatever the last digit of a percentage says.
    return sd is not None and sd <= wanted * (1 + 1e-9)
