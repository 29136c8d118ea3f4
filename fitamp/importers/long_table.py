"""Large files by a short way: what the first rows show, and pandas for all rows, if they are nothing but plain numbers.

Layout, header and notation are told from the first rows as for any file. The numbers are taken in one piece only where
no row could be read another way or be refused; else the whole file goes the way of all files, which knows lines and
reasons.
"""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.errors import SweepError
from fitamp.importers.blocks import Table, find_tables
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.dialect import Separator, find_block
from fitamp.importers.found import AGREED, Found
from fitamp.importers.gain import differing, frequency_hz, gain_fault, loop_gain
from fitamp.importers.points import Points
from fitamp.importers.quantity import Quantity
from fitamp.importers.readings import without_reading
from fitamp.importers.source import Source
from fitamp.importers.text import MAX_LINES, Text, decode
from fitamp.importers.understanding import Understood, understand

__all__ = ["long_table"]

# Sizes in bytes: below the first the long way takes no time; from the second the layout is told.
_LARGE = 1 << 20
_HEAD = 1 << 14
# From this version on pandas reads every number to the nearest double by itself.
_EXACT_PANDAS = (3, 1)
# What a number beyond the smallest double looks like: without it a 0 is one.
_MAY_UNDERFLOW = re.compile(rb"[eE]-[0-9]{3}|0{300}")


def long_table(source: Source, choice: ColumnChoice | None, *, large: int = _LARGE) -> Found | None:
    """The sweep of a large and plain file; None where the file is small, not plain, or at fault anywhere.

    Parameters
    ----------
    large
        Files from this size on, in bytes, are taken.
    """
    data = source.data
    head = data[: data.rfind(b"\n", 0, _HEAD) + 1]
    if len(data) < large or not head or (b"\r" in data and data.count(b"\r") != data.count(b"\r\n")):
        return None
    try:
        text = decode(replace(source, data=head))
        tables = find_tables(source.file, find_block(source.file, text.lines), text.lines)
        understood = understand(source.file, text, tables[0], choice)
        if len(tables) > 1 or not _is_plain(text, tables[0], understood):
            return None
        first = tables[0].rows[0].number
        numbers = _numbers(data, first, tables[0], understood)
        if numbers is None:
            return None
        text = replace(text, line_count=first - 1 + len(numbers[0]))
        understood = understand(source.file, text, tables[0], choice)
    except SweepError:
        return None
    return _found(data, first, understood, numbers)


def _is_plain(text: Text, table: Table, understood: Understood) -> bool:
    """Whether rows that go on like the first ones need no closer look."""
    columns = (understood.used.frequency, *understood.used.gain, *understood.used.check)
    return (
        not text.encoding.startswith("UTF-16")
        and not table.block.trailing
        and not table.closing
        and not understood.notation.thousands
        and understood.labels is None
        and all(column.quantity is not Quantity.COMPLEX for column in columns)
    )


def _numbers(data: bytes, first: int, table: Table, understood: Understood) -> list[FloatArray] | None:
    """All columns from line `first` on, each of shape (n,); None where a cell is anything but a plain number."""
    import pandas as pd

    start = 0
    for _ in range(first - 1):
        start = data.index(b"\n", start) + 1
    separator, decimal = table.block.separator, understood.notation.decimal
    gaps = " \t" if separator is Separator.SPACE else separator.value
    allowed = f"0123456789+-eE\r\n{decimal}{gaps}".encode()
    if len(data.translate(None, allowed)) != len(data[:start].translate(None, allowed)):
        return None
    exact: dict[str, Any] = {}
    if tuple(map(int, re.findall(r"\d+", pd.__version__)[:2])) < _EXACT_PANDAS:
        exact = {"float_precision": "round_trip"}  # which knows the decimal point alone
        data, decimal = data.replace(decimal.encode(), b"."), "."
    stream = io.BytesIO(data)
    stream.seek(start)
    try:
        frame = pd.read_csv(
            stream,
            sep=r"\s+" if separator is Separator.SPACE else separator.value,
            decimal=decimal,
            header=None,
            names=range(table.block.width),
            dtype=float,
            na_filter=False,  # an empty cell, also of a row that is too short, is an error then
            skip_blank_lines=False,
            nrows=MAX_LINES + 1,
            engine="c",
            **exact,
        )
    except ValueError:
        return None
    # Rows that are too long make their first cells an index.
    if not isinstance(frame.index, pd.RangeIndex) or first - 1 + len(frame) > MAX_LINES:
        return None
    columns = [frame[index].to_numpy(dtype=float) for index in range(table.block.width)]
    return columns if all(np.isfinite(column).all() for column in columns) else None


def _found(data: bytes, first: int, understood: Understood, numbers: Sequence[FloatArray]) -> Found | None:
    """The sweep; None where a number says that it is none, or the frequency does not go one way."""
    used = understood.used
    taken = [numbers[column.index] for column in (used.frequency, *used.gain, *used.check)]
    if any(without_reading(column).any() for column in taken):
        return None
    if not all(column.all() for column in taken) and _MAY_UNDERFLOW.search(data):
        return None
    freq_hz = frequency_hz(used.frequency, taken[0])
    rises = freq_hz[1:] > freq_hz[:-1]
    gain_parts = [numbers[column.index] for column in used.gain]
    if (not rises.all() and not (freq_hz[1:] < freq_hz[:-1]).all()) or gain_fault(used.gain, gain_parts)[0].any():
        return None
    gain, decisions = loop_gain(used.gain, gain_parts), understood.decisions
    if used.check:
        others = [numbers[column.index] for column in used.check]
        if gain_fault(used.check, others)[0].any() or differing(gain, loop_gain(used.check, others)).any():
            return None
        decisions = (*decisions, AGREED)
    points = Points(lines=range(first, first + len(freq_hz)), freq_hz=freq_hz, gain=gain)
    return Found(points=points, trace=used.trace, notes=understood.notes, decisions=decisions)
