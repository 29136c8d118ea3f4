"""What the bench added on purpose for one sweep: a known load, a known series resistance."""

from __future__ import annotations

import math
from dataclasses import dataclass

from fitamp.errors import UsageError

__all__ = ["Condition"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Condition:
    """How one sweep was taken, beside what the bench adds to all of them.

    Parameters
    ----------
    load_added_f
        Capacitance added across the output, in F. It counts as exact: what is found of gm2 and of all capacitors is as
        right as this.
    rz_added_ohm
        Resistance added in series with Rz, in Ω; negative where a trim code took some away.
    temp_c
        Temperature in °C, where it was noted.
    note
        A remark.

    Raises
    ------
    UsageError
        When a number is not finite, the temperature is below absolute zero, or the added load negative.
    """

    load_added_f: float = 0.0
    rz_added_ohm: float = 0.0
    temp_c: float | None = None
    note: str = ""

    def __post_init__(self) -> None:
        if not (math.isfinite(self.load_added_f) and self.load_added_f >= 0):
            raise UsageError(f"the added load must be 0 F or more, but is {self.load_added_f:g}")
        if not math.isfinite(self.rz_added_ohm):
            raise UsageError(f"the added resistance must be finite, but is {self.rz_added_ohm:g}")
        if self.temp_c is not None and not (math.isfinite(self.temp_c) and self.temp_c >= -273.15):
            raise UsageError(f"the temperature must be finite and -273.15 °C or more, but is {self.temp_c:g}")
