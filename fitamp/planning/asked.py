"""What the command line asks of a plan in text: lists of loads and resistances, bands, wanted precisions."""

from __future__ import annotations

import re
from collections.abc import Sequence

from fitamp.elements.circuit import UNITS
from fitamp.errors import UsageError
from fitamp.planning.precision import QUANTITIES
from fitamp.planning.result import Wanted
from fitamp.units import example_of, parse_quantity, parse_ratio

__all__ = ["parse_band", "parse_list", "parse_wanted"]

# "0,5 pF" may be half a picofarad, or none and five.
_DECIMAL_COMMA = re.compile(r"(?<![\w.])[+-]?\d+,\d")
_WANTED_EXAMPLE = '--want "gm2 1 %, zero_time_s 5 ps"'


def parse_list(text: str, unit: str, *, option: str) -> tuple[float, ...]:
    """Read ``"0, 5 pF, 10 pF"``: quantities with unit and commas between; a 0 needs no unit.

    Raises
    ------
    UsageError
        Saying what was found and what is expected.
    """
    plain = text.replace("\N{MINUS SIGN}", "-")
    example = f'{option} "0, {example_of(unit)}"'
    if _DECIMAL_COMMA.search(plain):
        raise UsageError(
            f"{option}: in {text!r} a comma stands between digits; write a decimal mark as a point, and a space after "
            f"a comma that separates, as in {example}"
        )
    values = []
    for item in plain.split(","):
        word = item.strip()
        if re.fullmatch(r"[+-]?0+(\.0*)?", word):
            values.append(0.0)
            continue
        if not word:
            raise UsageError(f"{option}: there is nothing between two commas in {text!r}; expected {example}")
        try:
            values.append(parse_quantity(word, unit))
        except ValueError as error:
            raise UsageError(f"{option}: {error}") from None
    return tuple(values)


def parse_band(words: Sequence[str]) -> tuple[float, float]:
    """Read the two ends of a band, such as ``("1 kHz", "200 MHz")``.

    Raises
    ------
    UsageError
        When they are no frequencies, or do not rise.
    """
    try:
        low_hz, high_hz = (parse_quantity(word, "Hz") for word in words)
    except ValueError as error:
        raise UsageError(f"--band: {error}") from None
    if not 0 < low_hz < high_hz:
        raise UsageError(
            f'--band: {words[0]} to {words[1]} does not rise from above 0 Hz; as in --band "1 kHz" "200 MHz"'
        )
    return low_hz, high_hz


def parse_wanted(text: str) -> tuple[Wanted, ...]:
    """Read ``"gm2 1 %, zero_time_s 5 ps"``: names with a standard deviation, relative or in the unit of the quantity.

    Raises
    ------
    UsageError
        Saying what was found and what is expected.
    """
    units = {**UNITS, **QUANTITIES}
    found = []
    for item in text.split(","):
        name, _, size = item.strip().partition(" ")
        if not name or not size.strip():
            raise UsageError(
                f"--want: {item.strip()!r} is not a name with a standard deviation; expected something like "
                f"{_WANTED_EXAMPLE}"
            )
        if name not in units:
            raise UsageError(f"--want: {name} is not among what a plan knows: {', '.join(units)}")
        found.append(_wanted(name, size.strip(), units[name]))
    return tuple(found)


def _wanted(name: str, size: str, unit: str) -> Wanted:
    try:
        relative = parse_ratio(size) if size.endswith("%") else None
        absolute = None if relative is not None else parse_quantity(size, unit) if unit else parse_ratio(size)
    except ValueError:
        own = f" or {example_of(unit)}" if unit else " or 0.01"
        raise UsageError(
            f"--want: {name} {size} has no standard deviation that can be read; expected 1 %{own}"
        ) from None
    if not (relative or absolute or 0.0) > 0:
        raise UsageError(f"--want: {name} {size}; a standard deviation is above 0")
    return Wanted(name=name, relative=relative, absolute=absolute)
