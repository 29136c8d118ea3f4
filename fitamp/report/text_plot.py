"""A sweep as a picture of characters: magnitude in dB and phase in degrees over the logarithm of frequency."""

from __future__ import annotations

import math

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.sweep import Sweep
from fitamp.units import si

__all__ = ["text_plot"]

_COLUMNS, _ROWS = 78, 11
_POINT, _LINE = "*", "-"


def text_plot(sweep: Sweep) -> list[str]:
    """Lines of at most 100 columns; a line across stands at 0 dB and at −180° where they are in the picture."""
    log_f = np.log10(sweep.freq_hz)
    lines = ["|T| (dB)", *_panel(log_f, sweep.magnitude_db, across=0.0)]
    lines += ["phase (°)", *_panel(log_f, sweep.phase_deg, across=-180.0)]
    low, high = si(sweep.f_min_hz, "Hz", digits=3), si(sweep.f_max_hz, "Hz", digits=3)
    return [*lines, f"{'':>9}{low}{high:>{max(_COLUMNS - len(low), 1)}}"]


def _panel(log_f: FloatArray, values: FloatArray, *, across: float) -> list[str]:
    """One curve, its lowest and highest value in the picture written at the left."""
    finite = np.isfinite(values)
    log_f, values = log_f[finite], values[finite]
    if not len(values):
        return ["(nothing to draw)"]
    bottom, top = _rounded_ends(float(values.min()), float(values.max()))
    rows = [[" "] * _COLUMNS for _ in range(_ROWS)]
    if bottom <= across <= top:
        rows[_row(across, bottom, top)] = [_LINE] * _COLUMNS
    span = max(float(log_f[-1] - log_f[0]), 1e-9)
    columns = np.rint((log_f - log_f[0]) / span * (_COLUMNS - 1)).astype(int)
    for column, value in zip(columns.tolist(), values.tolist(), strict=True):
        rows[_row(value, bottom, top)][column] = _POINT
    labels = {0: f"{top:g}", _ROWS - 1: f"{bottom:g}"}
    if bottom < across < top:
        labels.setdefault(_row(across, bottom, top), f"{across:g}")
    return [f"{labels.get(index, ''):>7} |{''.join(row).rstrip()}" for index, row in enumerate(rows)]


def _rounded_ends(low: float, high: float) -> tuple[float, float]:
    """Ends of the scale at whole steps of 1, 2 or 5 times a power of ten."""
    rough = max(high - low, 1e-6 * max(abs(high), abs(low)), 1e-9) / 4
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(power * factor for factor in (1, 2, 5, 10) if power * factor >= rough)
    return math.floor(low / step) * step, math.ceil(high / step) * step


def _row(value: float, bottom: float, top: float) -> int:
    return round((top - value) / max(top - bottom, 1e-300) * (_ROWS - 1))
