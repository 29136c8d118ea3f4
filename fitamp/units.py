"""Quantities as people write them ("1.6 mS", "82 dB", "10 %") to SI numbers, and back.

Reading is strict: the unit must be the expected one and a comma is refused, because "1,8 pF" could be taken
for 18 pF. Writing rounds a value and its standard error together by the Particle Data Group's rule
(Review of Particle Physics, Introduction, sec. 5.3: keep two digits of the error from 100 to 354, one from
355 to 949, and round 950 to 999 up to 1000 with two digits).
"""

from __future__ import annotations

import math
import re

__all__ = [
    "from_db",
    "parse_gain",
    "parse_quantity",
    "parse_ratio",
    "si",
    "si_with_error",
    "to_db",
]

_PREFIXES = {-18: "a", -15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}
# Spellings of one unit that people type; the first is how fitamp writes it.
_SAME_UNIT = {
    "Ω": ("Ω", "Ω", "ohm", "ohms"),
    "S": ("S", "A/V", "mho"),
    "F": ("F",),
    "Hz": ("Hz", "hz"),
    "s": ("s",),
    "V/V": ("", "V/V"),
    "deg": ("deg", "°", "degrees"),
    "dB": ("dB", "db"),
}


def parse_quantity(text: str, unit: str) -> float:
    """Read a number with unit, such as ``parse_quantity("1.3 kOhm", "Ω")`` = 1300.0.

    Raises
    ------
    ValueError
        With what was found and what was expected, when the text is no finite number in that unit.
    """
    from quantiphy import InvalidNumber, Quantity

    if "," in text:
        raise ValueError(f"{text!r} has a comma; write the decimal mark as a point")
    try:
        quantity = Quantity(text.strip().replace("\N{MINUS SIGN}", "-"))
    except InvalidNumber:
        raise ValueError(f"{text!r} is not a number with unit; expected something like {_example(unit)!r}") from None
    spelled = str(quantity.units)
    accepted = {name.lower() for name in _SAME_UNIT.get(unit, (unit,))}
    if spelled.lower() not in accepted:
        found = f"unit {spelled!r}" if spelled else "no unit"
        raise ValueError(f"{text!r} has {found}; expected {unit}, as in {_example(unit)!r}")
    value = float(quantity)
    if not math.isfinite(value):
        raise ValueError(f"{text!r} is not finite")
    return value


def parse_ratio(text: str | float) -> float:
    """Read a relative number: ``"10 %"`` and ``0.1`` are both 0.1."""
    if isinstance(text, (int, float)) and not isinstance(text, bool):
        return float(text)
    match = re.fullmatch(r"\s*([0-9.eE+-]+)\s*(%?)\s*", str(text))
    try:
        value = float(match[1]) if match else math.nan
    except ValueError:
        value = math.nan
    if match is None or not math.isfinite(value):
        raise ValueError(f"{text!r} is not a ratio; expected something like '10 %' or 0.1")
    return value / 100 if match[2] else value


def parse_gain(text: str | float) -> float:
    """Read a gain: ``"82 dB"``, ``"12600"``, ``"12600 V/V"`` or a plain number, as V/V."""
    if isinstance(text, (int, float)) and not isinstance(text, bool):
        return float(text)
    if str(text).strip().lower().endswith("db"):
        return from_db(parse_quantity(str(text), "dB"))
    return parse_quantity(str(text), "V/V")


def to_db(ratio: float) -> float:
    """20 log10 of an amplitude ratio."""
    return 20 * math.log10(ratio)


def from_db(level_db: float) -> float:
    """Amplitude ratio of a level in dB (20 log10)."""
    return float(10 ** (level_db / 20))


def si(value: float | None, unit: str, digits: int = 4) -> str:
    """Write a number with SI prefix: ``si(1.234e6, "Hz")`` = "1.234 MHz"; None is an en dash."""
    if value is None or math.isnan(value):
        return "–"
    if value == 0 or math.isinf(value):
        return f"{value:g} {unit}".strip()
    exponent = _prefix_exponent(value, digits)
    scaled = value / 10**exponent
    decimals = max(0, digits - 1 - math.floor(math.log10(abs(scaled)) + 1e-12))
    return f"{_minus(f'{scaled:.{decimals}f}')} {_PREFIXES[exponent]}{unit}".strip()


def si_with_error(value: float | None, error: float | None, unit: str) -> str:
    """Write value ± standard error, rounded together: ``"58.23 ± 0.12 MHz"``."""
    if value is None or error is None or not math.isfinite(error) or error <= 0:
        return si(value, unit)
    exponent = _prefix_exponent(value if abs(value) >= error else error, 3)
    scaled, scaled_error = value / 10**exponent, error / 10**exponent
    decimals = max(0, min(_error_decimals(scaled_error), 6))
    number = f"{_minus(f'{scaled:.{decimals}f}')} ± {scaled_error:.{decimals}f}"
    prefix_and_unit = f"{_PREFIXES[exponent]}{unit}"
    return f"{number} {prefix_and_unit}".strip()


def _error_decimals(error: float) -> int:
    """Decimals that keep the error's digits by the Particle Data Group's rule."""
    exponent = math.floor(math.log10(error))
    leading = round(error / 10**exponent * 100)
    if leading <= 354:
        return 1 - exponent
    if leading <= 949:
        return -exponent
    return -exponent  # 950 to 999 rounds up to 1000 and keeps two digits, one decade higher


def _prefix_exponent(value: float, digits: int) -> int:
    if value == 0:
        return 0
    rounded = float(f"{abs(value):.{max(digits - 1, 0)}e}")
    exponent = 3 * math.floor(math.log10(rounded) / 3 + 1e-12)
    return min(max(exponent, min(_PREFIXES)), max(_PREFIXES))


def _minus(number: str) -> str:
    return number.replace("-", "\N{MINUS SIGN}")


def _example(unit: str) -> str:
    examples = {"Ω": "1.3 kOhm", "S": "1.6 mS", "F": "1.8 pF", "Hz": "1.2 kHz", "s": "0.5 ns", "deg": "60 deg", "dB": "82 dB"}
    return examples.get(unit, f"1.0 {unit}".strip())
