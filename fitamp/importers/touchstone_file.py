"""What a Touchstone file says of itself: the record that its check fills in, and the option line.

Follows the Touchstone File Format Specification, versions 1.1 and 2.0 (IBIS Open Forum).
"""

from __future__ import annotations

from dataclasses import dataclass, field

from fitamp.errors import SweepError
from fitamp.importers.cells import number_from, show
from fitamp.importers.fault import at_cell, at_line

__all__ = ["Data", "Scan", "check_reference", "read_options"]

_UNITS = {"hz": "Hz", "khz": "kHz", "mhz": "MHz", "ghz": "GHz"}
_FORMS = ("ri", "ma", "db")
_PARAMETERS = ("s", "y", "z", "g", "h")
_WORDS = frozenset((*_UNITS, *_FORMS, *_PARAMETERS, "r"))


@dataclass(slots=True)
class Scan:
    """What the check found; `kept` are the lines of network data and structure, comments taken off.

    ports, version, unit, form : as the file says ("1.x" where it names no version)
    row_lines : the line on which each frequency stands
    noise_rows : rows of noise data, which are no part of a sweep
    defaults : what the option line left to the specification's defaults
    """

    file: str
    ports: int
    version: str = "1.x"
    unit: str = ""
    form: str = ""
    matrix: str = "full"
    order: str = ""
    option_line: int | None = None
    declared_frequencies: tuple[int, int] | None = None  # count, line
    kept: list[str] = field(default_factory=list)
    row_lines: list[int] = field(default_factory=list)
    row_freq: list[float] = field(default_factory=list)
    noise_rows: int = 0
    defaults: tuple[str, ...] = ()

    @property
    def numbers_per_row(self) -> int:
        """Numbers that belong to one frequency, itself included."""
        pairs = self.ports**2 if self.matrix == "full" else self.ports * (self.ports + 1) // 2
        return 1 + 2 * pairs

    def refuse(self, line: int | None, text: str, *, part: str = "") -> SweepError:
        """The error for a fault on a line, or in a part of it."""
        if not line:
            return SweepError(f"{self.file}: {text}")
        return at_cell(self.file, line, part, text, quoted=False) if part else at_line(self.file, line, text)


@dataclass(frozen=True, slots=True)
class Data:
    """One line of numbers."""

    line: int
    numbers: tuple[float, ...]
    text: str


def read_options(found: Scan, number: int, text: str) -> None:
    """Read the option line; each option at most once, in any order, defaults GHz S MA R 50 as specified."""
    tokens = text[1:].split()
    options: dict[str, str] = {}
    index = 0
    while index < len(tokens):
        token = tokens[index]
        low = token.lower()
        if low in _UNITS:
            kind, value = "frequency unit", _UNITS[low]
        elif low in _FORMS:
            kind, value = "format", low
        elif low in _PARAMETERS:
            kind, value = "parameter", low.upper()
        elif low == "r":
            first = index + 1
            while index + 1 < len(tokens) and tokens[index + 1].lower() not in _WORDS:
                index += 1
            kind, value = "reference", " ".join(tokens[first : index + 1])
        else:
            text = f"option {show(token)} is not known; expected a line such as # Hz S RI R 50"
            raise found.refuse(number, text, part=token)
        if kind in options:
            raise found.refuse(number, f"the option line names the {kind} twice; keep one")
        options[kind] = value
        index += 1
    if options.get("parameter", "S") != "S":
        raise found.refuse(
            number,
            f"{options['parameter']}-parameters are no loop gain; export the trace as S-parameters (# Hz S RI R 50)",
        )
    if "reference" in options and not options["reference"]:
        raise found.refuse(number, "R has no value; write the reference resistance in ohms, as in R 50")
    for token in options.get("reference", "50").split():
        check_reference(found, number, token)
    found.unit, found.form = options.get("frequency unit", "GHz"), options.get("format", "ma")
    defaults = {"frequency unit": "GHz", "parameter": "S", "format": "MA", "reference": "R 50"}
    found.defaults = tuple(default for kind, default in defaults.items() if kind not in options)


def check_reference(found: Scan, number: int, token: str) -> None:
    try:
        value = number_from(token)
    except ValueError as error:
        raise found.refuse(number, f"reference resistance: {error}") from None
    if value <= 0:
        raise found.refuse(number, f"reference resistance {token} must be above 0 ohm; correct it")
