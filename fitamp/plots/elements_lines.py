"""The classic lines: time of pole 2 over added load, zero time over added resistance, beside the joint fit."""

from __future__ import annotations

from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from fitamp.arrays import FloatArray
from fitamp.elements import LineFit, LineKind
from fitamp.findings import ElementFindings
from fitamp.fitting.result import text_of
from fitamp.plots.elements_head import figure_with_message
from fitamp.plots.elements_legend import draw_legend_row
from fitamp.plots.elements_units import in_multiples
from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.style import COLOURS, SIZE_PT, drawing_style, place_axes
from fitamp.report.elements_words import line_sentence
from fitamp.units import si, si_with_error

__all__ = ["lines_figure"]

LEFT_IN, WIDTH_AXES_IN, APART_IN = 0.8, 3.55, 0.85
WIDE_IN = 2 * WIDTH_AXES_IN + APART_IN  # of a single line
BOTTOM_IN, RESIDUAL_IN, GAP_IN, HEIGHT_IN, TOP_IN = 0.6, 0.95, 0.12, 2.7, 0.62
# The line is drawn on to where it meets 0, unless that is farther than so many times the measured range.
FARTHEST_MEETING = 2.0
DISC_IN = 0.1
TITLES = {
    LineKind.POLE2: "pole 2 over the added load",
    LineKind.ZERO: "zero over the added resistance",
}
LABELS_X = {LineKind.POLE2: "load added", LineKind.ZERO: "resistance added in series with Rz"}
LABELS_Y = {LineKind.POLE2: "1/(2π·pole 2)", LineKind.ZERO: "zero time τz"}
JOINT_STYLE: dict[str, Any] = {"color": COLOURS["good"], "linestyle": (0, (4, 2)), "linewidth": 1.8}


def lines_figure(findings: ElementFindings) -> Figure | None:
    """Draw a panel a line, with what is off it below; None where the sweeps allow no line."""
    if not findings.lines:
        return None
    body_in = BOTTOM_IN + RESIDUAL_IN + GAP_IN + HEIGHT_IN + TOP_IN
    message = "; ".join(line_sentence(line, findings) for line in findings.lines)
    with drawing_style():
        figure = figure_with_message(findings, message, body_in=body_in)
        _draw_legend(figure, top_in=body_in)
        width_in = WIDTH_AXES_IN if len(findings.lines) > 1 else WIDE_IN
        for column, line in enumerate(findings.lines):
            left_in = LEFT_IN + column * (width_in + APART_IN)
            below = place_axes(figure, left=left_in, bottom=BOTTOM_IN, width=width_in, height=RESIDUAL_IN)
            bottom_in = BOTTOM_IN + RESIDUAL_IN + GAP_IN
            above = place_axes(figure, left=left_in, bottom=bottom_in, width=width_in, height=HEIGHT_IN)
            _draw_line(above, line, findings)
            _draw_residuals(below, line, above.get_xlim())
    return figure


def _meeting(line: LineFit) -> float | None:
    """Where the line meets 0, if that is not too far off to be drawn."""
    slope, intercept = line.line.slope, line.line.intercept
    span = float(np.ptp(line.x))
    at = -intercept / slope if slope else np.inf
    is_near = min(line.x) - FARTHEST_MEETING * span < at < max(line.x) + FARTHEST_MEETING * span
    return at if is_near else None


def _draw_line(axes: Axes, line: LineFit, findings: ElementFindings) -> None:
    meeting = _meeting(line)
    points = [*line.x, 0.0, *([] if meeting is None else [meeting])]
    low, high = min(points), max(points)
    pad = 0.06 * (high - low)
    axes.set_xlim(low - pad, high + pad)
    x = np.linspace(low - pad, high + pad, 101)
    axes.plot(x, line.joint.at(x), gid="joint", zorder=2.2, **JOINT_STYLE)
    bottom, top = line.band(x)
    axes.fill_between(x, bottom, top, color=COLOURS["fitted"], alpha=0.25, linewidth=0, zorder=1, gid="band")
    inner = (x >= min(line.x)) & (x <= max(line.x))
    axes.plot(x, line.line.at(x), color=COLOURS["fitted"], linewidth=1.0, linestyle=":", zorder=2, gid="drawn on")
    axes.plot(x[inner], line.line.at(x[inner]), color=COLOURS["fitted"], linewidth=1.6, zorder=2.1, gid="line")
    _draw_points(axes, line, line.y)
    if meeting is not None or min(line.y) < 0:
        axes.axhline(0, color="#666666", linewidth=0.8, zorder=1)
    if min(line.x) < 0 < max(line.x) or meeting is not None:
        axes.axvline(0, color="#BBBBBB", linewidth=0.8, zorder=0.8)
    axes.tick_params(labelbottom=False)
    axes.set_title(TITLES[line.kind], size=SIZE_PT, pad=5, loc="left")
    in_multiples(axes.yaxis, "s", LABELS_Y[line.kind])
    axes.xaxis.set_major_locator(MaxNLocator(6))
    axes.grid()
    _write(axes, line, meeting, findings)


def _draw_points(axes: Axes, line: LineFit, y: FloatArray) -> None:
    axes.errorbar(
        line.x,
        y,
        yerr=2 * line.y_stderr,
        fmt="o",
        color=COLOURS["measured"],
        markersize=5,
        capsize=3,
        linewidth=1.2,
        zorder=4,
        gid="points",
    )


def _write(axes: Axes, line: LineFit, meeting: float | None, findings: ElementFindings) -> None:
    """Slope and what it means, and what lies at the place where the line meets 0."""
    axes.set_ylim(axes.get_ylim())  # else it changes once more when it is drawn, after places were chosen
    clutter = Clutter(axes)
    low, high = axes.get_xlim()
    clutter.add_line([low, high], line.line.at([low, high]))
    clutter.add_line([low, high], [0, 0])
    clutter.add_line([0, 0], axes.get_ylim(), soft_in=0.4)
    for x, y in zip(line.x, line.y, strict=True):
        clutter.add_disc(float(x), float(y), DISC_IN)
    if meeting is not None:
        axes.plot(
            [meeting],
            [0],
            "o",
            color=COLOURS["fitted"],
            markerfacecolor="white",
            markersize=8,
            zorder=4.5,
            gid="meeting",
        )
        clutter.add_disc(meeting, 0.0, DISC_IN)
        words_at(clutter, _meeting_words(line, meeting, findings), (meeting, 0.0), gid="words")
    middle = float(np.mean(line.x))
    words_at(clutter, _slope_words(line), (middle, float(line.line.at(middle))), gid="words")


def _slope_words(line: LineFit) -> str:
    slope, intercept = line.slope, line.intercept
    if line.kind is LineKind.POLE2:
        rate = si_with_error((slope.value or 0.0) * 1e-12, (slope.stderr or 0.0) * 1e-12, "s")
        return f"slope {rate} per pF\nat 0: {text_of('zero_time_s', intercept)}"
    return f"slope Cc = {text_of('load_f', slope)}\nat 0: τz = {text_of('zero_time_s', intercept)}"


def _meeting_words(line: LineFit, meeting: float, findings: ElementFindings) -> str:
    """What is there already: the whole load, or the part of Rz beyond 1/gm2."""
    if line.kind is LineKind.POLE2:
        extra = line.meaning
        beyond = "" if extra.value is None else f"\n{text_of('load_f', extra)} of it\nnobody designed"
        return f"meets 0 at {si(meeting, 'F', digits=3)}:\nso much load is there{beyond}"
    side = "more" if meeting < 0 else "less"
    reference = "1/gm2 and Cgd take" if findings.estimate.circuit.nominal.Cgd else "1/gm2"
    return f"meets 0 at {si(meeting, 'Ω', digits=3)}:\nRz is so much {side}\nthan {reference}"


def _draw_residuals(axes: Axes, line: LineFit, limits: tuple[float, float]) -> None:
    """Distances from the line: points, its band, and the line of the joint fit."""
    axes.set_xlim(*limits)
    x = np.linspace(*limits, 101)
    bottom, top = line.band(x)
    centre = line.line.at(x)
    axes.fill_between(x, bottom - centre, top - centre, color=COLOURS["fitted"], alpha=0.25, linewidth=0, zorder=1)
    axes.axhline(0, color=COLOURS["fitted"], linewidth=1.6, zorder=2)
    axes.plot(x, line.joint.at(x) - centre, gid="joint apart", zorder=2.2, **JOINT_STYLE)
    away = line.y - line.line.at(line.x)
    _draw_points(axes, line, away)
    inner = np.linspace(min(line.x), max(line.x), 51)
    reach = [*(np.abs(away) + 2 * line.y_stderr), *(line.band(inner)[1] - line.line.at(inner))]
    reach += list(np.abs(line.joint.at(inner) - line.line.at(inner)))
    axes.set_ylim(-1.25 * max(reach), 1.25 * max(reach))
    in_multiples(axes.yaxis, "s", "off the line")
    in_multiples(axes.xaxis, "F" if line.kind is LineKind.POLE2 else "Ω", LABELS_X[line.kind])
    axes.xaxis.set_major_locator(MaxNLocator(6))
    axes.yaxis.set_major_locator(MaxNLocator(4, symmetric=True))
    axes.grid()


def _draw_legend(figure: Figure, *, top_in: float) -> None:
    entries: list[tuple[Line2D | Patch, str]] = [
        (
            Line2D([], [], marker="o", color=COLOURS["measured"], markersize=5, linewidth=1.2),
            "fits of single sweeps ± 2 σ",
        ),
        (Line2D([], [], color=COLOURS["fitted"], linewidth=1.6), "line through them"),
        (Patch(facecolor=COLOURS["fitted"], alpha=0.25), "its 95 % band"),
        (Line2D([], [], **JOINT_STYLE), "joint fit of the circuit, as a check"),
    ]
    draw_legend_row(figure, entries, left_in=0.2, y_in=top_in - 0.13)
