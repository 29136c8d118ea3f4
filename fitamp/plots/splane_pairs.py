"""The s-plane where there is a conjugate pair: both axes, ellipses for the 95 % regions."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from fitamp.arrays import FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import signed_decades, signed_decimal
from fitamp.plots.header import figure_with_head
from fitamp.plots.roots import Mark
from fitamp.plots.splane_frame import distances_hz, linear_hz, name_half_planes, reach_hz
from fitamp.plots.style import COLOURS, SMALL_PT, WIDTH_IN, place_axes

__all__ = ["draw_pairs"]

LEFT_IN, RIGHT_IN, BOTTOM_IN, TOP_IN, HEIGHT_IN, ROW_IN = 1.05, 0.25, 0.6, 0.3, 4.2, 0.22
# 95 % point of chi-square with two degrees of freedom: half axes of an ellipse in standard deviations, squared.
CHI_SQUARE_95_2 = 5.991
# Up to this ratio of farthest to nearest root a linear plane shows all of them, and ellipses keep their shape.
LINEAR_RATIO = 30.0


def draw_pairs(
    fit: LoopFit, comparison: Comparison | None, measured: tuple[Mark, ...], designed: tuple[Mark, ...]
) -> Figure:
    """The plane with every root, its values in words above it."""
    groups = {"designed": designed, "measured": measured} if designed else {"measured": measured}
    legend_in = ROW_IN * max(len(marks) for marks in groups.values()) + 0.1
    body_in = BOTTOM_IN + HEIGHT_IN + TOP_IN + legend_in
    figure = figure_with_head(fit, comparison, body_in=body_in)
    axes = place_axes(figure, left=LEFT_IN, bottom=BOTTOM_IN, width=WIDTH_IN - LEFT_IN - RIGHT_IN, height=HEIGHT_IN)
    reach = _set_scales(axes, fit, (*measured, *designed))
    axes.axhline(0, color="#AAAAAA", linewidth=0.8, zorder=1)
    name_half_planes(axes)
    axes.grid(True)
    axes.set_xlabel("s-plane over 2π: real part")
    axes.set_ylabel("imaginary part")
    for column, (group, marks) in enumerate(groups.items()):
        for mark in marks:
            _draw_mark(axes, mark, group, reach)
        figure.legend(
            [_handle(group, mark) for mark in marks],
            [f"{group}: {mark.label} {mark.words}" for mark in marks],
            loc="upper left",
            bbox_to_anchor=((LEFT_IN + 3.9 * column) / WIDTH_IN, body_in / figure.get_figheight()),
            frameon=False,
            borderpad=0,
            borderaxespad=0,
            labelspacing=0.4,
            fontsize=SMALL_PT,
        )
    return figure


def _set_scales(axes: Axes, fit: LoopFit, marks: tuple[Mark, ...]) -> float:
    """Scale both axes alike; the half width of the plane in hertz."""
    reach = reach_hz(fit, marks)
    if reach <= 2.5 * LINEAR_RATIO * min(d for d in distances_hz(marks) if d > 0):
        reach /= 2
        signed_decimal(axes.xaxis)
        signed_decimal(axes.yaxis)
    else:
        linear = linear_hz(marks)
        signed_decades(axes.xaxis, linear, reach)
        signed_decades(axes.yaxis, linear, reach)
    axes.set_xlim(-reach, reach)
    axes.set_ylim(-reach, reach)
    return reach


def _draw_mark(axes: Axes, mark: Mark, group: str, reach: float) -> None:
    for start, end in mark.regions_hz:
        low, high = max(start, -reach), min(end, reach)
        axes.plot([low, high], [0, 0], color=COLOURS["fitted"], linewidth=6, alpha=0.35, gid=f"region {mark.name}")
        for edge, is_out, marker in ((-reach, start < -reach, "<"), (reach, end > reach, ">")):
            if is_out:
                axes.plot([edge], [0], marker, color=COLOURS["fitted"], markersize=11, clip_on=False, gid="to infinity")
    if mark.value_hz is None:
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
