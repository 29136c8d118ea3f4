"""One cell of a text file to a number, strictly.

A number is plain decimal: sign, digits with at most one point, exponent with E. All else is refused with the
likely reason, because libraries read some of it wrongly (1e400 as infinity) and the rest as text.
"""

from __future__ import annotations

import math
import re

__all__ = ["MINUS", "complex_from", "is_complex_like", "is_number_like", "number_from", "show"]

MINUS = "\N{MINUS SIGN}"
_UNSIGNED = r"(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_NUMBER = re.compile(rf"[+-]?{_UNSIGNED}")
# Number-like also covers what number_from refuses with a reason (1D3, 1k, 1'000), so that a row of such
# cells is known as a row of data.
_LIKE = rf"[+\-{MINUS}]?(?:[0-9][0-9.,']*|[.,][0-9]+)(?:[eEdD][+\-{MINUS}]?[0-9]+)?"
_NUMBER_LIKE = re.compile(rf"{_LIKE}\s?[A-Za-zµ%°]{{0,3}}")
_COMPLEX_LIKE = re.compile(rf"\(?\s*(?:{_LIKE}\s*[+\-{MINUS}]\s*)?(?:{_LIKE}\s*\*?\s*[ij]|[ij]\s*\*?\s*{_LIKE})\s*\)?")
_PAIR_LIKE = re.compile(rf"\(\s*{_LIKE}\s*[,;]\s*{_LIKE}\s*\)")

_IMAGINARY = rf"(?P<sign>[+-])?\s*(?:(?P<before>{_UNSIGNED})\s*\*?\s*[ij]|[ij]\s*\*?\s*(?P<after>{_UNSIGNED}))"
_COMPLEX = re.compile(rf"(?:(?P<real>[+-]?{_UNSIGNED})\s*(?=[+-]))?{_IMAGINARY}")
_PAIR = re.compile(rf"\(\s*([+-]?{_UNSIGNED})\s*[,;]\s*([+-]?{_UNSIGNED})\s*\)")
_SHOWN = 30


def number_from(text: str, *, decimal: str = ".") -> float:
    """Read one real number.

    Parameters
    ----------
    decimal
        The decimal mark, "." or ",".

    Raises
    ------
    ValueError
        With what is wrong and what to do, in the words of a message's end.
    """
    cell = _plain(text, decimal)
    if cell is None or not _NUMBER.fullmatch(cell):
        raise ValueError(_why_not(text, decimal))
    return _finite(cell, text)


def complex_from(text: str, *, decimal: str = ".") -> complex:
    """Read one complex number: ``1.2+3.4j``, ``1.2e3-4i``, ``1.2+j3.4``, ``(1.2,3.4)`` or a real number.

    Raises
    ------
    ValueError
        As `number_from`.
    """
    cell = _plain(text, decimal)
    if cell is None:
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
    return bool(_NUMBER_LIKE.fullmatch(text.strip())) or is_complex_like(text)


def is_complex_like(text: str) -> bool:
    """Whether a cell has the form of a complex number: an imaginary unit, or a pair in parentheses."""
    cell = text.strip()
    return bool(_COMPLEX_LIKE.fullmatch(cell) or _PAIR_LIKE.fullmatch(cell))


def show(text: str) -> str:
    """A cell as it may stand in a message: quoted, on one line, not long."""
    return repr(text if len(text) <= _SHOWN else text[: _SHOWN - 1] + "…")


def _plain(text: str, decimal: str) -> str | None:
    """The cell with ASCII minus and decimal point; None where the other mark shows up as well."""
    cell = text.strip().replace(MINUS, "-")
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
    cell = text.strip().replace(MINUS, "-")
    shown = show(text.strip())
    mark, other, other_word = ("comma", ".", "point") if decimal == "," else ("point", ",", "comma")
    if not cell:
        return "the cell is empty; measure the point again or remove the row"
    if re.fullmatch(r"[+-]?(nan|inf|infinity|#n/a|n/a|na)", cell.lower()):
        return f"{shown} is not a finite number; measure the point again or remove the row"
    if re.fullmatch(r"[+-]?[0-9.,]+[dD][+-]?[0-9]+", cell):
        return f"{shown} has a Fortran exponent; write it with E, as in 1E3"
    if re.fullmatch(r"[+-]?[0-9]{1,3}(?:[,.' \u00a0\u202f\u2019][0-9]{3})+(?:[.,][0-9]+)?", cell):
        return f"{shown} has thousands separators; export the numbers without them"
    if other in cell and re.fullmatch(r"[+-]?[0-9.,]+([eE][+-]?[0-9]+)?", cell):
        return f"{shown} has a {other_word} where the decimal mark is a {mark}; export with one decimal mark"
    if re.fullmatch(r"[+-]?[0-9.,]+(?:[eE][+-]?[0-9]+)?\s*[A-Za-zµμΩ%°/]+", cell):
        return f"{shown} has a prefix or unit; write the plain number and put the unit into the header"
    if is_complex_like(cell):
        return f"{shown} is a complex number where a real one belongs; name the column as complex"
    return f"{shown} is not a number; measure the point again or remove the row"
