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
    "example_of",
    "from_db",
    "parse_gain",
    "parse_quantity",
    "parse_ratio",
    "si",
    "si_exact",
    "si_with_error",
    "to_db",
]

_PREFIXES = {-18: "a", -15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}
# Spellings of one unit that people type; the first is how fitamp writes it.
_SAME_UNIT = {
    "Ω": ("Ω", "ohm", "ohms"),
    "S": ("S", "A/V"),
    "F": ("F",),
    "Hz": ("Hz",),
    "s": ("s",),
    "V/V": ("V/V", ""),
    "deg": ("deg", "°", "degrees"),
    "dB": ("dB",),
}
# Written without prefix: nobody reads "65 mdeg" or "12 kV/V".
_NO_PREFIX = {"", "V/V", "deg", "°", "dB", "%"}
_EXAMPLES = {
    "Ω": "1.3 kOhm",
    "S": "1.6 mS",
    "F": "1.8 pF",
    "Hz": "1.2 kHz",
    "s": "0.5 ns",
    "V/V": "12000",
    "deg": "60 deg",
    "dB": "82 dB",
}
# One number and one word. The library that reads the prefixes also takes names ("gm = 1 mS"), remarks and
# digit groups, none of which belongs here.
_NUMBER_AND_UNIT = re.compile(r"([+-]?[0-9.]+(?:[eE][+-]?[0-9]+)?)\s*([^\s0-9=:_-]*)")
# Spelled out, a prefix is not read, but recognised to say how it is written.
_SPELLED_PREFIXES = {
    "giga": "G", "mega": "M", "meg": "M", "kilo": "k", "kil": "k", "milli": "m", "micro": "u", "nano": "n", "pico": "p",
    "femto": "f",
}  # fmt: skip
_SPELLED_UNITS = {
    "Ω": ("ohm", "ohms"),
    "S": ("siemens",),
    "F": ("farad", "farads"),
    "Hz": ("hertz", "hz"),
    "s": ("second", "seconds"),
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
    plain = _plain_minus(text)
    match = _NUMBER_AND_UNIT.fullmatch(plain)
    try:
        if match is None:
            raise InvalidNumber(plain)
        quantity = Quantity(plain)
    except InvalidNumber:
        example = example_of(unit)
        raise ValueError(f"{text!r} is not a number with unit; expected something like {example!r}") from None
    spelled = str(quantity.units)
    if not _is_spelling_of(unit, spelled):
        found, example = _as_typed(match[2], spelled), _example_for(match[1], match[2], unit)
        raise ValueError(f"{text!r} has {found}; expected {unit}, as in {example!r}")
    return _finite(float(quantity), text)


def parse_ratio(text: str | float) -> float:
    """Read a relative number: ``"10 %"`` and ``0.1`` are both 0.1.

    Raises
    ------
    ValueError
        With what was found and what was expected, when it is no finite ratio.
    """
    if isinstance(text, (int, float)) and not isinstance(text, bool):
        return _finite(float(text), text)
    match = re.fullmatch(r"([0-9.eE+-]+)\s*(%?)", _plain_minus(str(text)))
    try:
        value = float(match[1]) if match else math.nan
    except ValueError:
        value = math.nan
    if match is None or not math.isfinite(value):
        raise ValueError(f"{text!r} is not a ratio; expected something like '10 %' or 0.1")
    return value / 100 if match[2] else value


def parse_gain(text: str | float) -> float:
    """Read a gain: ``"82 dB"``, ``"12600"``, ``"12600 V/V"`` or a plain number, as V/V.

    Raises
    ------
    ValueError
        With what was found and what was expected, when it is no finite gain.
    """
    if isinstance(text, (int, float)) and not isinstance(text, bool):
        return _finite(float(text), text)
    if not str(text).strip().lower().endswith("db"):
        return parse_quantity(str(text), "V/V")
    try:
        return from_db(parse_quantity(str(text), "dB"))
    except OverflowError:
        raise ValueError(f"{text!r} is beyond any gain; expected something like '82 dB'") from None


def example_of(unit: str) -> str:
    """A quantity in that unit, to show in a message how one is written: "1.3 kOhm" for Ω."""
    return _EXAMPLES.get(unit, f"1.0 {unit}".strip())


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
        return f"{_minus(f'{value:g}')} {unit}".strip()
    rounded = float(f"{value:.{digits - 1}e}")  # first, because 999.96 kHz is 1.000 MHz in four digits
    if _is_beyond_prefixes(rounded, unit):
        return f"{_minus(f'{value:.{digits - 1}e}')} {unit}".strip()
    exponent = _prefix_exponent(rounded, unit)
    decimals = digits - 1 - _decade(rounded) + exponent
    return f"{_fixed(rounded / 10**exponent, decimals)} {_PREFIXES[exponent]}{unit}".strip()


def si_exact(value: float, unit: str) -> str:
    """Write with as many digits as it takes for `parse_quantity` to give back the very same number."""
    exponent = _prefix_exponent(value, unit)
    for digits in range(3, 18):
        number = f"{value / 10**exponent:.{digits}g}"
        text = f"{number} {_PREFIXES[exponent]}{unit}".strip()
        if "e" not in number and parse_quantity(text, unit) == value:
            return text
    return f"{value!r} {unit}".strip()


def si_with_error(value: float | None, error: float | None, unit: str) -> str:
    """Write value ± standard error, rounded together: ``"58.23 ± 0.12 MHz"``.

    Without an error, or without a value, it is `si`'s text.
    """
    if value is None or error is None or not math.isfinite(value) or not math.isfinite(error) or error <= 0:
        return si(value, unit)
    if _is_beyond_prefixes(max(abs(value), error), unit):
        return f"{_minus(f'{value:.3e} ± {error:.1e}')} {unit}".strip()
    rounded, decimals = _rounded_error(error)
    exponent = _prefix_exponent(max(abs(round(value, decimals)), rounded), unit)
    number, spread = (_fixed(part / 10**exponent, decimals + exponent) for part in (value, rounded))
    return f"{number} ± {spread} {_PREFIXES[exponent]}{unit}".strip()


def _rounded_error(error: float) -> tuple[float, int]:
    """The error by the Particle Data Group's rule, and its decimals (negative: tens, hundreds, …)."""
    decade = _decade(error)
    leading = round(error / 10.0**decade * 100)
    if leading >= 950:
        return 10.0 ** (decade + 1), -decade  # two digits of the next decade
    decimals = 1 - decade if leading <= 354 else -decade
    return round(error, decimals), decimals


def _decade(value: float) -> int:
    """Power of ten of the first digit: 3 for 1000 to 9999."""
    # Read off 15 digits, because the double next to 1e-12 starts with 9.99 when written in full.
    return int(f"{abs(value):.14e}".partition("e")[2])


def _prefix_exponent(value: float, unit: str) -> int:
    if value == 0 or unit in _NO_PREFIX:
        return 0
    exponent = 3 * (_decade(value) // 3)
    return min(max(exponent, min(_PREFIXES)), max(_PREFIXES))


def _is_beyond_prefixes(value: float, unit: str) -> bool:
    """Whether fixed digits would run on and on, as for a value far outside what electronics meets."""
    return not (-9 <= _decade(value) < 9 if unit in _NO_PREFIX else -18 <= _decade(value) < 15)


def _fixed(value: float, decimals: int) -> str:
    """Write with `decimals` places, or rounded to tens, hundreds … where that is negative."""
    rounded = round(value, decimals) + 0.0  # the sum turns -0.0 into 0.0
    return _minus(f"{rounded:.{max(0, decimals)}f}")


def _minus(number: str) -> str:
    return number.replace("-", "\N{MINUS SIGN}")


def _plain_minus(text: str) -> str:
    return text.strip().replace("\N{MINUS SIGN}", "-")


def _as_typed(word: str, spelled: str) -> str:
    """A unit that was refused: without its prefix where that is surely one, else as it was typed."""
    if not spelled:
        return "no unit"
    is_known = any(_is_spelling_of(unit, spelled) for unit in _SAME_UNIT)
    return f"unit {spelled if is_known else word!r}"


def _example_for(number: str, word: str, unit: str) -> str:
    """The quantity itself where its prefix is spelled out ("0.6 megohm"), else any in this unit."""
    low = word.lower()
    for spelled, prefix in _SPELLED_PREFIXES.items():
        if low.startswith(spelled) and low.removeprefix(spelled) in _SPELLED_UNITS.get(unit, ()):
            return f"{number} {prefix}{'Ohm' if unit == 'Ω' else unit}"
    return example_of(unit)


def _finite(value: float, text: str | float) -> float:
    if not math.isfinite(value):
        raise ValueError(f"{text!r} is not finite")
    return value


def _is_spelling_of(unit: str, spelled: str) -> bool:
    names = _SAME_UNIT.get(unit, (unit,))
    if "s" in {unit.lower(), spelled.lower()}:  # here case tells siemens from seconds
        return spelled in names
    return spelled.lower() in {name.lower() for name in names}
