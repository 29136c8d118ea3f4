"""Text tables (CSV and its kin) to sweeps.

Layout and header are told first (`dialect`, `header`, `columns`); pandas then reads the rows as text, and every
cell in use is converted strictly. Nothing is repaired or left out in silence.
"""

from __future__ import annotations

import io
import math
from collections.abc import Callable
from typing import TYPE_CHECKING, TypeVar

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.errors import SweepError
from fitamp.importers.cells import MINUS, complex_from, is_complex_like, number_from
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.columns import Column, Columns, chosen_columns, told_columns
from fitamp.importers.dialect import Block, Separator, decimal_mark, find_block, protected
from fitamp.importers.header import find_header, is_header_row
from fitamp.importers.points import Points, finish
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.source import Source
from fitamp.importers.text import Text, decode
from fitamp.sweep import Decision, Origin, Sweep

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["read_csv"]

_Number = TypeVar("_Number", float, complex)

_HZ_PER = {Unit.HZ: 1.0, Unit.KHZ: 1e3, Unit.MHZ: 1e6, Unit.GHZ: 1e9, Unit.RAD_PER_S: 1 / (2 * math.pi)}
# Real and imaginary part, and magnitude and phase, of one file agree when they differ by less than this part of |T|:
# columns rounded to three digits, or to a tenth of a degree, still do.
_AGREEMENT = 5e-3


def read_csv(source: Source, *, columns: ColumnChoice | None = None) -> Sweep:
    """Read a text table, its sign not yet looked at.

    Raises
    ------
    SweepError
        When the table cannot be read without guessing; the message has file, line and column.
    """
    text = decode(source)
    file = source.file
    block = find_block(file, text.lines)
    header = find_header(file, block)
    frame = _read_frame(file, block)
    if columns is not None:
        used = chosen_columns(file, columns, header)
    else:
        used = told_columns(file, header, _complex_columns(frame))
    decimal, decimal_reason = decimal_mark(file, _marked_cells(frame, block))
    decisions = [
        *source.decisions,
        text.decision,
        Decision(topic="separator", choice=block.separator.label, reason=_separator_reason(block)),
        Decision(topic="decimal mark", choice="comma" if decimal == "," else "point", reason=decimal_reason),
        *header.decisions,
        *used.decisions,
        *_aside(text, block, used, frame),
    ]
    freq_hz = _frequency(file, frame, block, used.frequency, decimal)
    gain = _gain(file, frame, block, used.gain, decimal)
    if used.check:
        decisions.append(_check_agreement(file, block, gain, _gain(file, frame, block, used.check, decimal)))
    points = Points(lines=tuple(row.number for row in block.rows), freq_hz=freq_hz, gain=gain)
    trace = ", ".join(column.name or f"column {column.index + 1}" for column in used.gain)
    origin = Origin(file=file, form="csv", trace=trace, sha256=source.sha256)
    return finish(points, origin=origin, decisions=tuple(decisions), may_fall=True)


def _read_frame(file: str, block: Block) -> pd.DataFrame:
    """The rows as text, one stripped column per cell."""
    import pandas as pd

    content = "\n".join(protected(row.text, block.separator) for row in block.rows)
    frame = pd.read_csv(
        io.StringIO(content),
        sep=r"\s+" if block.separator is Separator.SPACE else block.separator.value,
        header=None,
        names=list(range(block.width)),
        index_col=False,
        dtype=str,
        na_filter=False,
        skipinitialspace=block.separator is not Separator.TAB,
        skip_blank_lines=False,
        engine="c",
    )
    if len(frame) != len(block.rows):
        raise SweepError(
            f"{file}, line {block.rows[0].number}: quotes in the rows below run over line ends; export without quotes"
        )
    for index in range(block.width):
        frame[index] = frame[index].str.strip()
    return frame


def _complex_columns(frame: pd.DataFrame) -> list[int]:
    return [index for index in range(frame.shape[1]) if any(map(is_complex_like, frame[index].head(3)))]


def _marked_cells(frame: pd.DataFrame, block: Block) -> list[tuple[int, str]]:
    """Line and text of the cells that have a comma or a point."""
    cells: list[tuple[int, str]] = []
    for index in range(frame.shape[1]):
        texts = frame[index].tolist()
        marked = np.flatnonzero(frame[index].str.contains("[.,]").to_numpy(dtype=bool))
        cells += [(block.rows[row].number, texts[row]) for row in marked]
    return cells


def _separator_reason(block: Block) -> str:
    trailing = "; the one at the end of every row is taken off" if block.trailing else ""
    return f"with it the rows from line {block.rows[0].number} are {block.width} columns of numbers{trailing}"


def _aside(text: Text, block: Block, used: Columns, frame: pd.DataFrame) -> list[Decision]:
    """What is in the file and not in the sweep."""
    decisions = []
    above = sum(bool(line.text.strip()) for line in block.above)
    if block.comments:
        reason = "comment lines among the rows are not read"
        decisions.append(Decision(topic="comments", choice=f"{block.comments} left aside", reason=reason))
    taken = {column.index for column in (used.frequency, *used.gain, *used.check)}
    others = [str(index + 1) for index in range(block.width) if index not in taken]
    if others:
        reason = "not part of the loop gain in use"
        decisions.append(Decision(topic="other columns", choice=f"{', '.join(others)} left aside", reason=reason))
    if any(frame[index].str.contains(MINUS, regex=False).any() for index in taken):
        reason = "the file writes U+2212 for the minus sign"
        decisions.append(Decision(topic="minus sign", choice="U+2212 read as minus", reason=reason))
    if above:
        reason = f"{above} of {len(text.lines)} lines stand above the numbers"
        decisions.append(Decision(topic="first row", choice=f"line {block.rows[0].number}", reason=reason))
    return decisions


def _frequency(file: str, frame: pd.DataFrame, block: Block, column: Column, decimal: str) -> FloatArray:
    values = np.array(_convert(file, frame, block, column, lambda text: number_from(text, decimal=decimal)))
    return values * _HZ_PER[column.unit or Unit.HZ]


def _gain(file: str, frame: pd.DataFrame, block: Block, columns: tuple[Column, ...], decimal: str) -> ComplexArray:
    """Complex loop gain from its one or two columns, shape (n,)."""
    first = columns[0]
    if first.quantity is Quantity.COMPLEX:
        numbers = _convert(file, frame, block, first, lambda text: complex_from(text, decimal=decimal))
        return np.array(numbers, dtype=complex)
    a, b = (
        np.array(_convert(file, frame, block, column, lambda text: number_from(text, decimal=decimal)))
        for column in columns
    )
    if first.quantity is Quantity.REAL:
        return np.asarray(a + 1j * b)
    if first.unit is Unit.DB:
        with np.errstate(over="ignore"):
            a = 10 ** (a / 20)
    fault = ~np.isfinite(a) | (a < 0)
    if fault.any():
        row = int(np.argmax(fault))
        what = "a linear magnitude below 0" if a[row] < 0 else "a level far beyond any loop gain"
        raise SweepError(
            f"{file}, line {block.rows[row].number}, {first.label}: {frame[first.index][row]!r} is {what}; "
            "check the unit of the column"
        )
    return np.asarray(a * np.exp(1j * (np.radians(b) if columns[1].unit is Unit.DEGREE else b)))


def _convert(
    file: str, frame: pd.DataFrame, block: Block, column: Column, read: Callable[[str], _Number]
) -> list[_Number]:
    """Every cell of a column as a number."""
    numbers = []
    for row, text in zip(block.rows, frame[column.index].tolist(), strict=True):
        try:
            numbers.append(read(text))
        except ValueError as error:
            if is_header_row(row, block):
                remedy = "one sweep per file: split the file there"
                raise SweepError(f"{file}, line {row.number}: a second header among the rows; {remedy}") from None
            raise SweepError(f"{file}, line {row.number}, {column.label}: {error}") from None
    return numbers


def _check_agreement(file: str, block: Block, gain: ComplexArray, other: ComplexArray) -> Decision:
    """Real and imaginary part are used where magnitude and phase say the same."""
    differs = np.abs(other - gain) > _AGREEMENT * np.abs(gain)
    if differs.any():
        line = block.rows[int(np.argmax(differs))].number
        raise SweepError(
            f"{file}, line {line}: real and imaginary part do not agree with magnitude and phase; "
            "say with --columns which of them to use"
        )
    return Decision(
        topic="magnitude and phase",
        choice="left aside",
        reason=f"they agree with real and imaginary part within {_AGREEMENT:g} of the magnitude",
    )
