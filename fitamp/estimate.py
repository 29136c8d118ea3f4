"""One estimated number: value, standard error, 95 % interval, and how well it is known."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum

__all__ = ["NOT_KNOWN", "Estimate", "Known", "two_sided_95"]


class Known(StrEnum):
    """What a sweep says about a quantity."""

    MEASURED = "measured"
    LOWER_BOUND = "lower-bound"  # the sweep only says that it is larger than something
    UPPER_BOUND = "upper-bound"
    UNDETERMINED = "undetermined"


@dataclass(frozen=True, slots=True, kw_only=True)
class Estimate:
    """A quantity in SI units.

    value, stderr : best value and one standard deviation; None unless `known` is MEASURED
    ci95 : ends of the 95 % interval; None on a side that is open
    """

    value: float | None
    stderr: float | None
    ci95: tuple[float | None, float | None]
    known: Known = Known.MEASURED

    @property
    def is_measured(self) -> bool:
        """Whether there is a value with a standard error."""
        return self.value is not None and self.stderr is not None

    def is_within(self, low: float, high: float) -> bool:
        """Whether the whole 95 % interval lies in [low, high]; an open side reaches to infinity."""
        if self.known is Known.UNDETERMINED:
            return False
        ends = (-math.inf if self.ci95[0] is None else self.ci95[0], math.inf if self.ci95[1] is None else self.ci95[1])
        return low <= ends[0] and ends[1] <= high

    def touches(self, low: float, high: float) -> bool:
        """Whether any of the 95 % interval lies in [low, high]."""
        ends = (-math.inf if self.ci95[0] is None else self.ci95[0], math.inf if self.ci95[1] is None else self.ci95[1])
        return ends[0] <= high and low <= ends[1]

    @classmethod
    def gaussian(cls, value: float, stderr: float, *, quantile: float) -> Estimate:
        """Symmetric interval value ± quantile·stderr."""
        return cls(value=value, stderr=stderr, ci95=(value - quantile * stderr, value + quantile * stderr))

    @classmethod
    def lognormal(cls, value: float, relative_stderr: float, *, quantile: float) -> Estimate:
        """Interval symmetric in the logarithm, for a quantity that keeps its sign."""
        factor = math.exp(quantile * relative_stderr)
        ends = sorted((value / factor, value * factor))
        return cls(value=value, stderr=abs(value) * relative_stderr, ci95=(ends[0], ends[1]))


NOT_KNOWN = Estimate(value=None, stderr=None, ci95=(None, None), known=Known.UNDETERMINED)


def two_sided_95(degrees_of_freedom: float) -> float:
    """97.5 % quantile of Student's t: 1.96 for many points, more where the noise itself is known from few."""
    from scipy.special import stdtrit

    return float(stdtrit(degrees_of_freedom, 0.975))
