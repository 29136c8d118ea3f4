"""Line-numbered check of a Touchstone file, versions 1.x and 2.x, before any parser sees it.

It is stricter than the specification where a parser would go on in silence: no option line, a second one, falling
frequencies, NaN, wrong counts.
"""

from __future__ import annotations

from collections.abc import Sequence

from fitamp.errors import SweepError
from fitamp.importers.text import Line
from fitamp.importers.touchstone_file import Data, Scan
from fitamp.importers.touchstone_lines import Sorter

__all__ = ["scan"]

_NOISE_NUMBERS = 5


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
    network, noise = Sorter(found, ports).sort(lines)
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
    return found


def _split_noise(network: list[Data]) -> tuple[list[Data], list[Data]]:
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


def _check_rows(found: Scan, network: Sequence[Data]) -> None:
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
            found.kept.append("")  # one line per frequency: scikit-rf misreads a frequency that stands alone
            have = 0
        elif starts:
            raise _incomplete(found, have)
        found.kept[-1] = f"{found.kept[-1]} {data.text}"
        have += len(data.numbers)
        if have > wanted:
            raise found.refuse(
                data.line,
                f"{have} numbers for one frequency, expected {wanted} for {_ports_text(found.ports)}; "
                "check the number of ports in the file name",
            )
    if have != wanted:
        raise _incomplete(found, have)
    if found.matrix != "full":
        first = len(found.kept) - len(found.row_lines)
        found.kept[first:] = [_in_full(row, found) for row in found.kept[first:]]


def _in_full(row: str, found: Scan) -> str:
    """A row of half a matrix with the other half by symmetry: scikit-rf 1 leaves that half as it finds the memory."""
    frequency, *numbers = row.split()
    ports = range(found.ports)
    if found.matrix == "lower":
        cells = [(i, j) for i in ports for j in ports if j <= i]
    else:
        cells = [(i, j) for i in ports for j in ports if j >= i]
    pairs = dict(zip(cells, zip(numbers[::2], numbers[1::2], strict=True), strict=True))
    whole = (pairs.get((i, j)) or pairs[j, i] for i in ports for j in ports)
    return " ".join([frequency, *(number for pair in whole for number in pair)])


def _incomplete(found: Scan, have: int) -> SweepError:
    return found.refuse(
        found.row_lines[-1],
        f"{have} number{'s' if have > 1 else ''} for this frequency, expected {found.numbers_per_row} for "
        f"{_ports_text(found.ports)}; complete the row or check the number of ports in the file name",
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
