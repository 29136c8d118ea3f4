"""The loop gain as measured, fitted and designed: magnitude, phase, roots along the frequency axis, residuals."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import frequency_axis
from fitamp.plots.header import figure_with_head
from fitamp.plots.loop_marks import draw_crossover, draw_lane, draw_limits, draw_phase_margin
from fitamp.plots.roots import designed_marks, measured_marks
from fitamp.plots.style import COLOURS, SIZE_PT, SMALL_PT, WIDTH_IN, drawing_style, inert, place_axes, shortened
from fitamp.sweep import LeftOut

__all__ = ["loop_figure"]

LEFT_IN, RIGHT_IN, BOTTOM_IN = 0.95, 0.25, 0.55
RESIDUALS_IN, MAGNITUDE_IN, PHASE_IN, LANE_ROW_IN = 1.1, 2.3, 2.1, 0.34
GAP_IN, TITLE_GAP_IN, LEGEND_ROW_IN = 0.1, 0.32, 0.22
POINTS = 500
# Roots this far beyond the band are still shown in place; farther ones become arrows at the edge.
BEYOND_BAND = 5.0
# Left-out points farther than this from everything else are drawn at the panel's edge.
STRAY_DB = 20.0
MAX_REASONS = 3


@dataclass(frozen=True, slots=True, kw_only=True)
class _Curves:
    """Fitted and designed loop gain on one grid, phases counted continuously from DC."""

    freq_hz: FloatArray
    fitted: ComplexArray
    fitted_deg: FloatArray
    designed: ComplexArray | None
    designed_deg: FloatArray | None


def loop_figure(fit: LoopFit, comparison: Comparison | None = None) -> Figure:
    """Draw the loop gain over frequency.

    Panels from the top, sharing the frequency axis: magnitude (dB); phase (degrees, 0 for a positive gain at DC); where
    poles and zero lie, as distances; residuals in standard deviations.

    Parameters
    ----------
    fit
        Gives the sweep, the fitted curve and its residuals.
    comparison
        Adds the designed response with the bench's load and delay, the limits, and the verdict.
    """
    with drawing_style():
        marks = measured_marks(fit)
        designed = designed_marks(comparison.design) if comparison is not None else ()
        low_hz, high_hz = _view(fit, [abs(m.value_hz) for m in (*marks, *designed) if m.value_hz is not None])
        rows = 2 if designed else 1
        reasons = _reasons(fit.sweep.left_out)
        lane_in = LANE_ROW_IN * rows
        legend_in = LEGEND_ROW_IN * (1 + len(reasons)) + 0.05
        heights = (RESIDUALS_IN, lane_in, PHASE_IN, MAGNITUDE_IN)
        gaps = (TITLE_GAP_IN, GAP_IN, GAP_IN)
        figure = figure_with_head(fit, comparison, body_in=BOTTOM_IN + sum(heights) + sum(gaps) + legend_in)
        residuals, lane, phase, magnitude = _panels(figure, heights, gaps)
        curves = _curves(fit, comparison, low_hz, high_hz)
        _draw_magnitude(magnitude, fit, curves)
        _draw_phase(phase, fit, curves)
        draw_crossover(magnitude, phase, fit)
        draw_phase_margin(phase, fit)
        if comparison is not None:
            draw_limits(magnitude, phase, comparison, fit)
        for panel in (magnitude, phase, lane, residuals):
            frequency_axis(panel, low_hz, high_hz)
            panel.tick_params(labelbottom=panel is residuals)
        draw_lane(lane, (magnitude, phase), marks, designed, comparison)
        _draw_residuals(residuals, fit)
        _draw_legend(figure, magnitude, comparison, reasons, legend_in)
    return figure


def _panels(figure: Figure, heights: tuple[float, ...], gaps: tuple[float, ...]) -> list[Axes]:
    panels: list[Axes] = []
    bottom = BOTTOM_IN
    for height, gap in zip(heights, (*gaps, 0.0), strict=True):
        panels.append(
            place_axes(
                figure,
                left=LEFT_IN,
                bottom=bottom,
                width=WIDTH_IN - LEFT_IN - RIGHT_IN,
                height=height,
                sharex=panels[0] if panels else None,
            )
        )
        bottom += height + gap
    return panels


def _view(fit: LoopFit, distances_hz: list[float]) -> tuple[float, float]:
    """The band with the points left out, widened to roots just outside it."""
    low, high = fit.sweep.f_min_hz, fit.sweep.f_max_hz
    seen = [low, high, *(point.f_hz for point in _drawable(fit.sweep.left_out))]
    seen += [d for d in distances_hz if low / BEYOND_BAND <= d <= high * BEYOND_BAND]
    return min(seen) / 1.25, max(seen) * 1.25


def _drawable(points: tuple[LeftOut, ...]) -> list[LeftOut]:
    return [p for p in points if np.isfinite(p.f_hz) and p.f_hz > 0 and np.isfinite(p.gain) and p.gain != 0]


def _curves(fit: LoopFit, comparison: Comparison | None, low_hz: float, high_hz: float) -> _Curves:
    freq_hz = np.geomspace(low_hz, high_hz, POINTS)
    # The phase is counted from DC, so the count starts well below pole 1.
    lead = np.geomspace(min(low_hz, abs(fit.response.poles_hz[0])) / 100, low_hz, POINTS, endpoint=False)
    whole = np.concatenate([lead, freq_hz])
    fitted = fit.evaluate(whole)
    designed = comparison.design.on_bench().evaluate(whole) if comparison is not None else None
    return _Curves(
        freq_hz=freq_hz,
        fitted=fitted[POINTS:],
        fitted_deg=_continuous_deg(fitted)[POINTS:],
        designed=None if designed is None else designed[POINTS:],
        designed_deg=None if designed is None else _continuous_deg(designed)[POINTS:],
    )


def _continuous_deg(gain: ComplexArray) -> FloatArray:
    return np.asarray(np.degrees(np.unwrap(np.angle(gain))), dtype=float)


def _db(gain: ComplexArray) -> FloatArray:
    return np.asarray(20 * np.log10(np.maximum(np.abs(gain), 1e-30)), dtype=float)


def _draw_magnitude(axes: Axes, fit: LoopFit, curves: _Curves) -> None:
    axes.axhline(0, color="#666666", linewidth=0.8)
    _draw_data(axes, fit.sweep.freq_hz, _db(fit.sweep.gain))
    everything = [_db(fit.sweep.gain), _db(curves.fitted)]
    if curves.designed is not None:
        everything.append(_db(curves.designed))
        _draw_designed(axes, curves.freq_hz, everything[-1])
    _draw_fitted(axes, curves.freq_hz, everything[1])
    left = _drawable(fit.sweep.left_out)
    low, high = (
        float(pick([part_end for part in everything for part_end in (part.min(), part.max())])) for pick in (min, max)
    )
    if left:
        levels = np.clip(_db(np.array([p.gain for p in left])), low - STRAY_DB, high + STRAY_DB)
        low, high = min(low, float(levels.min())), max(high, float(levels.max()))
        _draw_left_out(axes, [p.f_hz for p in left], levels)
    room = 0.06 * (high - low)
    axes.set_ylim(low - room, high + room)
    axes.set_ylabel("magnitude (dB)")
    axes.grid(True)


def _draw_phase(axes: Axes, fit: LoopFit, curves: _Curves) -> None:
    def beside_fit(freq_hz: FloatArray, gain: ComplexArray) -> FloatArray:
        """Phase on the fitted curve's branch: noise cannot make it slip by a turn."""
        fitted_deg = np.interp(np.log(freq_hz), np.log(curves.freq_hz), curves.fitted_deg)
        off = np.degrees(np.angle(gain)) - fitted_deg
        return np.asarray(np.degrees(np.angle(gain)) - 360 * np.round(off / 360), dtype=float)

    data = beside_fit(fit.sweep.freq_hz, fit.sweep.gain)
    axes.axhline(-180, color="#666666", linewidth=0.8)
    _draw_data(axes, fit.sweep.freq_hz, data)
    parts = [curves.fitted_deg]
    if curves.designed_deg is not None:
        parts.append(curves.designed_deg)
        _draw_designed(axes, curves.freq_hz, curves.designed_deg)
    _draw_fitted(axes, curves.freq_hz, curves.fitted_deg)
    left = _drawable(fit.sweep.left_out)
    low = min(-180.0, *(float(part.min()) for part in parts), float(data.min()))
    high = max(0.0, *(float(part.max()) for part in parts), float(data.max()))
    if left:
        freq_hz = np.array([p.f_hz for p in left])
        phases = np.clip(beside_fit(freq_hz, np.array([p.gain for p in left])), low, high)
        _draw_left_out(axes, list(freq_hz), phases)
    axes.set_ylim(low - 12, high + 12)
    axes.set_yticks(np.arange(45 * np.ceil((low - 12) / 45), high + 12, 45 if high - low < 400 else 90))
    axes.set_ylabel("phase (°)")
    axes.grid(True)


def _draw_data(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, ".", color=COLOURS["measured"], markersize=3.5, gid="measured", zorder=3)


def _draw_fitted(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "-", color=COLOURS["fitted"], linewidth=1.6, gid="fitted", zorder=2.6)


def _draw_designed(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "--", color=COLOURS["designed"], linewidth=2.0, gid="designed", zorder=2.5)


def _draw_left_out(axes: Axes, freq_hz: list[float], values: FloatArray) -> None:
    axes.plot(
        freq_hz, values, "x", color=COLOURS["left out"], markersize=7, markeredgewidth=1.6, gid="left out", zorder=4
    )


def _draw_residuals(axes: Axes, fit: LoopFit) -> None:
    residuals = fit.residuals()
    axes.axhspan(-2, 2, color="#E8E8E8", zorder=0, linewidth=0)
    axes.axhline(0, color="#666666", linewidth=0.8)
    for part, marker, face, name in (
        (residuals.real, "o", "#000000", "real"),
        (residuals.imag, "o", "none", "imaginary"),
    ):
        axes.plot(
            fit.sweep.freq_hz,
            part,
            marker,
            color=COLOURS["measured"] if name == "real" else COLOURS["fitted"],
            markerfacecolor=face,
            markersize=2.4 if name == "real" else 3.0,
            markeredgewidth=0.6,
            gid=f"residual {name}",
        )
    reach = max(4.0, 1.1 * float(np.max(np.abs(np.concatenate([residuals.real, residuals.imag])))))
    axes.set_ylim(-reach, reach)
    axes.set_ylabel("residual (σ)")
    axes.set_xlabel("frequency")
    axes.grid(True)
    words = (
        f"residuals: ● real, ○ imaginary part, band ±2 σ; {fit.adequacy.sentence} "
        f"(reduced chi-square {fit.adequacy.reduced_chi_square:.3g})"
    )
    weight = "normal" if fit.adequacy.adequate else "bold"
    width = WIDTH_IN - LEFT_IN - RIGHT_IN
    axes.set_title(shortened(words, width, SMALL_PT, weight), loc="left", size=SMALL_PT, weight=weight, pad=4)


def _reasons(left_out: tuple[LeftOut, ...]) -> list[str]:
    """One line a reason, with its number of points."""
    counts: dict[str, int] = {}
    for point in left_out:
        counts[point.reason] = counts.get(point.reason, 0) + 1
    lines = [f"left out, {count} point{'s' if count > 1 else ''}: {inert(reason)}" for reason, count in counts.items()]
    if len(lines) > MAX_REASONS:
        rest = sum(list(counts.values())[MAX_REASONS - 1 :])
        lines = [*lines[: MAX_REASONS - 1], f"left out, {rest} more points for other reasons"]
    return [shortened(line, WIDTH_IN - LEFT_IN - RIGHT_IN - 0.6) for line in lines]


def _draw_legend(
    figure: Figure, magnitude: Axes, comparison: Comparison | None, reasons: list[str], height_in: float
) -> None:
    entries: list[tuple[Line2D | Patch, str]] = [
        (Line2D([], [], marker=".", linestyle="none", color=COLOURS["measured"], markersize=7), "measured"),
        (Line2D([], [], color=COLOURS["fitted"], linewidth=1.6), "fitted: two poles, one zero"),
    ]
    if comparison is not None:
        entries.append(
            (Line2D([], [], color=COLOURS["designed"], linestyle="--", linewidth=2.0), "designed, on the bench")
        )
        if {"crossover_hz", "phase_margin_deg"} & set(comparison.design.limits):
            entries.append((Patch(facecolor=COLOURS["good"], alpha=0.35), "inside the limits"))
    rows = [entries]
    rows += [
        [
            (
                Line2D(
                    [], [], marker="x", linestyle="none", color=COLOURS["left out"], markersize=7, markeredgewidth=1.6
                ),
                line,
            )
        ]
        for line in reasons
    ]
    top = magnitude.get_position().y1 * figure.get_figheight() + height_in
    for index, row in enumerate(rows):
        figure.legend(
            [handle for handle, _ in row],
            [label for _, label in row],
            loc="center left",
            bbox_to_anchor=(LEFT_IN / WIDTH_IN, (top - (index + 0.5) * LEGEND_ROW_IN) / figure.get_figheight()),
            ncols=len(row),
            frameon=False,
            borderpad=0,
            borderaxespad=0,
            handlelength=2.2,
            fontsize=SMALL_PT if index else SIZE_PT - 1,
        )
