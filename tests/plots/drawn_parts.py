"""Simulated parts to draw, and ways to find what was drawn. All values are invented."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np
from matplotlib.artist import Artist
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.text import Text

from fitamp.amplifier import Elements
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.comparison import Comparison, Nulling, Route, compare
from fitamp.design import Design, HalfPlane, Limit, Roots
from fitamp.fitting import FitWarning, LoopFit, WarningCode, fit_sweep
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep
from fitamp.transfer import Transfer

NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
ELEMENTS = Elements(gm1=150e-6, R1=1e6, C1=0.2e-12, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300)
LIMITS = {
    "zero_hz": Limit(low=80e6, high=160e6),
    "crossover_hz": Limit(low=10e6, high=16e6),
    "phase_margin_deg": Limit(low=60, high=85),
}


def bench_sweep(response: Transfer, freq_hz: FloatArray, *, file: str = "bench7.csv") -> Sweep:
    """A simulated sweep; the noise is always the same."""
    gain = simulate_bench(response.evaluate(freq_hz), NOISE, np.random.default_rng(1))
    return Sweep(freq_hz=freq_hz, gain=gain, noise=NOISE, origin=Origin(file=file))


def part(rz_ohm: float, *, file: str = "bench7.csv") -> Sweep:
    """A part of the designed stage whose resistor came out at `rz_ohm`."""
    return bench_sweep(ELEMENTS.with_changes(Rz=rz_ohm).transfer(), np.geomspace(10, 1e8, 141), file=file)


@lru_cache
def comparison_of(rz_ohm: float) -> Comparison:
    """A part against the design with limits."""
    return compare(part(rz_ohm), Design.from_elements(ELEMENTS, limits=LIMITS))


@lru_cache
def comparison_with_roots() -> Comparison:
    """A part against a design that has no elements."""
    roots = Roots(dc_gain=12000, pole1_hz=1.1e3, pole2_hz=60e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)
    return compare(part(1300), Design.from_roots(roots))


@lru_cache
def comparison_in_trouble() -> Comparison:
    """A part of little phase margin, whose verdict is open, with limits broken, a model that misses, and warnings."""
    limits = {"phase_margin_deg": Limit(low=60, high=85), "pole2_hz": Limit(low=50e6), "crossover_hz": Limit(low=40e6)}
    sweep = bench_sweep(ELEMENTS.with_changes(Rz=0, CL=60e-12).transfer(), np.geomspace(10, 1e8, 141))
    found = compare(sweep, Design.from_elements(ELEMENTS, limits=limits))
    warnings = tuple(
        FitWarning(code=WarningCode.LAG_AMBIGUITY, message=f"warning {name} has so much to say " * 6 + "end")
        for name in ("one", "two", "three")
    )
    fit = replace(found.fit, adequacy=replace(found.fit.adequacy, level=50.0, structure=50.0), warnings=warnings)
    verdict = replace(found.verdict, nulling=Nulling.UNDECIDED, route=Route.BEHAVIOUR)
    return replace(found, fit=fit, verdict=verdict, notes=())


def covered(text: Text, points: FloatArray) -> int:
    """How many points (display coordinates, shape (n, 2)) lie under drawn words."""
    box = text.get_window_extent()
    x, y = points[:, 0], points[:, 1]
    return int(((x > box.x0) & (x < box.x1) & (y > box.y0) & (y < box.y1)).sum())


def shown_points(line: Line2D, step_px: float = 2.0) -> FloatArray:
    """Points of a line in display coordinates; with the stretches between them where they are joined."""
    points = np.asarray(line.get_transform().transform(np.stack([x_of(line), y_of(line)], axis=-1)), dtype=float)
    if line.get_linestyle() == "None" or len(points) < 2:
        return points
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    at = np.arange(0, along[-1], step_px)
    return np.stack([np.interp(at, along, points[:, 0]), np.interp(at, along, points[:, 1])], axis=-1)


@lru_cache
def fit_of_pair() -> LoopFit:
    """A fit whose poles are −3 MHz ± j·4 MHz."""
    response = Transfer(dc_gain=20.0, poles_hz=(-3e6 + 4e6j, -3e6 - 4e6j), zeros_hz=(90e6,))
    return fit_sweep(bench_sweep(response, np.geomspace(1e4, 1e8, 81)))


def resonance(freq_hz: FloatArray, at_hz: float, *, quality: float = 20.0, apart: float = 0.02) -> ComplexArray:
    """A pole pair with a zero pair a little farther out, as a package has."""
    s = 1j * freq_hz / at_hz
    z = s / (1 + apart)
    return np.asarray((1 + z / quality + z**2) / (1 + s / quality + s**2))


@lru_cache
def comparison_with_resonances() -> Comparison:
    """The designed stage in a package with resonances at 400 kHz (Q 10) and 30 MHz (Q 20)."""
    freq_hz = np.geomspace(10, 1e8, 281)
    gain = ELEMENTS.transfer().evaluate(freq_hz) * resonance(freq_hz, 30e6)
    gain = gain * resonance(freq_hz, 400e3, quality=10, apart=-0.03)
    sweep = Sweep(freq_hz=freq_hz, gain=simulate_bench(gain, NOISE, np.random.default_rng(1)))
    return compare(sweep, Design.from_elements(ELEMENTS, limits=LIMITS))


@lru_cache
def fit_of_pair_with_resonance(at_hz: float, zero_hz: float = 90e6) -> LoopFit:
    """Poles at −3 MHz ± j·4 MHz, a zero, and a resonance."""
    freq_hz = np.geomspace(1e4, 1e8, 161)
    response = Transfer(dc_gain=20.0, poles_hz=(-3e6 + 4e6j, -3e6 - 4e6j), zeros_hz=(zero_hz,))
    gain = response.evaluate(freq_hz) * resonance(freq_hz, at_hz)
    return fit_sweep(Sweep(freq_hz=freq_hz, gain=simulate_bench(gain, NOISE, np.random.default_rng(1))))


def drawn(figure: Figure, gid: str) -> list[Artist]:
    """Everything in a figure that carries this group id."""
    return figure.findobj(lambda artist: artist.get_gid() == gid)


def drawn_lines(figure: Figure, gid: str) -> list[Line2D]:
    """Lines with this group id, in drawing order."""
    return [artist for artist in drawn(figure, gid) if isinstance(artist, Line2D)]


def x_of(line: Line2D) -> FloatArray:
    """x data of a line."""
    return np.asarray(line.get_xdata(orig=True), dtype=float)


def y_of(line: Line2D) -> FloatArray:
    """y data of a line."""
    return np.asarray(line.get_ydata(orig=True), dtype=float)


def words_in(figure: Figure) -> list[str]:
    """All visible words of a figure."""
    texts = figure.findobj(Text)
    return [text.get_text() for text in texts if isinstance(text, Text) and text.get_text()]
