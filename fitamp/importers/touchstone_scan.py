"""Line-numbered check of a Touchstone file, versions 1.x and 2.x, before any parser sees it.

Follows the Touchstone File Format Specification, versions 1.1 and 2.0 (IBIS Open Forum), and is stricter where a
parser would go on in silence: no option line, a second one, falling frequencies, NaN, wrong counts.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field

from fitamp.errors import SweepError
from fitamp.importers.cells import number_from, show
from fitamp.importers.text import Line

__all__ = ["Scan", "scan"]

_UNITS = {"hz": "Hz", "khz": "kHz", "mhz": "MHz", "ghz": "GHz"}
_FORMS = ("ri", "ma", "db")
_V2_VERSIONS = ("2.0", "2.1")
_NOISE_NUMBERS = 5


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

    def refuse(self, line: int | None, text: str) -> SweepError:
        """The error for a fault on a line."""
        return SweepError(f"{self.file}, line {line}: {text}" if line else f"{self.file}: {text}")


@dataclass(frozen=True, slots=True)
class _Data:
    """One line of numbers."""

    line: int
    numbers: tuple[float, ...]
    text: str


def scan(file: str, lines: Sequence[Line], ports: int | None) -> Scan:
    """Check all lines.

    Parameters
    ----------
    ports
        Number of ports that the file name says; None where it does not (``.ts``), then version 2 has to.

    Raises
    ------
    SweepError
        On the first fault, with its line.
    """
    found = Scan(file=file, ports=ports or 0)
    network, noise = _Sorter(found, ports).sort(lines)
    if found.option_line is None:
        raise found.refuse(None, "no option line; a Touchstone file needs one, such as # Hz S RI R 50, before its data")
    if not network:
        raise found.refuse(None, "no data; export the sweep again")
    if found.version == "1.x" and found.ports == 2:
        network, noise = _split_noise(network)
    _check_rows(found, network)
    _check_rising(found)
    _check_count(found)
    found.noise_rows = len(noise)
    found.kept += [data.text for data in network]
    return found


class _Sorter:
    """Goes through the lines once and sorts them into structure, network data and noise data."""

    def __init__(self, found: Scan, ports_by_name: int | None) -> None:
        self.found = found
        self.ports_by_name = ports_by_name
        self.network: list[_Data] = []
        self.noise: list[_Data] = []
        self.section = "head"  # head, information, reference, network, noise, end
        self.references_left = 0

    def sort(self, lines: Sequence[Line]) -> tuple[list[_Data], list[_Data]]:
        """Return network data and noise data."""
        for line in lines:
            text = line.text.split("!", 1)[0].strip()
            if not text:
                continue
            if self.section == "information" and not text.lower().startswith("[end information]"):
                continue
            if text.startswith("#"):
                self._option(line.number, text)
            elif text.startswith("["):
                self._keyword(line.number, text)
            else:
                self._data(line.number, text)
        self._finish()
        return self.network, self.noise

    def _option(self, number: int, text: str) -> None:
        if self.found.option_line is not None:
            raise self.found.refuse(
                number, f"a second option line, after the one on line {self.found.option_line}; keep one sweep per file"
            )
        if self.network:
            raise self.found.refuse(number, "the option line must stand before the data; move it up")
        self.found.option_line = number
        _read_options(self.found, number, text)
        self.found.kept.append(f"# {self.found.unit} S {self.found.form.upper()} R 50")

    def _keyword(self, number: int, text: str) -> None:
        match = re.fullmatch(r"\[\s*([^\]]+?)\s*\]\s*(.*)", text)
        if match is None:
            raise self.found.refuse(number, f"{show(text)} is not a keyword in brackets; correct the line")
        name, value = " ".join(match[1].lower().split()), match[2].strip()
        if name != "version" and self.found.version == "1.x":
            raise self.found.refuse(
                number, f"keyword [{match[1]}] needs [Version] 2.0 as the first keyword; complete the file"
            )
        if self.references_left:
            raise self.found.refuse(number, f"[Reference] lacks {self.references_left} values; complete it")
        if name not in _KEYWORDS:
            raise self.found.refuse(number, f"keyword [{match[1]}] cannot be used here; export plain S-parameters")
        _KEYWORDS[name](self, number, value)

    def _data(self, number: int, text: str) -> None:
        found = self.found
        if self.section == "end":
            raise found.refuse(number, "data after [End]; keep one sweep per file")
        if found.option_line is None:
            hint = "no option line before the data; a Touchstone file needs one, such as # Hz S RI R 50"
            raise found.refuse(number, hint)
        numbers = []
        for column, token in enumerate(text.split(), start=1):
            try:
                numbers.append(number_from(token.replace("\N{MINUS SIGN}", "?")))
            except ValueError as error:
                raise found.refuse(number, f"number {column}: {error}") from None
        data = _Data(number, tuple(numbers), text)
        if self.section == "reference":
            self._references(number, text)
        elif self.section == "noise":
            self.noise.append(data)
        elif found.version != "1.x" and self.section != "network":
            raise found.refuse(number, "data before [Network Data]; complete the file")
        else:
            self.network.append(data)

    def _version(self, number: int, value: str) -> None:
        if value not in _V2_VERSIONS:
            raise self.found.refuse(number, f"version {show(value)} is not known; expected 2.0 or 2.1, or no [Version]")
        if self.found.option_line is not None or self.found.version != "1.x":
            raise self.found.refuse(number, "[Version] must stand once, before the option line; correct the order")
        self.found.version = value
        self.found.kept.append(f"[Version] {value}")

    def _ports(self, number: int, value: str) -> None:
        ports = self._count(number, "Number of Ports", value)
        if self.ports_by_name is not None and ports != self.ports_by_name:
            raise self.found.refuse(
                number, f"[Number of Ports] {ports} does not fit a file name for {self.ports_by_name}; correct either"
            )
        self.found.ports = ports
        self.found.kept.append(f"[Number of Ports] {ports}")

    def _order(self, number: int, value: str) -> None:
        if value not in ("12_21", "21_12"):
            raise self.found.refuse(number, f"[Two-Port Data Order] {show(value)}; expected 12_21 or 21_12")
        self.found.order = value
        self.found.kept.append(f"[Two-Port Data Order] {value}")

    def _frequencies(self, number: int, value: str) -> None:
        self.found.declared_frequencies = (self._count(number, "Number of Frequencies", value), number)

    def _noise_frequencies(self, number: int, value: str) -> None:
        self._count(number, "Number of Noise Frequencies", value)

    def _matrix(self, number: int, value: str) -> None:
        if value.lower() not in ("full", "lower", "upper"):
            raise self.found.refuse(number, f"[Matrix Format] {show(value)}; expected Full, Lower or Upper")
        self.found.matrix = value.lower()
        self.found.kept.append(f"[Matrix Format] {value}")

    def _reference(self, number: int, value: str) -> None:
        if not self.found.ports:
            raise self.found.refuse(number, "[Reference] before [Number of Ports]; correct the order")
        self.references_left = self.found.ports
        self.section = "reference"
        if value:
            self._references(number, value)

    def _references(self, number: int, text: str) -> None:
        for token in text.split():
            _check_reference(self.found, number, token)
            self.references_left -= 1
        if self.references_left < 0:
            raise self.found.refuse(number, f"[Reference] has more than {self.found.ports} values; correct it")
        if not self.references_left:
            self.section = "head"

    def _information(self, _number: int, _value: str) -> None:
        self.section = "information"

    def _end_information(self, _number: int, _value: str) -> None:
        self.section = "head"

    def _network_data(self, number: int, _value: str) -> None:
        found = self.found
        if self.network or self.section == "network":
            raise found.refuse(number, "a second [Network Data]; keep one sweep per file")
        if not found.ports:
            raise found.refuse(number, "[Number of Ports] is missing before [Network Data]; complete the file")
        if found.declared_frequencies is None:
            raise found.refuse(number, "[Number of Frequencies] is missing before [Network Data]; complete the file")
        if found.ports == 2 and not found.order:
            raise found.refuse(number, "[Two-Port Data Order] is missing before [Network Data]; complete the file")
        self.section = "network"
        found.kept.append("[Network Data]")

    def _noise_data(self, _number: int, _value: str) -> None:
        self.section = "noise"

    def _end(self, _number: int, _value: str) -> None:
        self.section = "end"

    def _count(self, number: int, keyword: str, value: str) -> int:
        if not re.fullmatch(r"[0-9]{1,9}", value) or int(value) < 1:
            raise self.found.refuse(number, f"[{keyword}] {show(value)} is not a whole number above 0; correct it")
        return int(value)

    def _finish(self) -> None:
        if self.section == "information":
            raise self.found.refuse(None, "[Begin Information] without [End Information]; complete the file")
        if self.found.version != "1.x" and self.section != "end":
            raise self.found.refuse(None, "the file stops before [End]; export it again")
        if not self.found.ports:
            raise self.found.refuse(None, "the number of ports is not known; name the file .s1p or .s2p")


_KEYWORDS = {
    "version": _Sorter._version,
    "number of ports": _Sorter._ports,
    "two-port data order": _Sorter._order,
    "number of frequencies": _Sorter._frequencies,
    "number of noise frequencies": _Sorter._noise_frequencies,
    "matrix format": _Sorter._matrix,
    "reference": _Sorter._reference,
    "begin information": _Sorter._information,
    "end information": _Sorter._end_information,
    "network data": _Sorter._network_data,
    "noise data": _Sorter._noise_data,
    "end": _Sorter._end,
}


def _read_options(found: Scan, number: int, text: str) -> None:
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
        elif low in ("s", "y", "z", "g", "h"):
            kind, value = "parameter", low.upper()
        elif low == "r":
            kind, value = "reference", " ".join(tokens[index + 1 :])
            index = len(tokens)
        else:
            raise found.refuse(number, f"option {show(token)} is not known; expected a line such as # Hz S RI R 50")
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
        _check_reference(found, number, token)
    found.unit, found.form = options.get("frequency unit", "GHz"), options.get("format", "ma")
    defaults = {"frequency unit": "GHz", "parameter": "S", "format": "MA", "reference": "R 50"}
    found.defaults = tuple(default for kind, default in defaults.items() if kind not in options)


def _check_reference(found: Scan, number: int, token: str) -> None:
    try:
        value = number_from(token)
    except ValueError as error:
        raise found.refuse(number, f"reference resistance: {error}") from None
    if value <= 0:
        raise found.refuse(number, f"reference resistance {token} must be above 0 Ω; correct it")


def _split_noise(network: list[_Data]) -> tuple[list[_Data], list[_Data]]:
    """Network rows and the noise block of a version 1 two-port: rows of five numbers to the end of the file.

    Noise data begin where the frequency does not rise any more (Touchstone 1.1).
    """
    start = len(network)
    while start > 0 and len(network[start - 1].numbers) == _NOISE_NUMBERS:
        start -= 1
    for index in range(max(start, 1), len(network)):
        before = [data.numbers[0] for data in network[:index] if len(data.numbers) % 2]
        if before and network[index].numbers[0] <= before[-1]:
            return network[:index], network[index:]
    return network, []


def _check_rows(found: Scan, network: Sequence[_Data]) -> None:
    """Each frequency has its count of numbers; a row may go on over several lines, each of whole pairs."""
    wanted = found.numbers_per_row
    have = wanted
    for data in network:
        starts = len(data.numbers) % 2 == 1
        if have == wanted:
            if not starts:
                raise found.refuse(
                    data.line,
                    f"{len(data.numbers)} numbers; a row has a frequency and pairs, {wanted} numbers for "
                    f"{_ports_text(found.ports)}; check the number of ports in the file name",
                )
            found.row_lines.append(data.line)
            found.row_freq.append(data.numbers[0])
            have = 0
        elif starts:
            raise _incomplete(found, have)
        have += len(data.numbers)
        if have > wanted:
            raise found.refuse(
                data.line,
                f"{have} numbers for one frequency, expected {wanted} for {_ports_text(found.ports)}; "
                "check the number of ports in the file name",
            )
    if have != wanted:
        raise _incomplete(found, have)


def _incomplete(found: Scan, have: int) -> SweepError:
    return found.refuse(
        found.row_lines[-1],
        f"{have} numbers for this frequency, expected {found.numbers_per_row} for {_ports_text(found.ports)}; "
        "complete the row or check the number of ports in the file name",
    )


def _ports_text(ports: int) -> str:
    return f"{ports} port" + ("s" if ports > 1 else "")


def _check_rising(found: Scan) -> None:
    previous = None
    for line, f in zip(found.row_lines, found.row_freq, strict=True):
        if f < 0:
            raise found.refuse(line, f"frequency {f:g} {found.unit} is negative; correct the row")
        if previous is not None and f <= previous:
            raise found.refuse(
                line,
                f"frequency must rise, but {f:g} {found.unit} follows {previous:g} {found.unit}; "
                "sort the rows or export one sweep per file",
            )
        previous = f


def _check_count(found: Scan) -> None:
    if found.declared_frequencies is None:
        return
    count, line = found.declared_frequencies
    if count != len(found.row_lines):
        raise found.refuse(
            line, f"[Number of Frequencies] {count}, but there are {len(found.row_lines)}; export the file again"
        )
    found.kept.insert(found.kept.index("[Network Data]"), f"[Number of Frequencies] {count}")
