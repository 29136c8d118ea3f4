"""One cell of a text file to a number, strictly.

A number is plain decimal: sign, digits with at most one decimal mark, exponent with E; where the file shows that it
writes so, with marks between groups of thousands or with a prefix or unit behind. All else is refused with the
likely reason, because libraries read some of it wrongly (1e400 as infinity) and the rest as text.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from functools import lru_cache
from types import MappingProxyType

__all__ = [
    "GROUP_MARKS",
    "MINUS",
    "MINUS_MARKS",
    "complex_from",
    "is_complex_like",
    "is_number_like",
    "number_from",
    "show",
    "tail_of",
]

MINUS = "\N{MINUS SIGN}"
# What stands for a minus sign where a typesetter or a full-width keyboard had a hand in it.
MINUS_MARKS = {
    MINUS: "U+2212",
    "\N{HYPHEN}": "U+2010",
    "\N{NON-BREAKING HYPHEN}": "U+2011",
    "\N{EN DASH}": "U+2013",
    "\N{SMALL HYPHEN-MINUS}": "U+FE63",
    "\N{FULLWIDTH HYPHEN-MINUS}": "U+FF0D",
}
# Marks between groups of thousands that are no decimal mark anywhere; the first spelling stands for all.
GROUP_MARKS = MappingProxyType(
    {
        " ": " \N{NO-BREAK SPACE}\N{NARROW NO-BREAK SPACE}\N{THIN SPACE}",
        "'": "'\N{RIGHT SINGLE QUOTATION MARK}",
    }
)
_MINUSES = "".join(MINUS_MARKS)
_TO_ASCII = str.maketrans(dict.fromkeys(MINUS_MARKS, "-"))
_GROUPS = "".join(GROUP_MARKS.values())
_UNSIGNED = r"(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_NUMBER = re.compile(rf"[+-]?{_UNSIGNED}")
# Number-like also covers what number_from refuses with a reason (1D3, 3M3), so that a row of such cells is known as
# a row of data.
_DIGITS = rf"(?:[0-9]{{1,3}}(?:[{_GROUPS}][0-9]{{3}})+(?:[.,][0-9]*)?|[0-9][0-9.,']*|[.,][0-9]+)"
_LIKE = rf"[+\-{_MINUSES}]?{_DIGITS}(?:[eEdD][+\-{_MINUSES}]?[0-9]+)?"
_LETTERS = "A-Za-zµμ%°Ω"
_NUMBER_LIKE = re.compile(rf"{_LIKE}\s?[{_LETTERS}]{{0,3}}|{_LIKE}\s?(?:rad/s|degrees|V/V)|[0-9]+[kKMGRm][0-9]+")
_COMPLEX_LIKE = re.compile(
    rf"\(?\s*(?:{_LIKE}\s*[+\-{_MINUSES}]\s*)?(?:{_LIKE}\s*\*?\s*[ij]|[ij]\s*\*?\s*{_LIKE})\s*\)?"
)
_PAIR_LIKE = re.compile(rf"\(\s*{_LIKE}\s*[,;]\s*{_LIKE}\s*\)")

_IMAGINARY = rf"(?P<sign>[+-])?\s*(?:(?P<before>{_UNSIGNED})\s*\*?\s*[ij]|[ij]\s*\*?\s*(?P<after>{_UNSIGNED}))"
_COMPLEX = re.compile(rf"(?:(?P<real>[+-]?{_UNSIGNED})\s*(?=[+-]))?{_IMAGINARY}")
_PAIR = re.compile(rf"\(\s*([+-]?{_UNSIGNED})\s*[,;]\s*([+-]?{_UNSIGNED})\s*\)")
# Digits, then letters: a prefix, a unit, or both.
_WITH_TAIL = re.compile(rf"([+-]?(?:[0-9]+[.,]?[0-9]*|[.,][0-9]+))\s?([{_LETTERS}][{_LETTERS}/]*)")
_LETTER_AS_MARK = re.compile(r"[0-9]+[kKMGRm][0-9]+")
_SHOWN = 30
# Beyond plain digits no cell is as long; the patterns above need not face a megabyte.
_LONGEST = 200
_NO_TAILS: Mapping[str, int] = MappingProxyType({})


def number_from(text: str, *, decimal: str = ".", thousands: str = "", tails: Mapping[str, int] = _NO_TAILS) -> float:
    """Read one real number.

    Parameters
    ----------
    decimal
        The decimal mark, "." or ",".
    thousands
        The mark between groups of thousands, a key of `GROUP_MARKS` or "," or "."; "" for none.
    tails
        What may stand behind the digits, with the power of ten that it means: ``{"k": 3, "Hz": 0}``.

    Raises
    ------
    ValueError
        With what is wrong and what to do, in the words of a message's end.
    """
    cell = _plain(text, decimal, thousands)
    if cell is not None and _NUMBER.fullmatch(cell):
        return _finite(cell, text)
    with_tail = _WITH_TAIL.fullmatch(cell) if cell is not None and tails and len(cell) <= _LONGEST else None
    if with_tail and with_tail[2] in tails:
        return _finite(f"{with_tail[1]}e{tails[with_tail[2]]}", text)
    raise ValueError(_why_not(text, decimal))


def tail_of(text: str) -> str:
    """The letters behind the digits of a cell such as "1.2 kHz"; empty where it is no such cell."""
    cell = text.strip().translate(_TO_ASCII)
    match = _WITH_TAIL.fullmatch(cell) if len(cell) <= _LONGEST else None
    return match[2] if match else ""


def complex_from(text: str, *, decimal: str = ".") -> complex:
    """Read one complex number: ``1.2+3.4j``, ``1.2e3-4i``, ``1.2+j3.4``, ``(1.2,3.4)`` or a real number.

    Raises
    ------
    ValueError
        As `number_from`.
    """
    cell = _plain(text, decimal)
    if cell is None or len(cell) > _LONGEST:
        raise ValueError(_why_not(text, decimal))
    pair = _PAIR.fullmatch(cell)
    if pair:
        return complex(_finite(pair[1], text), _finite(pair[2], text))
    if _NUMBER.fullmatch(cell):
        return complex(_finite(cell, text), 0.0)
    if cell.startswith("(") and cell.endswith(")"):
        cell = cell[1:-1].strip()
    match = _COMPLEX.fullmatch(cell)
    if match is None:
        raise ValueError(
            f"{show(text)} is not a complex number such as 1.2+3.4j; measure the point again or remove the row"
        )
    imaginary = (match["sign"] or "+") + (match["before"] or match["after"])
    return complex(_finite(match["real"] or "0", text), _finite(imaginary, text))


def is_number_like(text: str) -> bool:
    """Whether a cell looks like a number, also a wrongly written one, or like a complex number."""
    cell = text.strip()
    return len(cell) <= _LONGEST and (bool(_NUMBER_LIKE.fullmatch(cell)) or is_complex_like(cell))


def is_complex_like(text: str) -> bool:
    """Whether a cell has the form of a complex number: an imaginary unit, or a pair in parentheses."""
    if not ("j" in text or "i" in text or "(" in text):
        return False
    cell = text.strip()
    return len(cell) <= _LONGEST and bool(_COMPLEX_LIKE.fullmatch(cell) or _PAIR_LIKE.fullmatch(cell))


def show(text: str) -> str:
    """A cell as it may stand in a message: quoted, on one line, not long."""
    return repr(text if len(text) <= _SHOWN else text[: _SHOWN - 1] + "…")


@lru_cache
def grouped(decimal: str, thousands: str) -> re.Pattern[str]:
    """A number with marks between its groups of thousands, without exponent, maybe with letters behind."""
    mark = re.escape(GROUP_MARKS.get(thousands, thousands))
    return re.compile(
        rf"[+-]?[1-9][0-9]{{0,2}}(?:[{mark}][0-9]{{3}})+(?:{re.escape(decimal)}[0-9]*)?(?:\s?[{_LETTERS}][{_LETTERS}/]*)?"
    )


def _plain(text: str, decimal: str, thousands: str = "") -> str | None:
    """The cell with ASCII minus and decimal point, groups closed up; None where the other mark shows up as well."""
    cell = text.strip().translate(_TO_ASCII)
    if thousands and len(cell) <= _LONGEST and grouped(decimal, thousands).fullmatch(cell):
        digits = re.match(r"[^A-Za-zµμ%°Ω]*", cell)
        end = digits.end() if digits else len(cell)
        cell = re.sub(rf"[{re.escape(GROUP_MARKS.get(thousands, thousands))}]", "", cell[:end].rstrip()) + cell[end:]
    if decimal == ",":
        return None if "." in cell else cell.replace(",", ".")
    return cell


def _finite(cell: str, text: str) -> float:
    value = float(cell)
    underflow = value == 0 and re.search("[1-9]", re.split("[eE]", cell)[0])
    if not math.isfinite(value) or underflow:
        size = "small" if underflow else "large"
        raise ValueError(
            f"{show(text)} is too {size} for a double-precision number; correct the cell or remove the row"
        )
    return value


def _why_not(text: str, decimal: str) -> str:
    cell = text.strip().translate(_TO_ASCII)
    shown = show(text.strip())
    mark, other, other_word = ("comma", ".", "point") if decimal == "," else ("point", ",", "comma")
    if not cell:
        return "the cell is empty; measure the point again or remove the row"
    if len(cell) > _LONGEST:
        return f"{shown} has {len(cell)} characters and is no plain number; check the line"
    if re.fullmatch(r"[+-]?(nan|inf|infinity|#n/a|n/a|na)", cell.lower()):
        return f"{shown} is not a finite number; measure the point again or remove the row"
    if re.fullmatch(r"[+-]?[0-9.,]+[dD][+-]?[0-9]+", cell):
        return f"{shown} has a Fortran exponent; write it with E, as in 1E3"
    if re.fullmatch(rf"[+-]?[0-9]{{1,3}}(?:[,.{_GROUPS}][0-9]{{3}})+(?:[.,][0-9]+)?", cell):
        return f"{shown} has thousands separators; export the numbers without them"
    if other in cell and re.fullmatch(r"[+-]?[0-9.,]+([eE][+-]?[0-9]+)?", cell):
        return f"{shown} has a {other_word} where the decimal mark is a {mark}; export with one decimal mark"
    if _LETTER_AS_MARK.fullmatch(cell):
        return f"{shown} has a letter in place of the decimal mark, as on resistors; write 3.3M or 3.3E6 for 3M3"
    if re.fullmatch(rf"[+-]?[0-9.,]+(?:[eE][+-]?[0-9]+)?\s*[{_LETTERS}/]+", cell):
        return f"{shown} has a prefix or unit; write the plain number and put the unit into the header"
    if is_complex_like(cell):
        return f"{shown} is a complex number where a real one belongs; name the column as complex"
    return f"{shown} is not a number; measure the point again or remove the row"
