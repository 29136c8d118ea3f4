"""Poles and zero in the s-plane: designed above measured on one real axis, or in the plane where there is a pair."""

from __future__ import annotations

from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patheffects import withStroke
from matplotlib.scale import SymmetricalLogTransform

from fitamp.comparison import Comparison, Nulling
from fitamp.fitting import LoopFit
from fitamp.plots.axes import LINEAR_SHARE, signed_decades
from fitamp.plots.further import FURTHER_ALPHA, Further, further_marks, row_name
from fitamp.plots.header import figure_with_head
from fitamp.plots.roots import Mark, designed_marks, deviation_words, measured_marks
from fitamp.plots.splane_frame import linear_hz, name_half_planes, point_to_infinity, reach_hz
from fitamp.plots.splane_pairs import draw_pairs
from fitamp.plots.style import COLOURS, SIZE_PT, SMALL_PT, WIDTH_IN, drawing_style, place_axes, text_width_in

__all__ = ["splane_figure"]

LEFT_IN, RIGHT_IN, BOTTOM_IN, TOP_IN = 0.95, 0.45, 0.6, 0.3
LEVEL_IN, FIRST_LEVEL_IN, LANE_GAP_IN = 0.21, 0.3, 0.75
BAR_IN = 0.24


@dataclass(frozen=True, slots=True, kw_only=True)
class _Label:
    """A label beside its leader: x of the leader, extent and level; all in inches but the level."""

    at: float
    start: float
    end: float
    level: int
    words: str


def splane_figure(fit: LoopFit, comparison: Comparison | None = None) -> Figure:
    """Draw poles (×) and zero (○) in the s-plane over 2π, in hertz, with their 95 % regions.

    Both half planes are drawn in decades, linear around 0. With all roots real, the designed ones stand in a lane above
    the measured ones, and resonances (at their real part) and doublets in one below. A region that passes through
    infinity reaches both edges.
    """
    with drawing_style():
        measured = measured_marks(fit, comparison)
        designed = designed_marks(comparison.design) if comparison is not None else ()
        if any(mark.is_pair for mark in (*measured, *designed)):
            return draw_pairs(fit, comparison, measured, designed, further_marks(fit))
        return _draw_lanes(fit, comparison, measured, designed)


def _draw_lanes(
    fit: LoopFit, comparison: Comparison | None, measured: tuple[Mark, ...], designed: tuple[Mark, ...]
) -> Figure:
    reach, linear = reach_hz(fit, measured, designed), linear_hz((*measured, *designed))
    width_in = WIDTH_IN - LEFT_IN - RIGHT_IN
    further = further_marks(fit)
    lowest = _levels(tuple(_at_real_part(one) for one in further), linear, reach, width_in, None)
    below = _levels(measured, linear, reach, width_in, comparison)
    above = _levels(designed, linear, reach, width_in, None)
    further_y = _room(lowest) if further else 0.0
    measured_y = further_y + _room(below) + (FIRST_LEVEL_IN if further else 0.0)
    designed_y = measured_y + LANE_GAP_IN
    top = designed_y + _room(above) if designed else measured_y + FIRST_LEVEL_IN
    figure = figure_with_head(fit, comparison, body_in=BOTTOM_IN + top + TOP_IN)
    axes = place_axes(figure, left=LEFT_IN, bottom=BOTTOM_IN, width=width_in, height=top)
    signed_decades(axes.xaxis, linear, reach)
    axes.set_xlim(-reach, reach)
    axes.set_ylim(0, top)
    rows = {"measured": measured_y} | ({"designed": designed_y} if designed else {})
    rows |= {_row_words(further): further_y} if further else {}
    axes.set_yticks(list(rows.values()), list(rows), size=SIZE_PT)
    axes.tick_params(axis="y", length=0)
    axes.set_xlabel("s-plane over 2π: real axis (decades on both sides, linear around 0)")
    axes.grid(True, axis="x")
    name_half_planes(axes)
    for y in rows.values():
        axes.axhline(y, color="#AAAAAA", linewidth=0.8, zorder=1)
    _draw_regions(axes, measured, measured_y, reach)
    if designed:
        is_open = comparison is not None and comparison.verdict.nulling is Nulling.UNDECIDED
        # What is undecided has not moved anywhere yet.
        moved = tuple(mark for mark in designed if not (mark.is_zero and is_open))
        _draw_moves(axes, measured, moved, (measured_y, designed_y), reach)
    _draw_marks(axes, measured, measured_y, "measured")
    _draw_marks(axes, designed, designed_y, "designed")
    _draw_further(axes, further, further_y)
    _draw_labels(axes, lowest, further_y, -1, width_in)
    _draw_labels(axes, below, measured_y, -1, width_in)
    _draw_labels(axes, above, designed_y, +1, width_in)
    return figure


def _at_real_part(one: Further) -> Mark:
    """What the label on the real axis points at, and says."""
    assert one.poles.value_hz is not None
    return Mark(name=one.words, is_zero=False, value_hz=one.poles.value_hz)


def _row_words(further: tuple[Further, ...]) -> str:
    has_pairs = any(one.poles.is_pair for one in further)
    return f"{row_name(further)},\nreal part" if has_pairs else row_name(further)


def _draw_further(axes: Axes, further: tuple[Further, ...], y: float) -> None:
    for mark in (mark for one in further for mark in one.marks):
        assert mark.value_hz is not None
        axes.plot(
            [mark.value_hz.real],
            [y],
            "o" if mark.is_zero else "x",
            color=COLOURS["fitted"],
            markerfacecolor="none",
            markersize=7,
            markeredgewidth=1.4,
            alpha=FURTHER_ALPHA,
            gid=mark.name,
            zorder=4,
        )


def _position_in(value_hz: float, linear: float, reach: float, width_in: float) -> float:
    """Where a value falls along the axis, in inches from its left end."""
    transform = SymmetricalLogTransform(10, linear, LINEAR_SHARE)
    at, end = transform.transform([value_hz, reach])
    return float((at / end + 1) / 2 * width_in)


def _levels(
    marks: tuple[Mark, ...], linear: float, reach: float, width_in: float, comparison: Comparison | None
) -> list[_Label]:
    """Stairs of labels: from the origin outwards each starts at its own leader, one level up where it would overlap."""
    placed: list[_Label] = []
    anchors = {mark.name: _anchor_hz(mark, reach) for mark in marks}
    positions = {name: _position_in(anchor, linear, reach, width_in) for name, anchor in anchors.items()}
    for mark in sorted(marks, key=lambda m: abs(anchors[m.name])):
        at = positions[mark.name]
        words = mark.sentence + deviation_words(comparison, mark)
        placed.append(_free_place(placed, at, words, list(positions.values()), width_in))
    return placed


def _free_place(placed: list[_Label], at: float, words: str, positions: list[float], width_in: float) -> _Label:
    """The lowest level where labels do not overlap and no leader crosses one, in the own half plane if possible."""
    extent = text_width_in(words) + 0.12
    to_right, to_left = (at, at + extent), (at - extent, at)
    is_left = at < width_in / 2
    own_half = (0.0, width_in / 2) if is_left else (width_in / 2, width_in)
    inwards, outwards = (to_right, to_left) if is_left else (to_left, to_right)
    # Outwards only where no other leader would have to pass.
    candidates = [inwards] if any(outwards[0] < x < outwards[1] for x in positions) else [inwards, outwards]
    fitting = [c for c in candidates if own_half[0] <= c[0] and c[1] <= own_half[1]]
    if not fitting:
        start = min(max(0.0, candidates[0][0]), width_in - extent)
        fitting = [(start, start + extent)]
    for level in range(len(placed) + 1):
        for start, end in fitting:
            is_free = all(
                not (other.level == level and other.start < end and start < other.end)
                and not (other.level < level and other.start < at < other.end)
                and not (other.level > level and start < other.at < end)
                for other in placed
            )
            if is_free:
                return _Label(at=at, start=start, end=end, level=level, words=words)
    return _Label(at=at, start=fitting[0][0], end=fitting[0][1], level=len(placed), words=words)


def _anchor_hz(mark: Mark, reach: float) -> float:
    """Where a mark's label points: at the root, at the middle of its only region, or at the edge for infinity."""
    if mark.value_hz is not None:
        return max(-reach, min(reach, mark.value_hz.real))
    if len(mark.regions_hz) == 1:
        start, end = (max(-reach, min(reach, edge)) for edge in mark.regions_hz[0])
        return start if abs(start) > abs(end) else end
    return -reach


def _room(labels: list[_Label]) -> float:
    return FIRST_LEVEL_IN + LEVEL_IN * (1 + max((label.level for label in labels), default=0))


def _draw_labels(axes: Axes, labels: list[_Label], y: float, direction: int, width_in: float) -> None:
    for label in labels:
        height = y + direction * (FIRST_LEVEL_IN + LEVEL_IN * label.level)
        to_axes = axes.get_yaxis_transform()
        axes.plot([label.at / width_in] * 2, [y, height], color="#777777", linewidth=0.8, transform=to_axes, zorder=1.8)
        axes.text(
            (label.start + 0.06) / width_in,
            height,
            label.words,
            size=SMALL_PT,
            ha="left",
            va="center",
            transform=to_axes,
            zorder=5,
        )


def _draw_regions(axes: Axes, marks: tuple[Mark, ...], y: float, reach: float) -> None:
    for mark in marks:
        for start, end in mark.regions_hz:
            low, high = max(start, -reach), min(end, reach)
            is_open = start < -reach or end > reach
            axes.barh(
                y,
                high - low,
                left=low,
                height=BAR_IN,
                facecolor="#9DC3E6" if not is_open else "white",
                edgecolor=COLOURS["fitted"],
                hatch="////" if is_open else None,
                linewidth=0.8,
                zorder=2,
                gid=f"region {mark.name}",
            )
            point_to_infinity(axes, y, (start, end), reach)


def _draw_marks(axes: Axes, marks: tuple[Mark, ...], y: float, row: str) -> None:
    colour = COLOURS["fitted" if row == "measured" else "designed"]
    to_axes = axes.get_yaxis_transform()
    for mark in marks:
        if mark.is_at_infinity:  # one place, met at both edges
            x, transform = [0.012, 0.988], to_axes
        elif mark.value_hz is None:
            continue
        elif abs(mark.value_hz) > axes.get_xlim()[1]:  # there, but farther out than the picture
            x, transform = [0.012 if mark.value_hz.real < 0 else 0.988], to_axes
        else:
            x, transform = [mark.value_hz.real], axes.transData
        axes.plot(
            x,
            [y] * len(x),
            "o" if mark.is_zero else "x",
            color=colour,
            markerfacecolor=colour if row == "measured" else "white",
            markersize=10,
            markeredgewidth=2.4,
            gid=f"{row} {mark.name}",
            zorder=4 if mark.is_zero else 4.5,
            transform=transform,
            # A pole on a zero stays visible: the pair all but cancels, which is worth seeing.
            path_effects=[] if mark.is_zero else [withStroke(linewidth=5, foreground="white")],
        )


def _draw_moves(
    axes: Axes, measured: tuple[Mark, ...], designed: tuple[Mark, ...], lanes: tuple[float, float], reach: float
) -> None:
    """An arrow from each designed root to the measured one; between half planes it goes through infinity."""
    measured_y, designed_y = lanes
    found = {mark.name: mark for mark in measured}
    for mark in designed:
        other = found.get(mark.name)
        if other is None or mark.value_hz is None:
            continue
        start, side = mark.value_hz.real, -1 if mark.value_hz.real < 0 else 1
        if mark.is_zero and (other.reaches_infinity or (other.value_hz and other.value_hz.real * side < 0)):
            middle = (measured_y + designed_y) / 2
            _arrow(axes, (start, designed_y), (side * reach, middle), words="to ∞")
            if not other.reaches_infinity and other.value_hz is not None:
                _arrow(axes, (-side * reach, middle), (other.value_hz.real, measured_y), words="from ∞")
        elif other.value_hz is not None:
            _arrow(axes, (start, designed_y), (other.value_hz.real, measured_y))


def _arrow(axes: Axes, start: tuple[float, float], end: tuple[float, float], words: str = "") -> None:
    colour = COLOURS["bad"] if words else "#777777"
    axes.annotate(
        "",
        xy=end,
        xytext=start,
        arrowprops={
            "arrowstyle": "-|>",
            "color": colour,
            "linewidth": 1.8 if words else 1.2,
            "shrinkA": 8,
            "shrinkB": 8,
        },
        zorder=3,
    )
    if words:
        is_end = words.startswith("to")
        x, y = end if is_end else start
        axes.annotate(
            words,
            xy=(x, y),
            xytext=(6 if x < 0 else -6, -6 if is_end else 4),
            textcoords="offset points",
            ha="left" if x < 0 else "right",
            va="top" if is_end else "bottom",
            size=SMALL_PT,
            color=colour,
        )
