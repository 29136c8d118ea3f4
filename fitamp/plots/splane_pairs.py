"""The s-plane where there is a conjugate pair: both axes, ellipses for the 95 % regions."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from fitamp.arrays import FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import LINEAR_SHARE, signed_decades, signed_decimal
from fitamp.plots.further import FURTHER_ALPHA, Further, row_name
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
PALE_INK = "#777777"


def draw_pairs(
    fit: LoopFit,
    comparison: Comparison | None,
    measured: tuple[Mark, ...],
    designed: tuple[Mark, ...],
    further: tuple[Further, ...] = (),
) -> Figure:
    """The plane with every root, its values in words above it; resonances as far as they fall into it."""
    groups = {"designed": designed, "measured": measured} if designed else {"measured": measured}
    scale = _scale_of(fit, measured, designed, further)
    own = tuple(groups)
    if further:
        groups[row_name(further)] = tuple(_in_legend(one, scale) for one in further)
    columns = _columns(groups)
    legend_in = ROW_IN * max(sum(1 + len(groups[group]) for group in column) for column in columns) + 0.15
    body_in = BOTTOM_IN + HEIGHT_IN + TOP_IN + legend_in
    figure = figure_with_head(fit, comparison, body_in=body_in)
    axes = place_axes(figure, left=LEFT_IN, bottom=BOTTOM_IN, width=WIDTH_IN - LEFT_IN - RIGHT_IN, height=HEIGHT_IN)
    _set_scale(axes, scale)
    axes.axhline(0, color="#AAAAAA", linewidth=0.8, zorder=1)
    name_half_planes(axes)
    axes.grid(True)
    axes.set_xlabel("s-plane over 2π: real part")
    axes.set_ylabel("imaginary part")
    for group in own:
        for mark in groups[group]:
            _draw_mark(axes, mark, group, scale.reach_hz)
    _draw_further(axes, further)
    left = LEFT_IN
    for column in columns:
        top = body_in
        for group in column:
            _draw_legend(figure, group, groups[group], left, top)
            top -= ROW_IN * (1 + len(groups[group]))
        left += _width_in(groups[column[0]]) + 0.3
    return figure


def _in_legend(one: Further, scale: _Scale) -> Mark:
    assert one.poles.value_hz is not None
    beyond = "" if scale.shows(one.poles.value_hz) else " (beyond the picture)"
    return replace(one.poles, name=f"{one.words}{beyond}", words="")


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


@dataclass(frozen=True, slots=True, kw_only=True)
class _Scale:
    """Half width and half height of the plane, and up to where it is linear: None for all of it."""

    reach_hz: float
    height_hz: float
    linear_hz: float | None

    def shows(self, value_hz: complex) -> bool:
        """Whether a root falls into the picture."""
        return abs(value_hz.real) <= self.reach_hz and abs(value_hz.imag) <= self.height_hz


def _scale_of(
    fit: LoopFit, measured: tuple[Mark, ...], designed: tuple[Mark, ...], further: tuple[Further, ...]
) -> _Scale:
    """Linear where that shows all roots, and then resonances as far as they fall into it; in decades with them."""
    marks = (*measured, *designed)
    reach = reach_hz(fit, measured, designed)
    highest = _highest(marks)
    if reach <= 2.5 * LINEAR_RATIO * min(d for d in distances_hz(marks) if d > 0):
        return _Scale(reach_hz=reach / 2, height_hz=2.5 * highest / 2, linear_hz=None)
    linear = linear_hz(marks)
    highest = max(highest, _highest(tuple(one.poles for one in further)))
    # Words above the farthest mark need a fixed share of the height, however many decades that has.
    decades = math.log10(highest / linear) + LINEAR_SHARE if highest > linear else LINEAR_SHARE
    return _Scale(reach_hz=reach, height_hz=highest * max(2.5, 10 ** (WORDS_SHARE * decades)), linear_hz=linear)


def _highest(marks: tuple[Mark, ...]) -> float:
    return max((abs(mark.value_hz.imag) for mark in marks if mark.value_hz is not None), default=0.0)


def _set_scale(axes: Axes, scale: _Scale) -> None:
    if scale.linear_hz is None:
        signed_decimal(axes.xaxis)
        signed_decimal(axes.yaxis)
    else:
        signed_decades(axes.xaxis, scale.linear_hz, scale.reach_hz)
        signed_decades(axes.yaxis, scale.linear_hz, scale.height_hz)
    axes.set_xlim(-scale.reach_hz, scale.reach_hz)
    axes.set_ylim(-scale.height_hz, scale.height_hz)


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


def _draw_further(axes: Axes, further: tuple[Further, ...]) -> None:
    """Resonances and doublets, paler, each named once; a linear plane is not stretched for them."""
    for one in further:
        for mark in one.marks:
            assert mark.value_hz is not None
            places = [mark.value_hz, mark.value_hz.conjugate()] if mark.is_pair else [mark.value_hz]
            handle = _handle(one.kind, mark)
            handle.set_data([place.real for place in places], [place.imag for place in places])
            handle.set_gid(mark.name)
            axes.add_line(handle)
        assert one.poles.value_hz is not None
        axes.annotate(
            one.kind,
            xy=(one.poles.value_hz.real, one.poles.value_hz.imag),
            xytext=(8, 0) if one.poles.is_pair else (5, 9),
            textcoords="offset points",
            rotation=0 if one.poles.is_pair else 40,
            rotation_mode="anchor",
            va="center",
            size=SMALL_PT,
            color=PALE_INK,
        )


def _ellipse(covariance: FloatArray) -> FloatArray:
    """Outline of the 95 % region around 0, shape (2, 60)."""
    values, vectors = np.linalg.eigh(covariance)
    angle = np.linspace(0, 2 * np.pi, 60)
    circle = np.stack([np.cos(angle), np.sin(angle)])
    return np.asarray(vectors @ (np.sqrt(CHI_SQUARE_95_2 * values.clip(0))[:, np.newaxis] * circle))


def _handle(group: str, mark: Mark) -> Line2D:
    colour = COLOURS["designed" if group == "designed" else "fitted"]
    is_further = group not in {"measured", "designed"}
    return Line2D(
        [],
        [],
        marker="o" if mark.is_zero else "x",
        linestyle="none",
        color=colour,
        markerfacecolor=colour if group == "measured" else "none" if is_further else "white",
        markersize=7 if is_further else 9,
        markeredgewidth=1.4 if is_further else 2.2,
        alpha=FURTHER_ALPHA if is_further else None,
        zorder=4 if group == "measured" else 3,
    )
