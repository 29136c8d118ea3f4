"""The s-plane where there is a conjugate pair: both axes, ellipses for the 95 % regions."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from fitamp.arrays import FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import LINEAR_SHARE, signed_decades, signed_decimal
from fitamp.plots.header import figure_with_head
from fitamp.plots.roots import Mark
from fitamp.plots.splane_frame import distances_hz, linear_hz, name_half_planes, point_to_infinity, reach_hz
from fitamp.plots.style import COLOURS, SMALL_PT, WIDTH_IN, place_axes, text_width_in

__all__ = ["draw_pairs"]

LEFT_IN, RIGHT_IN, BOTTOM_IN, TOP_IN, HEIGHT_IN, ROW_IN = 1.05, 0.45, 0.6, 0.3, 4.2, 0.2
# 95 % point of chi-square with two degrees of freedom: half axes of an ellipse in standard deviations, squared.
CHI_SQUARE_95_2 = 5.991
# Up to this ratio of farthest to nearest root a linear plane shows all of them, and ellipses keep their shape.
LINEAR_RATIO = 8.0
WORDS_SHARE = 0.31


def draw_pairs(
    fit: LoopFit, comparison: Comparison | None, measured: tuple[Mark, ...], designed: tuple[Mark, ...]
) -> Figure:
    """The plane with every root, its values in words above it."""
    groups = {"designed": designed, "measured": measured} if designed else {"measured": measured}
    columns = _columns(groups)
    legend_in = ROW_IN * max(sum(1 + len(groups[group]) for group in column) for column in columns) + 0.15
    body_in = BOTTOM_IN + HEIGHT_IN + TOP_IN + legend_in
    figure = figure_with_head(fit, comparison, body_in=body_in)
    axes = place_axes(figure, left=LEFT_IN, bottom=BOTTOM_IN, width=WIDTH_IN - LEFT_IN - RIGHT_IN, height=HEIGHT_IN)
    reach = _set_scales(axes, fit, measured, designed)
    axes.axhline(0, color="#AAAAAA", linewidth=0.8, zorder=1)
    name_half_planes(axes)
    axes.grid(True)
    axes.set_xlabel("s-plane over 2π: real part")
    axes.set_ylabel("imaginary part")
    for group, marks in groups.items():
        for mark in marks:
            _draw_mark(axes, mark, group, reach)
    left = LEFT_IN
    for column in columns:
        top = body_in
        for group in column:
            _draw_legend(figure, group, groups[group], left, top)
            top -= ROW_IN * (1 + len(groups[group]))
        left += _width_in(groups[column[0]]) + 0.3
    return figure


def _columns(groups: dict[str, tuple[Mark, ...]]) -> list[list[str]]:
    """Groups side by side where their words leave room, else one below the other."""
    total = sum(_width_in(marks) + 0.3 for marks in groups.values())
    return [[group] for group in groups] if total <= WIDTH_IN - LEFT_IN else [list(groups)]


def _width_in(marks: tuple[Mark, ...]) -> float:
    return 0.5 + max(text_width_in(mark.sentence) for mark in marks)


def _draw_legend(figure: Figure, group: str, marks: tuple[Mark, ...], left_in: float, top_in: float) -> None:
    legend = figure.legend(
        [_handle(group, mark) for mark in marks],
        [mark.sentence for mark in marks],
        loc="upper left",
        bbox_to_anchor=(left_in / WIDTH_IN, top_in / figure.get_figheight()),
        frameon=False,
        borderpad=0,
        borderaxespad=0,
        labelspacing=0.4,
        title=group,
        alignment="left",
    )
    legend.get_title().set_fontweight("bold")


def _set_scales(axes: Axes, fit: LoopFit, measured: tuple[Mark, ...], designed: tuple[Mark, ...]) -> float:
    """Scale both axes alike; the half width of the plane in hertz."""
    marks = (*measured, *designed)
    reach = reach_hz(fit, measured, designed)
    height = 2.5 * max(abs(mark.value_hz.imag) for mark in marks if mark.value_hz is not None)
    if reach <= 2.5 * LINEAR_RATIO * min(d for d in distances_hz(marks) if d > 0):
        reach, height = reach / 2, height / 2
        signed_decimal(axes.xaxis)
        signed_decimal(axes.yaxis)
    else:
        linear = linear_hz(marks)
        # Words above the farthest mark need a fixed share of the height, however many decades that has.
        decades = math.log10(height / 2.5 / linear) + LINEAR_SHARE if height > 2.5 * linear else LINEAR_SHARE
        height = max(height, height / 2.5 * 10 ** (WORDS_SHARE * decades))
        signed_decades(axes.xaxis, linear, reach)
        signed_decades(axes.yaxis, linear, height)
    axes.set_xlim(-reach, reach)
    axes.set_ylim(-height, height)
    return reach


def _draw_mark(axes: Axes, mark: Mark, group: str, reach: float) -> None:
    for start, end in mark.regions_hz:
        low, high = max(start, -reach), min(end, reach)
        axes.plot([low, high], [0, 0], color=COLOURS["fitted"], linewidth=6, alpha=0.35, gid=f"region {mark.name}")
        point_to_infinity(axes, 0.0, (start, end), reach)
    if mark.value_hz is None or abs(mark.value_hz) > reach:
        return
    places = [mark.value_hz, mark.value_hz.conjugate()] if mark.is_pair else [mark.value_hz]
    if mark.covariance is not None:
        for place, side in zip(places, (1, -1), strict=False):
            ellipse = _ellipse(mark.covariance)
            axes.fill(
                place.real + ellipse[0],
                place.imag + side * ellipse[1],
                facecolor=COLOURS["fitted"],
                alpha=0.3,
                linewidth=0,
                gid=f"region {mark.name}",
            )
    handle = _handle(group, mark)
    handle.set_data([place.real for place in places], [place.imag for place in places])
    handle.set_gid(f"{group} {mark.name}")
    axes.add_line(handle)
    is_measured = group == "measured"
    axes.annotate(
        mark.name,
        xy=(places[0].real, places[0].imag),
        xytext=(5, -9) if is_measured else (5, 9),
        textcoords="offset points",
        rotation=-40 if is_measured else 40,
        rotation_mode="anchor",
        va="center",
        size=SMALL_PT,
    )


def _ellipse(covariance: FloatArray) -> FloatArray:
    """Outline of the 95 % region around 0, shape (2, 60)."""
    values, vectors = np.linalg.eigh(covariance)
    angle = np.linspace(0, 2 * np.pi, 60)
    circle = np.stack([np.cos(angle), np.sin(angle)])
    return np.asarray(vectors @ (np.sqrt(CHI_SQUARE_95_2 * values.clip(0))[:, np.newaxis] * circle))


def _handle(group: str, mark: Mark) -> Line2D:
    colour = COLOURS["fitted" if group == "measured" else "designed"]
    return Line2D(
        [],
        [],
        marker="o" if mark.is_zero else "x",
        linestyle="none",
        color=colour,
        markerfacecolor=colour if group == "measured" else "white",
        markersize=9,
        markeredgewidth=2.2,
        zorder=4 if group == "measured" else 3,
    )
