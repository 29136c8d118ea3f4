"""The parts of a design: half plane, limit, bench, and gain, poles and zero given directly.

They become a `Design` in `fitamp.design.model`. Units and signs are those of `fitamp.design`.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from enum import StrEnum

from fitamp.errors import DesignError
from fitamp.transfer import Transfer

__all__ = [
    "DEFAULT_SPREAD",
    "ROOT_NAMES",
    "Bench",
    "HalfPlane",
    "Limit",
    "Roots",
    "checked_spreads",
    "filled_spreads",
]

# Taken where a design states no spread: process corners of integrated resistors and capacitors are of this
# order (common practice). Reports say for which values it was assumed.
DEFAULT_SPREAD = 0.20
# Values of `Roots` that can carry a spread.
ROOT_NAMES = ("dc_gain", "pole1_hz", "pole2_hz", "zero_hz", "pole3_hz")


class HalfPlane(StrEnum):
    """Where a zero lies."""

    LEFT = "left"
    RIGHT = "right"
    INFINITY = "infinity"

    @property
    def phrase(self) -> str:
        """The place in a sentence: "in the left half plane", "at infinity"."""
        return "at infinity" if self is HalfPlane.INFINITY else f"in the {self.value} half plane"


@dataclass(frozen=True, slots=True, kw_only=True)
class Limit:
    """A promised range, both ends included; None leaves an end open.

    Raises
    ------
    DesignError
        When both ends are open, an end is not finite, or the lower is not below the upper.
    """

    low: float | None = None
    high: float | None = None

    def __post_init__(self) -> None:
        if self.low is None and self.high is None:
            raise DesignError("both ends are open, which limits nothing; give one or leave the limit out")
        if not all(math.isfinite(end) for end in (self.low, self.high) if end is not None):
            raise DesignError(f"an end is not finite in {self}; an open end is None")
        if self.low is not None and self.high is not None and self.low >= self.high:
            raise DesignError(f"the first end, {self.low:g}, must be below the second, {self.high:g}")

    def contains(self, value: float) -> bool:
        """Whether a value keeps the limit."""
        return self._low <= value <= self._high

    def straddled_by(self, low: float, high: float) -> bool:
        """Whether the interval from `low` to `high` is partly inside and partly outside."""
        overlaps = low <= self._high and high >= self._low
        return overlaps and not (self.contains(low) and self.contains(high))

    @property
    def _low(self) -> float:
        return -math.inf if self.low is None else self.low

    @property
    def _high(self) -> float:
        return math.inf if self.high is None else self.high


@dataclass(frozen=True, slots=True, kw_only=True)
class Bench:
    """What the bench adds to the amplifier: probe, socket, cable.

    load_f, load_spread : capacitance added to CL in F, and its relative standard deviation
    delay_s, delay_spread_s : delay added to the loop in s, and its standard deviation in s; None where it is not
        stated: then it is not known, which is not the same as 0
    """

    load_f: float = 0.0
    load_spread: float = 0.0
    delay_s: float | None = None
    delay_spread_s: float = 0.0

    def __post_init__(self) -> None:
        for name in ("load_f", "load_spread", "delay_s", "delay_spread_s"):
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value >= 0):
                raise DesignError(f"the bench's {name} must be 0 or more, but is {value:g}")


@dataclass(frozen=True, slots=True, kw_only=True)
class Roots:
    """A design given by its gain, poles and zero instead of elements.

    Parameters
    ----------
    dc_gain
        Loop gain at DC in V/V, above 0.
    pole1_hz, pole2_hz, pole3_hz
        Distances of the poles from the origin over 2π, counted positive, rising; no third pole where None.
    zero_hz
        Distance of the zero, counted positive; None for a zero at infinity.
    half_plane
        Where the zero lies.
    delay_s
        Delay of the loop's path.
    spreads
        Relative standard deviations by field name; `Design` fills in the missing ones.

    Raises
    ------
    DesignError
        When a value is not above 0, the poles do not rise, or zero and half plane contradict each other.
    """

    dc_gain: float
    pole1_hz: float
    pole2_hz: float
    zero_hz: float | None = None
    half_plane: HalfPlane
    pole3_hz: float | None = None
    delay_s: float = 0.0
    spreads: Mapping[str, float] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for name in ROOT_NAMES:
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value > 0):
                raise DesignError(f"{name} must be finite and above 0, but is {value:g}")
        if self.pole1_hz >= self.pole2_hz:
            raise DesignError(f"pole 1 ({self.pole1_hz:g} Hz) must lie below pole 2 ({self.pole2_hz:g} Hz)")
        if self.pole3_hz is not None and self.pole3_hz < self.pole2_hz:
            raise DesignError(f"pole 3 ({self.pole3_hz:g} Hz) must not lie below pole 2 ({self.pole2_hz:g} Hz)")
        if self.zero_hz is None and self.half_plane is not HalfPlane.INFINITY:
            raise DesignError(f"no zero is given, but it shall lie {self.half_plane.phrase}; give its frequency")
        if self.zero_hz is not None and self.half_plane is HalfPlane.INFINITY:
            raise DesignError(f"the zero is at {self.zero_hz:g} Hz and at infinity at once; leave one out")
        if not (math.isfinite(self.delay_s) and self.delay_s >= 0):
            raise DesignError(f"delay must be 0 s or more, but is {self.delay_s:g}")
        object.__setattr__(self, "spreads", checked_spreads(self.spreads, ROOT_NAMES))

    @property
    def zero_time_s(self) -> float:
        """Zero time in s; above 0 in the left half plane, 0 at infinity."""
        if self.zero_hz is None:
            return 0.0
        return (1 if self.half_plane is HalfPlane.LEFT else -1) / (2 * math.pi * self.zero_hz)

    def transfer(self) -> Transfer:
        """Loop gain with these roots."""
        poles_hz = [-pole for pole in (self.pole1_hz, self.pole2_hz, self.pole3_hz) if pole is not None]
        sign = -1 if self.half_plane is HalfPlane.LEFT else 1
        zeros_hz = () if self.zero_hz is None else (complex(sign * self.zero_hz),)
        return Transfer(
            dc_gain=self.dc_gain,
            poles_hz=tuple(complex(pole) for pole in poles_hz),
            zeros_hz=zeros_hz,
            delay_s=self.delay_s,
        )


def filled_spreads(stated: Mapping[str, float], present: Iterable[str]) -> tuple[dict[str, float], tuple[str, ...]]:
    """The stated spreads with the default for the rest, and the names of the rest."""
    spreads = dict.fromkeys(present, DEFAULT_SPREAD) | dict(stated)
    return spreads, tuple(name for name in spreads if name not in stated)


def checked_spreads(spreads: Mapping[str, float], known: Iterable[str]) -> dict[str, float]:
    """A copy of spreads by name; DesignError for an unknown name or a spread outside 0 to below 1."""
    for name, spread in spreads.items():
        if name not in known:
            raise DesignError(f"spread of {name}, which is not one of {', '.join(known)}")
        if not 0 <= spread < 1:
            raise DesignError(f"the spread of {name} must be from 0 to below 1, but is {spread:g}")
    return dict(spreads)
