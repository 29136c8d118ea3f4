"""Files to sweeps, by one door: `read_sweep`, or `read_sweeps` for all sweeps of a file; and back: `write_sweep`.

Text tables (CSV and its kin) and Touchstone files are told apart by suffix and content. Reading is strict,
explained and lossless: what the file does not decide is refused with the option that decides it, and every
decision is kept in the sweep.
"""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from contextlib import contextmanager

from fitamp.conditioning.sign import settle_sign
from fitamp.errors import SweepError, UsageError
from fitamp.importers.choice import ColumnChoice, ColumnRef
from fitamp.importers.csv_table import read_csv, read_csv_sweeps
from fitamp.importers.fault import LineError, attach_excerpt
from fitamp.importers.quantity import Quantity, Unit
from fitamp.importers.source import CALLED, Source, load_source
from fitamp.importers.text import line_of
from fitamp.importers.touchstone import read_touchstone
from fitamp.importers.write import with_own_sign, write_sweep
from fitamp.sweep import Sign, Sweep

__all__ = ["ColumnChoice", "ColumnRef", "Quantity", "Unit", "read_sweep", "read_sweeps", "write_sweep"]

_TOUCHSTONE_SUFFIX = re.compile(r"\.(s[0-9]+p|ts)")
# An option line or a version keyword at the start of a line, in a file whose name says something else.
_TOUCHSTONE_CONTENT = re.compile(
    rb"^[ \t]*(?:\[version\][ \t]*[0-9]|#[ \t]*[kmg]?hz[ \t]+[syzgh][ \t]+(?:ri|ma|db)\b)", re.IGNORECASE | re.MULTILINE
)

# Bytes of comments and information that stand above an option line at most.
_LONGEST_PREAMBLE = 1 << 16


def read_sweep(
    path: str | os.PathLike[str],
    *,
    columns: str | ColumnChoice | None = None,
    trace: str | None = None,
    sign: Sign | None = None,
    sweep: int | None = None,
) -> Sweep:
    """Read one sweep from a CSV or Touchstone file.

    Parameters
    ----------
    path
        ``.s1p``, ``.s2p``, ... and ``.ts`` in any case are read as Touchstone, all else as a text table; either may be
        a gzip file (``.csv.gz``). ``-`` is standard input.
    columns
        For text tables whose header does not decide: which column holds what, in which unit, as in
        ``"f=1:Hz mag=2:dB phase=3:deg"`` or ``"f='Frequency':MHz re='Re' im='Im'"`` (see `ColumnChoice`).
    trace
        For Touchstone: the S-parameter that holds the loop gain, as in ``"S21"``. Without it S11 of a one-port
        and S21 of a two-port.
    sign
        Whether the file holds T or −T; None to recognise it from the band, `Sign.UNKNOWN` to leave it open.
    sweep
        Which one of a text table that holds several sweeps, counted from 1; None where there is one. `read_sweeps`
        gives all of them.

    Returns
    -------
    Sweep
        Frequency in hertz, rising; loop gain T, positive real at DC for negative feedback. Each decision is in
        `Sweep.decisions`, each point that was left out in `Sweep.left_out`.

    Raises
    ------
    SweepError
        When the file cannot be read without guessing: file, line, column, what is wrong and what to do.
    UsageError
        When an option is malformed or does not fit the kind of file.
    """
    source, choice, is_touchstone = _opened(path, columns, trace)
    if is_touchstone and sweep not in (None, 1):
        raise UsageError(f"{source.file}: sweep {sweep} is not there; a Touchstone file holds one sweep")
    with _showing_lines(source):
        if is_touchstone:
            return settle_sign(read_touchstone(source, trace=trace), sign)
        return settle_sign(with_own_sign(read_csv(source, columns=choice, sweep=sweep)), sign)


def read_sweeps(
    path: str | os.PathLike[str],
    *,
    columns: str | ColumnChoice | None = None,
    trace: str | None = None,
    sign: Sign | None = None,
) -> tuple[Sweep, ...]:
    """Read all sweeps of a CSV or Touchstone file, in the order of the file; options and errors as `read_sweep`.

    A text table holds several where its header stands again among the rows, where a column named as sweep, run or the
    like numbers them, or where the frequency starts anew over the same band. A Touchstone file holds one.
    """
    source, choice, is_touchstone = _opened(path, columns, trace)
    with _showing_lines(source):
        if is_touchstone:
            return (settle_sign(read_touchstone(source, trace=trace), sign),)
        return tuple(settle_sign(with_own_sign(one), sign) for one in read_csv_sweeps(source, columns=choice))


@contextmanager
def _showing_lines(source: Source) -> Iterator[None]:
    """Give an error about a line that line."""
    try:
        yield
    except LineError as error:
        attach_excerpt(error, line_of(source, error.line))
        raise


def _opened(
    path: str | os.PathLike[str], columns: str | ColumnChoice | None, trace: str | None
) -> tuple[Source, ColumnChoice | None, bool]:
    """The file's bytes, the parsed choice, and whether it is Touchstone."""
    choice = ColumnChoice.parse(columns) if isinstance(columns, str) else columns
    source = load_source(path)
    if _TOUCHSTONE_SUFFIX.fullmatch(source.suffix):
        if choice is not None:
            raise UsageError(f"{source.file}: --columns is for text tables; a Touchstone file takes --trace")
        return source, None, True
    if source.file == CALLED and choice is None and _is_touchstone(source):
        return source, None, True
    _refuse_touchstone_content(source)
    if trace is not None:
        raise UsageError(f"{source.file}: --trace is for Touchstone files; a text table takes --columns")
    return source, choice, False


def _is_touchstone(source: Source) -> bool:
    return bool(_TOUCHSTONE_CONTENT.search(source.data, 0, _LONGEST_PREAMBLE))


def _refuse_touchstone_content(source: Source) -> None:
    if _is_touchstone(source):
        raise SweepError(
            f"{source.file}: the content is Touchstone, but the name does not say for how many ports; "
            "rename it to end in .s1p or .s2p"
        )
