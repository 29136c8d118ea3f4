"""The steps file: which sweep was taken with what added.

A CSV table with a header of the columns file, load_added_F, rz_added_ohm, temp_C and note, in any order; all but file
may be missing. A value is a plain number in that unit, or has its own ("5 pF", "-400 Ohm"); an empty cell is nothing
added. Lines that start with # are remarks. Names of files are relative to the steps file.
"""

from __future__ import annotations

import csv
import os
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from fitamp.elements.condition import Condition
from fitamp.errors import InputError, UsageError
from fitamp.units import parse_quantity

__all__ = ["COLUMNS", "Step", "read_steps"]

# Columns and the unit of their numbers; None for text.
COLUMNS: dict[str, str | None] = {
    "file": None,
    "load_added_F": "F",
    "rz_added_ohm": "Ω",
    "temp_C": "°C",
    "note": None,
}
# A list of sweeps is a page of text; a file beyond this is something else, given by mistake.
LARGEST_FILE_BYTES = 1_000_000
_PLAIN_NUMBER = re.compile(r"[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?")
_EXAMPLES = {"F": "farads, such as 5 pF or 5e-12", "Ω": "ohms, such as -400 Ohm or -400", "°C": "degrees, such as 25"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """One line of a steps file.

    path : of the sweep's file, seen from where the steps file was; line : its number in the steps file, from 1
    """

    path: Path
    condition: Condition
    line: int


def read_steps(path: str | os.PathLike[str]) -> tuple[Step, ...]:
    """Read a steps file.

    Raises
    ------
    InputError
        In one line, with file, line number, what was found and what was expected.
    """
    file = os.fspath(path)
    lines = _lines(file)
    header_line, header = next(lines, (0, ""))
    if not header:
        raise InputError(f"{file}: is empty; expected a header such as {','.join(COLUMNS)}")
    # Decimal commas are refused in any case, so that the header alone tells the separator.
    separator = max(",;\t", key=header.count)
    names = _columns(f"{file}, line {header_line}", _cells(f"{file}, line {header_line}", header, separator))
    steps: list[Step] = []
    seen: dict[Path, int] = {}
    for number, line in lines:
        where = f"{file}, line {number}"
        step = _step(where, names, _cells(where, line, separator), Path(file).parent, number)
        if step.path in seen:
            raise InputError(
                f"{where}: {step.path.name} stands in line {seen[step.path]} already; a sweep belongs to one step"
            )
        seen[step.path] = number
        steps.append(step)
    if not steps:
        raise InputError(f"{file}: has no steps below its header; write one line for each sweep")
    return tuple(steps)


def _lines(file: str) -> Iterator[tuple[int, str]]:
    """Lines with something in them, with their numbers."""
    try:
        with Path(file).open("rb") as stream:
            data = stream.read(LARGEST_FILE_BYTES + 1)
    except FileNotFoundError:
        raise InputError(f"{file}: no such file; check the path of the steps file") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputError(f"{file}: cannot be read ({reason}); check the path of the steps file") from error
    if len(data) > LARGEST_FILE_BYTES:
        raise InputError(f"{file}: is larger than 1 MB; a steps file is a list of sweeps")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        place = data[: error.start].count(b"\n") + 1
        raise InputError(f"{file}, line {place}: is not UTF-8 text; save the file as UTF-8") from error
    for number, line in enumerate(text.splitlines(), start=1):
        if line.strip() and not line.lstrip().startswith("#"):
            yield number, line


def _cells(where: str, line: str, separator: str) -> list[str]:
    try:
        (cells,) = csv.reader([line], delimiter=separator, strict=True, skipinitialspace=True)
    except (csv.Error, ValueError) as error:
        raise InputError(f"{where}: is not a line of CSV ({error}); check its quotes") from error
    return [cell.strip() for cell in cells]


def _columns(where: str, cells: Sequence[str]) -> list[str]:
    by_lower = {name.lower(): name for name in COLUMNS}
    names = []
    for cell in cells:
        name = by_lower.get(cell.lower())
        if name is None:
            raise InputError(f"{where}: unknown column {cell!r}; known are {', '.join(COLUMNS)}")
        if name in names:
            raise InputError(f"{where}: column {name} stands there twice; leave one out")
        names.append(name)
    if "file" not in names:
        raise InputError(f"{where}: column file is missing; it names the sweep of each step")
    return names


def _step(where: str, names: Sequence[str], cells: Sequence[str], folder: Path, number: int) -> Step:
    if len(cells) != len(names):
        raise InputError(
            f"{where}: has {len(cells)} cells, but the header {len(names)} columns; a cell with the separator in it "
            "goes in quotes"
        )
    by_name = dict(zip(names, cells, strict=True))
    if not by_name["file"] or not by_name["file"].isprintable():
        raise InputError(f"{where}: file is {by_name['file']!r}; expected the name of a sweep's file")
    note = by_name.get("note", "")
    if not note.isprintable():
        raise InputError(f"{where}: note has characters that cannot be printed")
    temperature = by_name.get("temp_C", "")
    try:
        condition = Condition(
            load_added_f=_number(where, "load_added_F", by_name.get("load_added_F", "")),
            rz_added_ohm=_number(where, "rz_added_ohm", by_name.get("rz_added_ohm", "")),
            temp_c=_number(where, "temp_C", temperature) if temperature else None,
            note=note,
        )
    except UsageError as error:
        raise InputError(f"{where}: {error}") from None
    return Step(path=folder / by_name["file"], condition=condition, line=number)


def _number(where: str, name: str, cell: str) -> float:
    if not cell:
        return 0.0
    unit = COLUMNS[name] or ""
    plain = cell.replace("\N{MINUS SIGN}", "-")
    if _PLAIN_NUMBER.fullmatch(plain):
        return float(plain) + 0.0
    try:
        if unit == "°C":
            raise ValueError(f"{cell!r} is not a number")
        return parse_quantity(plain, unit)
    except ValueError as error:
        raise InputError(f"{where}: {name}: {error}; write {_EXAMPLES[unit]}") from None
