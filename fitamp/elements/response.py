"""Loop gain of the exact circuit at given frequencies, with its derivatives by every element.

The circuit and its closed form are those of `fitamp.amplifier.coefficients`; here it stands as admittances, which
differentiate in a line each.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from fitamp.arrays import ComplexArray
from fitamp.transfer import TWO_PI

__all__ = ["loop_gain_and_slopes"]


def loop_gain_and_slopes(
    values: Mapping[str, float | None], s: ComplexArray
) -> tuple[ComplexArray, dict[str, ComplexArray]]:
    """Loop gain at s (rad/s), shape (n,), and its derivatives by name, each of shape (n,), in SI units.

    Parameters
    ----------
    values
        gm1, R1, C1, gm2, R2, CL, Cc, Rz, Cgd, delay_s and beta, and mirror_pole_hz, which may be None. Nothing is
        checked; Rz may be negative.

    Notes
    -----
    With y1 = 1/R1 + s·C1, y2 = 1/R2 + s·CL, D = 1 + s·Rz·Cc and N = s·Cc + s·Cgd·D, Kirchhoff's current law at the two
    stage outputs gives T = beta·gm1·(gm2·D − N)/P with P = y1·y2·D + N·(y1 + y2 + gm2), so that for any element x
    ∂T/∂x = beta·gm1·(∂(gm2·D − N)/∂x − (gm2·D − N)/P · ∂P/∂x)/P. The mirror's pole fm and the zero at twice its
    frequency, and the delay, are factors.
    """
    gm1, R1, C1, gm2, R2, CL, Cc, Rz, Cgd, beta, delay_s = (
        float(values[name] or 0.0)
        for name in ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz", "Cgd", "beta", "delay_s")
    )
    y1, y2 = 1 / R1 + s * C1, 1 / R2 + s * CL
    D = 1 + s * (Rz * Cc)
    N = s * (Cc + Cgd * D)
    total = y1 + y2 + gm2
    P = y1 * y2 * D + N * total
    current = gm2 * D - N
    factor, mirror_slope = _factor(values["mirror_pole_hz"], delay_s, s)
    outer = beta * gm1 * factor / P
    ratio = current / P
    gain = outer * current
    by_y1, by_y2 = -outer * ratio * (y2 * D + N), -outer * ratio * (y1 * D + N)
    by_D = outer * (gm2 - ratio * y1 * y2)
    by_N = -outer * (1 + ratio * total)
    by_D = by_D + by_N * s * Cgd
    slopes = {
        "gm1": gain / gm1,
        "R1": -by_y1 / R1**2,
        "C1": by_y1 * s,
        "gm2": outer * (D - ratio * N),
        "R2": -by_y2 / R2**2,
        "CL": by_y2 * s,
        "Cc": by_D * s * Rz + by_N * s,
        "Rz": by_D * s * Cc,
        "Cgd": by_N * s * D,
        "mirror_pole_hz": gain * mirror_slope,
        "delay_s": -s * gain,
    }
    return gain, slopes


def _factor(mirror_pole_hz: float | None, delay_s: float, s: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """(1 + x/2)/(1 + x)·exp(−s·delay) with x = s/(2π·fm), and the derivative of its logarithm by fm."""
    delayed = np.exp(-s * delay_s) if delay_s else np.ones_like(s)
    if mirror_pole_hz is None:
        return delayed, np.zeros_like(s)
    x = s / (TWO_PI * mirror_pole_hz)
    return delayed * (1 + x / 2) / (1 + x), x / ((1 + x) * (2 + x)) / mirror_pole_hz
