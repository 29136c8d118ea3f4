"""The panels of the loop-gain picture: magnitude and phase, with the curves they show."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.free_spot import Clutter
from fitamp.plots.lane import ROOT_GUIDE
from fitamp.plots.phases import continuous_deg, extra_delay_s, fitted_deg, measured_deg
from fitamp.plots.style import COLOURS
from fitamp.sweep import LeftOut

__all__ = ["NARROW_DEG", "Curves", "curves_of", "draw_magnitude", "draw_phase", "drawable", "shade_beyond"]

POINTS = 500
# Left-out points farther than this from everything else are drawn at the panel's edge.
STRAY_DB = 20.0
# The designed curve may widen an axis by this much; beyond, it leaves the picture.
DESIGN_DB, DESIGN_DEG = 30.0, 60.0
# Below this phase margin there is room kept for arrows from outside.
NARROW_DEG = 30.0
MAX_TICKS = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Curves:
    """Fitted and designed loop gain on one grid, phases counted continuously from DC; True in_band where measured."""

    freq_hz: FloatArray
    in_band: NDArray[np.bool_]
    fitted: ComplexArray
    fitted_deg: FloatArray
    designed: ComplexArray | None
    designed_deg: FloatArray | None


def drawable(points: tuple[LeftOut, ...]) -> list[LeftOut]:
    """Left-out points that have a place in a logarithmic picture."""
    return [p for p in points if np.isfinite(p.f_hz) and p.f_hz > 0 and p.gain and np.isfinite(p.gain)]


def curves_of(fit: LoopFit, comparison: Comparison | None, low_hz: float, high_hz: float) -> Curves:
    """Evaluate both curves over the range of the picture."""
    freq_hz = np.geomspace(low_hz, high_hz, POINTS)
    on_bench = comparison.design.on_bench() if comparison is not None else None
    return Curves(
        freq_hz=freq_hz,
        in_band=(freq_hz >= fit.sweep.f_min_hz) & (freq_hz <= fit.sweep.f_max_hz),
        fitted=fit.evaluate(freq_hz),
        fitted_deg=fitted_deg(fit, freq_hz),
        designed=None if on_bench is None else on_bench.evaluate(freq_hz),
        designed_deg=None if on_bench is None else continuous_deg(on_bench, freq_hz),
    )


def _db(gain: ComplexArray) -> FloatArray:
    return np.asarray(20 * np.log10(np.maximum(np.abs(gain), 1e-30)), dtype=float)


def draw_magnitude(axes: Axes, fit: LoopFit, curves: Curves) -> Clutter:
    """Draw the magnitudes; what is drawn is returned, so that words can keep clear of it."""
    axes.axhline(0, color="#666666", linewidth=0.8)
    data, fitted = _db(fit.sweep.gain), _db(curves.fitted)
    _draw_data(axes, fit.sweep.freq_hz, data)
    low, high = _ends(data, fitted)
    if curves.designed is not None:
        designed = _db(curves.designed)
        low, high = _stretched(low, high, designed[curves.in_band], DESIGN_DB)
        _draw_designed(axes, curves.freq_hz, designed)
    _draw_fitted(axes, curves.freq_hz, fitted)
    left = drawable(fit.sweep.left_out)
    if left:
        levels = np.clip(_db(np.array([p.gain for p in left])), low - STRAY_DB, high + STRAY_DB)
        low, high = _ends(levels, np.array([low, high]))
        _draw_left_out(axes, [p.f_hz for p in left], levels)
    room = 0.06 * (high - low)
    axes.set_ylim(low - room, high + room)
    axes.set_ylabel("magnitude (dB)")
    axes.grid(True)
    return _clutter(axes)


def draw_phase(axes: Axes, fit: LoopFit, curves: Curves, limits_deg: tuple[float, ...] = ()) -> Clutter:
    """Draw the phases over what data and fit need; `limits_deg` are phases to keep in view."""
    delay_s = extra_delay_s(fit)
    data = measured_deg(fit, fit.sweep.freq_hz, fit.sweep.gain, delay_s)
    axes.axhline(-180, color="#666666", linewidth=0.8)
    _draw_data(axes, fit.sweep.freq_hz, data)
    low, high = _ends(data, curves.fitted_deg[curves.in_band], np.array([-180.0, -90.0, *limits_deg]))
    if curves.designed_deg is not None:
        low, high = _stretched(low, high, curves.designed_deg[curves.in_band], DESIGN_DEG)
        _draw_designed(axes, curves.freq_hz, curves.designed_deg)
    _draw_fitted(axes, curves.freq_hz, curves.fitted_deg)
    left = drawable(fit.sweep.left_out)
    if left:
        freq_hz = np.array([p.f_hz for p in left])
        phases = measured_deg(fit, freq_hz, np.array([p.gain for p in left]), delay_s)
        _draw_left_out(axes, list(freq_hz), np.clip(phases, low, high))
    margin = fit.margins.phase_margin_deg.value
    if margin is not None and abs(margin) < NARROW_DEG:
        low, high = min(low, -180 - 0.2 * (high - low)), max(high, -180 + 0.2 * (high - low))
    room = 0.06 * (high - low)
    axes.set_ylim(low - room, high + room)
    step = _tick_step(high - low + 2 * room)
    axes.set_yticks(np.arange(step * math.ceil((low - room) / step), high + room, step))
    axes.set_ylabel("phase (°)")
    axes.grid(True)
    return _clutter(axes)


def _ends(*parts: FloatArray) -> tuple[float, float]:
    return min(float(part.min()) for part in parts), max(float(part.max()) for part in parts)


def _stretched(low: float, high: float, curve: FloatArray, most: float) -> tuple[float, float]:
    """Ends moved outwards to a curve's, but each by `most` at the farthest."""
    start, end = _ends(curve)
    return min(low, max(start, low - most)), max(high, min(end, high + most))


def _tick_step(span_deg: float) -> float:
    """45°, 90°, 180°, 360° … for at most `MAX_TICKS` ticks."""
    step = 45.0
    while span_deg / step > MAX_TICKS - 1:
        step *= 2
    return step


def _clutter(axes: Axes) -> Clutter:
    """Everything that has been drawn in axes whose limits are set, as words should see it."""
    clutter = Clutter(axes)
    for line in axes.get_lines():
        name = line.get_gid()
        x, y = np.asarray(line.get_xdata(orig=True), dtype=float), np.asarray(line.get_ydata(orig=True), dtype=float)
        if name in {"measured", "left out"}:
            clutter.add_points(x, y)
        elif name in {"fitted", "designed"}:
            clutter.add_line(x, y)
        elif name == ROOT_GUIDE:
            clutter.add_line([x[0], x[0]], axes.get_ylim(), soft_in=0.15)
        else:  # the level line, which spans the axes
            clutter.add_line(axes.get_xlim(), [y[0], y[0]], soft_in=0.6)
    return clutter


def shade_beyond(axes: Axes, fit: LoopFit) -> None:
    """Grey where nothing was measured: the curves go on there by calculation alone."""
    low, high = axes.get_xlim()
    for start, end in ((low, fit.sweep.f_min_hz), (fit.sweep.f_max_hz, high)):
        axes.axvspan(start, end, facecolor="#EFEFEF", linewidth=0, zorder=0, gid="beyond the sweep")


def _draw_data(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, ".", color=COLOURS["measured"], markersize=4.5, gid="measured", zorder=2.4)


def _draw_fitted(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "-", color=COLOURS["fitted"], linewidth=1.4, gid="fitted", zorder=2.6)


def _draw_designed(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "--", color=COLOURS["designed"], linewidth=2.0, gid="designed", zorder=2.5)


def _draw_left_out(axes: Axes, freq_hz: list[float], values: FloatArray) -> None:
    axes.plot(
        freq_hz, values, "x", color=COLOURS["left out"], markersize=7, markeredgewidth=1.6, gid="left out", zorder=4
    )
