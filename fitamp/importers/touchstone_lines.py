"""The lines of a Touchstone file, sorted into structure, network data and noise data.

Keywords of version 2 as in the Touchstone File Format Specification, version 2.0 (IBIS Open Forum).
"""

from __future__ import annotations

import re
from collections.abc import Sequence

from fitamp.importers.cells import number_from, show
from fitamp.importers.text import Line
from fitamp.importers.touchstone_file import Data, Scan, check_reference, read_options

__all__ = ["Sorter"]

_V2_VERSIONS = ("2.0", "2.1")


class Sorter:
    """Goes through the lines once and sorts them into structure, network data and noise data."""

    def __init__(self, found: Scan, ports_by_name: int | None) -> None:
        self.found = found
        self.ports_by_name = ports_by_name
        self.network: list[Data] = []
        self.noise: list[Data] = []
        self.section = "head"  # head, information, reference, network, noise, end
        self.references_left = 0

    def sort(self, lines: Sequence[Line]) -> tuple[list[Data], list[Data]]:
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
        read_options(self.found, number, text)
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
            raise self.found.refuse(
                number,
                f"[Reference] lacks {self.references_left} value{'s' if self.references_left > 1 else ''}; complete it",
            )
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
                raise found.refuse(number, f"number {column}: {error}", part=token) from None
        data = Data(number, tuple(numbers), text)
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

    def _reference(self, number: int, value: str) -> None:
        if not self.found.ports:
            raise self.found.refuse(number, "[Reference] before [Number of Ports]; correct the order")
        self.references_left = self.found.ports
        self.section = "reference"
        if value:
            self._references(number, value)

    def _references(self, number: int, text: str) -> None:
        for token in text.split():
            check_reference(self.found, number, token)
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
    "version": Sorter._version,
    "number of ports": Sorter._ports,
    "two-port data order": Sorter._order,
    "number of frequencies": Sorter._frequencies,
    "number of noise frequencies": Sorter._noise_frequencies,
    "matrix format": Sorter._matrix,
    "reference": Sorter._reference,
    "begin information": Sorter._information,
    "end information": Sorter._end_information,
    "network data": Sorter._network_data,
    "noise data": Sorter._noise_data,
    "end": Sorter._end,
}
