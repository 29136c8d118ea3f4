"""One invented sweep, written the ways that bench software writes sweeps. Shared by the importer tests."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray

__all__ = ["DIGITS", "FREQ_HZ", "FREQ_UNITS", "GAIN", "RTOL", "cells", "file_of", "table"]

# Invented: T(0) = 80 dB, poles at 1 kHz and 50 MHz, zero at 160 MHz in the left half plane.
FREQ_HZ: FloatArray = np.array([float(f"{f:.4g}") for f in np.logspace(2, 8, 25)])
GAIN: ComplexArray = 1e4 * (1 + 1j * FREQ_HZ / 160e6) / (1 + 1j * FREQ_HZ / 1e3) / (1 + 1j * FREQ_HZ / 50e6)
DIGITS = 12
# Twelve digits in each part: half a unit of the last digit in dB (at 80 dB) or degrees is below 1e-11 of the gain.
RTOL = 2e-11
FREQ_UNITS = {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9, "rad/s": 1 / (2 * np.pi)}


def cells(form: str, *, freq_unit: str = "Hz") -> list[list[str]]:
    """Rows of cells with decimal points: frequency and the gain in a form."""
    rows = []
    for f, t in zip((FREQ_HZ / FREQ_UNITS[freq_unit]).tolist(), GAIN.tolist(), strict=True):
        size, angle = abs(t), float(np.angle(t))
        gain = {
            "re im": [number(t.real), number(t.imag)],
            "dB deg": [number(20 * np.log10(size)), number(np.degrees(angle))],
            "linear deg": [number(size), number(np.degrees(angle))],
            "dB rad": [number(20 * np.log10(size)), number(angle)],
            "linear rad": [number(size), number(angle)],
            "complex j": [f"{number(t.real)}{t.imag:+.{DIGITS - 1}e}j"],
            "complex i": [f"{number(t.real)} {'-' if t.imag < 0 else '+'} {number(abs(t.imag))}i"],
            "complex python": [f"({number(t.real)}{t.imag:+.{DIGITS - 1}e}j)"],
            "complex pair": [f"({number(t.real)},{number(t.imag)})"],
        }[form]
        rows.append([number(f), *gain])
    return rows


def number(value: float) -> str:
    """A number with DIGITS significant digits."""
    return f"{value:.{DIGITS - 1}e}"


def table(header: Sequence[str], rows: Sequence[Sequence[str]], *, separator: str, decimal: str = ".") -> str:
    """A text table with LF; cells that hold the separator are quoted."""
    lines = []
    for row in [list(header), *([cell.replace(".", decimal) for cell in row] for row in rows)]:
        lines.append(separator.join(f'"{cell}"' if separator.strip() and separator in cell else cell for cell in row))
    return "\n".join(lines) + "\n"


def file_of(folder: Path, content: str | bytes, name: str = "bench.csv") -> Path:
    """Write a file byte for byte."""
    path = folder / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return path
