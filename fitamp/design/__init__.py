"""What was designed: element values or roots, their spreads, the limits that were promised, and the bench.

All SI. A spread is one standard deviation, relative to its value unless the name ends in a unit. The zero is kept
as its zero time τz in 1 + s·τz: above 0 in the left half plane, below 0 in the right one, 0 at infinity.
"""

from __future__ import annotations

from fitamp.design.file import read_design, write_design
from fitamp.design.model import LIMITED_QUANTITIES, SMALL_ZERO_RATIO, Design
from fitamp.design.parts import DEFAULT_SPREAD, Bench, HalfPlane, Limit, Roots

__all__ = [
    "DEFAULT_SPREAD",
    "LIMITED_QUANTITIES",
    "SMALL_ZERO_RATIO",
    "Bench",
    "Design",
    "HalfPlane",
    "Limit",
    "Roots",
    "read_design",
    "write_design",
]
