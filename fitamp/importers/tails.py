"""Prefixes and units behind the digits of a cell, as in ``1.2k``, ``10 MHz``, ``60 dB``.

Which ones are read depends on what the column holds; one that may mean two things is refused with the reason.
Prefixes as in the SI brochure; circuit simulators also write M for milli and MEG for mega.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from fitamp.importers.cells import show, tail_of
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.readings import is_no_reading

__all__ = ["doubt_of_tail", "tails_of", "unit_in_cells"]

_HERTZ = ("Hz", "hz", "HZ")
_UP = {"k": 3, "K": 3, "M": 6, "MEG": 6, "Meg": 6, "meg": 6, "G": 9, "T": 12}
_DOWN = {"m": -3, "u": -6, "µ": -6, "μ": -6, "n": -9}
_IN_HERTZ = {
    **dict.fromkeys(_HERTZ, 0),
    **{prefix + hertz: power for prefix, power in _UP.items() for hertz in _HERTZ},
    "mhz": 6,  # as in headers: all in small letters nobody means millihertz
    "ghz": 9,
}
_IN_RADIANS_PER_SECOND = {"rad/s": 0, "krad/s": 3, "Mrad/s": 6, "Grad/s": 9}
_IN_VOLTS_PER_VOLT = {"k": 3, "K": 3, "G": 9, **_DOWN, "V/V": 0}
_IN_DECIBELS = dict.fromkeys(("dB", "db", "DB"), 0)
_IN_DEGREES = dict.fromkeys(("°", "deg", "Deg", "DEG", "degrees"), 0)
_IN_RADIANS = dict.fromkeys(("rad", "Rad", "RAD"), 0)

_BY_UNIT: dict[Unit, Mapping[str, int]] = {
    Unit.HZ: {**_UP, **_IN_HERTZ},
    Unit.KHZ: {"kHz": 0, "KHz": 0, "khz": 0},
    Unit.MHZ: {"MHz": 0, "MHZ": 0, "mhz": 0},
    Unit.GHZ: {"GHz": 0, "GHZ": 0, "ghz": 0},
    Unit.RAD_PER_S: {**_UP, **_IN_RADIANS_PER_SECOND},
    Unit.DB: _IN_DECIBELS,
    Unit.LINEAR: _IN_VOLTS_PER_VOLT,
    Unit.DEGREE: _IN_DEGREES,
    Unit.RADIAN: _IN_RADIANS,
}
# A unit in full, by which the cells say what the header does not.
_UNIT_BY_TAIL: dict[str, Unit] = {
    **dict.fromkeys(_IN_HERTZ, Unit.HZ),
    **dict.fromkeys(_IN_RADIANS_PER_SECOND, Unit.RAD_PER_S),
    **dict.fromkeys(_IN_DECIBELS, Unit.DB),
    **dict.fromkeys(_IN_DEGREES, Unit.DEGREE),
    **dict.fromkeys(_IN_RADIANS, Unit.RADIAN),
}


def tails_of(quantity: Quantity, unit: Unit | None) -> Mapping[str, int]:
    """What may stand behind the digits of a column's cells, with the power of ten that it means."""
    if quantity is Quantity.COMPLEX:
        return {}
    return _IN_VOLTS_PER_VOLT if unit is None else _BY_UNIT[unit]


def doubt_of_tail(text: str, quantity: Quantity, unit: Unit | None) -> str:
    """Why what stands behind the digits is not read, in the words of a message's end; empty for the usual reason."""
    tail = tail_of(text)
    if quantity is Quantity.FREQUENCY and tail in {"m", "mHz"}:
        return f"{show(text)} is millihertz as it stands, where megahertz may be meant; write M or the plain number"
    if quantity is Quantity.FREQUENCY and unit not in {Unit.HZ, Unit.RAD_PER_S} and tail in {*_UP, *_IN_HERTZ}:
        return f"{show(text)} has a prefix, and the column is in {unit} already; write the plain number"
    if tail == "M" and (unit is None or unit is Unit.LINEAR):
        return f"{show(text)} may be mega, or milli as circuit simulators write it; write the plain number"
    return ""


def unit_in_cells(cells: Sequence[str]) -> Unit | None:
    """The unit that every cell with a reading has behind its digits; None where they do not agree on one."""
    found: set[Unit | None] = set()
    for text in cells:
        if not is_no_reading(text):
            found.add(_UNIT_BY_TAIL.get(tail_of(text)))
            if None in found or len(found) > 1:
                return None
    return found.pop() if found else None
