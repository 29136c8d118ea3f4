"""Error and return receivers to loop gain.

A drive is put into the loop at one point; the error receiver reads what enters the loop there, the return receiver what
comes back round it. With both against the same reference and an inverting loop return = −T·error, with the return
receiver turned round return = T·error (R. D. Middlebrook, "Measurement of loop gain in feedback systems",
Int. J. Electronics 38, 1975: T = −v_y/v_x). Which one a file holds is recognised from the band, or stated.
"""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import FloatArray
from fitamp.conditioning.sign import settle_sign
from fitamp.errors import SweepError, UsageError
from fitamp.importers.choice import ColumnChoice
from fitamp.importers.csv_table import read_csv
from fitamp.importers.source import load_source
from fitamp.loopgain.pairs import paired
from fitamp.sweep import Concern, Decision, Origin, Sign, Sweep
from fitamp.units import si

__all__ = ["RECEIVER_EXAMPLE", "ReceiverColumns", "loop_from_receivers", "read_receivers"]

RECEIVER_EXAMPLE = '"f=1:Hz error_mag=2:dB error_phase=3:deg return_mag=4:dB return_phase=5:deg"'
_RECEIVERS = ("error", "return")
_TOUCHSTONE_SUFFIX = re.compile(r"\.(s[0-9]+p|ts)")
_ITEM = re.compile(r"""\s*(?P<key>[A-Za-z_]+)\s*(?P<rest>=\s*(?:'[^']*'|"[^"]*"|[^\s:'"]+)(?::\S+)?)(?=\s|$)""")
# One noise number describes a receiver only where the drive is about the same all along; a factor of 2 is 6 dB.
_STEADY_DRIVE = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ReceiverColumns:
    """Which columns of a text table hold which receiver, each as a choice of its own with the same frequency column."""

    error: ColumnChoice
    returned: ColumnChoice

    @classmethod
    def parse(cls, text: str) -> ReceiverColumns:
        """Read ``"f=1:Hz error_re=2 error_im=3 return_re=4 return_im=5"``.

        Keys: ``f``; per receiver ``error_re error_im``, ``error_mag error_phase``, or ``error`` for complex numbers in
        one column, and the same with ``return``. Columns and units as in `fitamp.importers.ColumnChoice`.

        Raises
        ------
        UsageError
            Naming the item that cannot be read, or the receiver that is incomplete.
        """
        items: dict[str, list[str]] = {receiver: [] for receiver in _RECEIVERS}
        position = 0
        while text[position:].strip():
            item = _ITEM.match(text, position)
            if item is None:
                raise _unreadable(text[position:].strip())
            receiver, _, part = item["key"].lower().partition("_")
            if receiver == "f" and not part:
                for own in items.values():
                    own.append(f"f{item['rest']}")
            elif receiver in items:
                items[receiver].append((part or "complex") + item["rest"])
            else:
                raise _unreadable(item["key"])
            position = item.end()
        error, returned = (_choice(receiver, items) for receiver in _RECEIVERS)
        return cls(error=error, returned=returned)


def loop_from_receivers(
    freq_hz: ArrayLike,
    error: ArrayLike,
    returned: ArrayLike,
    *,
    sign: Sign | None = None,
    origin: Origin | None = None,
) -> Sweep:
    """Loop gain from what the two receivers read.

    Parameters
    ----------
    freq_hz : array_like, shape (n,)
        In hertz, rising.
    error, returned : array_like of complex, shape (n,)
        In one unit, whichever; their ratio counts.
    sign
        `Sign.AS_READ` for T = return/error, `Sign.INVERTED` for T = −return/error, None to recognise it from the
        band, `Sign.UNKNOWN` to leave the ratio return/error as it is.

    Returns
    -------
    Sweep
        T, positive real at DC for negative feedback. Its noise is left open; the model of it that a fit uses is made
        for such a ratio.

    Raises
    ------
    SweepError
        When the shapes do not agree, a value is not finite, the error receiver reads 0, or the band does not show the
        sign.
    """
    origin = origin or Origin(file="(in memory)", form="receivers")
    own = [
        Sweep(freq_hz=np.asarray(freq_hz, dtype=float), gain=np.asarray(g), origin=origin) for g in (error, returned)
    ]
    return _ratio(own[0], own[1], sign)


def read_receivers(
    path: str | os.PathLike[str],
    *,
    columns: str | ReceiverColumns,
    sign: Sign | None = None,
    sweep: int | None = None,
) -> Sweep:
    """Read a text table with error and return receiver, and form the loop gain.

    Parameters
    ----------
    columns
        Which columns they are, as in ``"f=1:Hz error_re=2 error_im=3 return_re=4 return_im=5"``; see
        `ReceiverColumns.parse`.
    sign
        As in `loop_from_receivers`.
    sweep
        Which one of a table that holds several, counted from 1.

    Raises
    ------
    SweepError
        When the table cannot be read without guessing; what `loop_from_receivers` refuses.
    UsageError
        When the columns are malformed, or the file is Touchstone.
    """
    chosen = ReceiverColumns.parse(columns) if isinstance(columns, str) else columns
    # Once for both, because standard input cannot be read again.
    source = load_source(path)
    if _TOUCHSTONE_SUFFIX.fullmatch(source.suffix):
        raise UsageError(
            f"{source.file}: receivers come as a text table; of Touchstone, only .s2p of an opened loop is read"
        )
    error = read_csv(source, columns=chosen.error, sweep=sweep)
    returned = read_csv(source, columns=chosen.returned, sweep=sweep)
    return _ratio(error, returned, sign)


def _ratio(error: Sweep, returned: Sweep, sign: Sign | None) -> Sweep:
    error, returned, left_out = paired(error, returned)
    file = error.origin.file
    silent = error.gain == 0
    if silent.any():
        index = int(np.argmax(silent))
        raise SweepError(
            f"{file}, point {index + 1} ({si(float(error.freq_hz[index]), 'Hz')}): the error receiver reads 0, and "
            "return/error is no number; raise the drive or leave the point out"
        )
    gain = returned.gain / error.gain
    trace = f"({returned.origin.trace or 'return'})/({error.origin.trace or 'error'})"
    origin = Origin(file=file, form="receivers", trace=trace, sha256=error.origin.sha256, notes=error.origin.notes)
    raw = Sweep(freq_hz=error.freq_hz, gain=gain, origin=origin, decisions=_shared(error, returned), left_out=left_out)
    settled = settle_sign(raw, sign)
    minus = settled.sign is Sign.INVERTED
    choice = f"T = {'−' if minus else ''}return/error"
    reason = (
        "the loop's inversion is between the receivers"
        if minus
        else "the read-out has turned the loop's inversion round"
    )
    if settled.sign is Sign.UNKNOWN:
        reason = "the sign is left open"
    settled = settled.with_decision("loop gain", choice, reason, concern=Concern.RESULT)
    return _with_drive(settled, np.abs(error.gain - returned.gain if minus else error.gain + returned.gain))


def _with_drive(sweep: Sweep, drive: FloatArray) -> Sweep:
    """Say how steady the drive was: error + T·error, what was put into the loop."""
    if sweep.sign is Sign.UNKNOWN:
        return sweep
    low, high = float(drive.min()), float(drive.max())
    steady = high <= _STEADY_DRIVE * low
    choice = f"from {low:.3g} to {high:.3g} along the band, in the receivers' unit"
    if steady:
        return sweep.with_decision("drive", choice, "error and return put together")
    reason = "a receiver's noise for a drive of 1 changes with it, and a fit takes that noise as constant"
    return sweep.with_decision("drive", choice, reason, concern=Concern.CAUTION)


def _shared(error: Sweep, returned: Sweep) -> tuple[Decision, ...]:
    """What was decided while reading, that of both receivers once."""
    return tuple(dict.fromkeys((*error.decisions, *returned.decisions)))


def _choice(receiver: str, items: Mapping[str, list[str]]) -> ColumnChoice:
    if not any(not item.startswith("f=") for item in items[receiver]):
        raise UsageError(f"--columns does not say where the {receiver} receiver is; as in --columns {RECEIVER_EXAMPLE}")
    try:
        return ColumnChoice.parse(" ".join(items[receiver]))
    except UsageError as error:
        raise UsageError(f"{receiver} receiver: {error}; here keys are as in --columns {RECEIVER_EXAMPLE}") from None


def _unreadable(what: str) -> UsageError:
    return UsageError(f"--columns: cannot read {what!r}; expected something like --columns {RECEIVER_EXAMPLE}")
