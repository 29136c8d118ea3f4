"""What was understood of a sweep file, as text for a terminal: decisions, notes, first points, a small picture."""

from __future__ import annotations

from collections.abc import Sequence

from fitamp.report.console import new_console, print_table, printable, text_of_console
from fitamp.report.text_plot import text_plot
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.units import si

__all__ = ["levels_text", "sweep_text"]

_MOST_LEFT_OUT = 10
_MOST_NOTES = 8


def sweep_text(sweep: Sweep, *, plot: bool = False) -> str:
    """What was understood of a file, and why.

    Parameters
    ----------
    plot
        With the magnitude in dB and the phase in degrees as pictures of characters.
    """
    console = new_console()
    rows = [
        ("points", f"{len(sweep)} used, {len(sweep.left_out)} left out", ""),
        ("band", f"{si(sweep.f_min_hz, 'Hz')} to {si(sweep.f_max_hz, 'Hz')}", ""),
        ("loop gain", f"{sweep.magnitude_db[0]:.1f} dB to {sweep.magnitude_db[-1]:.1f} dB", "low end to high end"),
        *([] if sweep.noise is None else [("noise", levels_text(sweep.noise), sweep.noise.source)]),
        *((decision.topic, decision.choice, decision.reason) for decision in sweep.decisions),
    ]
    print_table(console, printable(sweep.origin.file), ("", "understood", "why"), rows)
    if sweep.origin.notes:
        notes = _first(sweep.origin.notes, _MOST_NOTES, "lines")
        print_table(console, "notes", ("above the numbers",), [(note,) for note in notes])
    first = [
        (si(f, "Hz", digits=6), f"{m:.3f}", f"{p:.2f}")
        for f, m, p in zip(sweep.freq_hz[:3], sweep.magnitude_db[:3], sweep.phase_deg[:3], strict=True)
    ]
    print_table(console, "first points", ("frequency", "|T| (dB)", "phase (°)"), first, numbers=True)
    if sweep.left_out:
        left = [(si(point.f_hz, "Hz"), point.reason) for point in sweep.left_out[:_MOST_LEFT_OUT]]
        if len(sweep.left_out) > _MOST_LEFT_OUT:
            left.append(("…", f"{len(sweep.left_out) - _MOST_LEFT_OUT} more"))
        print_table(console, "left out", ("frequency", "reason"), left)
    text = text_of_console(console)
    if plot:
        text += "\n".join(["", *text_plot(sweep), ""])
    return text


def levels_text(noise: NoiseLevels) -> str:
    """The noise numbers in words."""
    return (
        f"error channel {noise.error_channel:.2g}, return channel {noise.return_channel:.2g}, "
        f"relative {noise.relative:.2g}"
    )


def _first(lines: Sequence[str], most: int, what: str) -> list[str]:
    """As many as there is room for, and how many more there are."""
    if len(lines) <= most:
        return list(lines)
    return [*lines[:most], f"… {len(lines) - most} more {what}"]
