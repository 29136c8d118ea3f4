"""Single entries of a design file: what TOML holds under one key, to numbers.

Every refusal is a ValueError that says what was found and what was expected; `fitamp.design.file` adds file,
table and key.
"""

from __future__ import annotations

import difflib
import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from fitamp.design.model import LIMITED_QUANTITIES
from fitamp.design.parts import HalfPlane, Limit
from fitamp.units import example_of, parse_gain, parse_quantity, parse_ratio

__all__ = [
    "Entry",
    "read_beta",
    "read_entry",
    "read_gain",
    "read_half_plane",
    "read_limit",
    "read_line",
    "read_quantity",
    "read_spread",
    "read_time_spread",
    "shown",
    "unknown_name",
]

# What is limited may lie on either side of 0 only where it is a margin.
_SIGNED = {"phase_margin_deg", "gain_margin_db"}
_OPEN_LOW = {"none", "-inf"}
_OPEN_HIGH = {"none", "inf", "+inf"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Entry:
    """One value with what may stand beside it; None for what does not."""

    value: float
    spread: float | None = None
    under_test: bool | None = None


def read_entry(
    raw: object,
    read_value: Callable[[object], float],
    *,
    read_its_spread: Callable[[object, float], float] | None = None,
    may_be_under_test: bool = False,
) -> Entry:
    """Read ``"1.6 mS"`` or ``{ value = "1.6 mS", spread = "10 %", under_test = true }``."""
    if not isinstance(raw, dict):
        return Entry(value=read_value(raw))
    known = ("value", "spread", "under_test") if may_be_under_test else ("value", "spread")
    for name in raw:
        if name not in known:
            raise ValueError(unknown_name("key", name, known))
    if "value" not in raw:
        raise ValueError('the table has no value; expected { value = "…", spread = "10 %" }')
    value = read_value(raw["value"])
    spread = (read_its_spread or read_spread)(raw["spread"], value) if "spread" in raw else None
    under_test = raw.get("under_test")
    if under_test is not None and not isinstance(under_test, bool):
        raise ValueError(f"under_test is {shown(under_test)}; expected true or false")
    return Entry(value=value, spread=spread, under_test=under_test)


def read_quantity(raw: object, unit: str, *, zero_allowed: bool = False) -> float:
    """Read text with a unit that is positive, or 0 where that makes sense."""
    if not isinstance(raw, str):
        raise ValueError(f"{shown(raw)} is not text with a unit; expected something like {example_of(unit)!r}")
    value = parse_quantity(raw, unit)
    if value < 0 or (value == 0 and not zero_allowed):
        least = "negative" if zero_allowed else "not above 0"
        raise ValueError(f"{raw!r} is {least}; expected something like {example_of(unit)!r}")
    return value + 0.0  # turns -0.0 into 0.0


def read_gain(raw: object) -> float:
    """Read a gain in decibels or V/V that is positive."""
    value = parse_gain(_number_or_text(raw, "'82 dB' or 12000"))
    if value <= 0:
        raise ValueError(f"{shown(raw)} is not above 0; expected something like '82 dB' or 12000")
    return value


def read_beta(raw: object) -> float:
    """Read a feedback factor, a plain number above 0."""
    if isinstance(raw, str):
        raise ValueError(f"{raw!r} is text; expected a number above 0, such as 1.0 or 0.5")
    value = parse_ratio(_number_or_text(raw, "1.0 or 0.5"))
    if value <= 0:
        raise ValueError(f"{shown(raw)} is not above 0; expected a number such as 1.0 or 0.5")
    return value


def read_spread(raw: object, _value: float = 0.0) -> float:
    """Read a relative standard deviation."""
    value = parse_ratio(_number_or_text(raw, "'10 %' or 0.1"))
    if not 0 <= value < 1:
        raise ValueError(f"spread is {shown(raw)}; expected 0 or more and below 100 %, as in '10 %' or 0.1")
    return value + 0.0


def read_time_spread(raw: object, time_s: float) -> float:
    """Read the standard deviation of a time, as a time (``"0.1 ns"``) or relative to it, in s."""
    if isinstance(raw, str) and raw.strip().lower().endswith("s"):
        return read_quantity(raw, "s", zero_allowed=True)
    ratio = read_spread(raw)
    if ratio and not time_s:
        raise ValueError(f"spread is {shown(raw)} of 0; expected a time, such as '0.1 ns'")
    return ratio * time_s


def read_limit(raw: object, quantity: str) -> Limit:
    """Read two ends, such as ``["80 MHz", "160 MHz"]``, ``[60, inf]`` or ``["none", "1 GHz"]``.

    Raises
    ------
    ValueError, DesignError
        When an end is not usable, or the two make no limit.
    """
    if not isinstance(raw, list) or len(raw) != 2:
        expected = {"V/V": '["78 dB", "86 dB"]', "deg": "[60, 80]", "dB": "[10, inf]"}
        example = expected.get(LIMITED_QUANTITIES[quantity], '["80 MHz", "160 MHz"]')
        raise ValueError(f"{shown(raw)} is not a list of two ends; expected something like {example}")
    low = None if _word(raw[0]) in _OPEN_LOW else _read_end(raw[0], quantity)
    high = None if _word(raw[1]) in _OPEN_HIGH else _read_end(raw[1], quantity)
    if low is not None and high is not None and low >= high:
        raise ValueError(f"the first end, {shown(raw[0])}, must be below the second, {shown(raw[1])}; correct the two")
    return Limit(low=low, high=high)


def read_half_plane(raw: object) -> HalfPlane:
    """Read "left", "right" or "infinity"."""
    for place in HalfPlane:
        if raw == place.value:
            return place
    raise ValueError(f"{shown(raw)} is no half plane; expected {', '.join(repr(place.value) for place in HalfPlane)}")


def read_line(raw: object, *, lines_allowed: bool = False) -> str:
    """Read text without control characters, on one line unless more are allowed."""
    if not isinstance(raw, str):
        raise ValueError(f"{shown(raw)} is not text; expected something like 'first silicon'")
    if not raw.replace("\n" if lines_allowed else "", "").isprintable():
        raise ValueError(f"{shown(raw)} has characters that cannot be printed")
    return raw


def unknown_name(kind: str, name: str, known: Iterable[str]) -> str:
    """Say that a name is not known, which known one is nearest, and which there are."""
    by_lower = {candidate.lower(): candidate for candidate in known}
    near = difflib.get_close_matches(name.lower(), by_lower, n=1, cutoff=0.5)
    hint = f"; did you mean {by_lower[near[0]]}?" if near else ";"
    return f"unknown {kind} {shown(name)}{hint} known are {', '.join(by_lower.values())}"


def _read_end(raw: object, quantity: str) -> float:
    unit = LIMITED_QUANTITIES[quantity]
    given = _number_or_text(raw, f"{example_of(unit)!r} or a number in {unit}")
    if isinstance(given, str):
        value = parse_gain(given) if unit == "V/V" else parse_quantity(given, unit)
    elif math.isfinite(given):
        value = given
    else:
        raise ValueError(f"{shown(raw)} is no end on this side; an open end is [-inf, …] or […, inf]")
    if value < 0 and quantity not in _SIGNED:
        raise ValueError(f"{shown(raw)} is negative; expected 0 or more")
    return value + 0.0


def _number_or_text(raw: object, expected: str) -> float | str:
    if isinstance(raw, str):
        return raw
    if isinstance(raw, bool) or not isinstance(raw, (int, float)):
        raise ValueError(f"{shown(raw)} is neither number nor text; expected something like {expected}")
    try:
        return float(raw)
    except OverflowError:
        raise ValueError(f"a number of {len(str(abs(raw)))} digits; expected something like {expected}") from None


def _word(raw: object) -> str:
    return str(raw).strip().lower() if isinstance(raw, (str, float)) else ""


def shown(raw: object) -> str:
    """What was found, as the file writes it, and on one line."""
    if isinstance(raw, bool):
        return str(raw).lower()
    if isinstance(raw, dict):
        return "a table"
    text = repr(raw) if isinstance(raw, (str, list)) else str(raw)
    return text if len(text) <= 60 else f"{text[:57]}…"
