"""Text tables (CSV and its kin) to sweeps.

Layout and header are told first (`dialect`, `blocks`, `header`, `columns`, `notation`); every cell in use is then
converted strictly (`found`). Nothing is repaired or left out in silence.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from fitamp.errors import SweepError, UsageError
from fitamp.importers.blocks import find_tables
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.dialect import find_block
from fitamp.importers.fault import at_line
from fitamp.importers.found import Found, found_in
from fitamp.importers.long_table import long_table
from fitamp.importers.points import finish
from fitamp.importers.source import Source
from fitamp.importers.text import decode
from fitamp.importers.understanding import understand
from fitamp.sweep import Decision, Origin, Sweep

__all__ = ["read_csv", "read_csv_sweeps"]

_SHOWN = 5
_SECOND_HEADER = "a second header among the rows"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Unread:
    """A table that cannot be read, among others that perhaps can."""

    line: int
    error: SweepError
    told: str = _SECOND_HEADER


def read_csv(source: Source, *, columns: ColumnChoice | None = None, sweep: int | None = None) -> Sweep:
    """Read one sweep from a text table, its sign not yet looked at.

    Parameters
    ----------
    sweep
        Which one of a file that holds several, counted from 1 in the order of the file.

    Raises
    ------
    SweepError
        When the table cannot be read without guessing; the message has file, line and column.
    UsageError
        When the file does not hold as many sweeps.
    """
    found = _sweeps_in(source, columns)
    if sweep is None and len(found) > 1:
        raise _which(source.file, found)
    number = 1 if sweep is None else sweep
    if not 1 <= number <= len(found):
        holds = f"{len(found)} sweep" + ("s" if len(found) > 1 else "")
        raise UsageError(f"{source.file}: sweep {number} is not there; the file holds {holds}, counted from 1")
    return _finished(source, found, number, chosen=True)


def read_csv_sweeps(source: Source, *, columns: ColumnChoice | None = None) -> tuple[Sweep, ...]:
    """Read all sweeps of a text table in the order of the file, their signs not yet looked at.

    Raises
    ------
    SweepError
        When one of them cannot be read without guessing.
    """
    found = _sweeps_in(source, columns)
    return tuple(_finished(source, found, number, chosen=False) for number in range(1, len(found) + 1))


def _finished(source: Source, found: Sequence[Found | _Unread], number: int, *, chosen: bool) -> Sweep:
    one = found[number - 1]
    if isinstance(one, _Unread):
        raise one.error
    decisions = one.decisions
    if len(found) > 1:
        reason = "as given by --sweep" if chosen else "all of them are read"
        choice = f"{number} of {len(found)}, from line {one.points.lines[0]}"
        decisions = (*decisions, Decision(topic="sweep", choice=choice, reason=f"{one.told}; {reason}"))
    origin = Origin(file=source.file, form="csv", trace=one.trace, sha256=source.sha256, notes=one.notes)
    return finish(one.points, origin=origin, decisions=decisions, may_fall=True, left_out=one.left_out)


def _which(file: str, found: Sequence[Found | _Unread]) -> SweepError:
    starts = [one.line if isinstance(one, _Unread) else one.points.lines[0] for one in found]
    lines = ", ".join(map(str, starts[:_SHOWN])) + (" …" if len(starts) > _SHOWN else "")
    return at_line(
        file,
        starts[1],
        f"{found[1].told}; the file holds {len(found)} sweeps, from lines {lines}: choose "
        "one, as in --sweep 2, or average them with --repeats",
    )


def _sweeps_in(source: Source, columns: ColumnChoice | None) -> list[Found | _Unread]:
    long = long_table(source, columns)
    if long is not None:
        return [long]
    text = decode(source)
    block = find_block(source.file, text.lines)
    tables = find_tables(source.file, block, text.lines)
    if len(tables) == 1:
        return [*found_in(source.file, tables[0], understand(source.file, text, tables[0], columns))]
    found: list[Found | _Unread] = []
    for table in tables:
        try:
            own = found_in(source.file, table, understand(source.file, text, table, columns))
        except SweepError as error:
            found.append(_Unread(line=table.rows[0].number, error=error))
        else:
            found += [replace(one, told=_SECOND_HEADER) if len(own) == 1 else one for one in own]
    return found
