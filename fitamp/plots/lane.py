"""The lane below the phase: where designed and measured poles and zero lie along the frequency axis."""

from __future__ import annotations

import math
from dataclasses import dataclass

from matplotlib.axes import Axes

from fitamp.comparison import Comparison
from fitamp.plots.roots import Mark
from fitamp.plots.style import COLOURS, SMALL_PT, text_width_in
from fitamp.units import si

__all__ = ["draw_lane", "widened"]

# From a mark's centre to its name.
OFFSET_IN = 0.13
GAP_IN = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class _Spot:
    """A mark at a frequency with its name, or all marks beyond one edge ("<" or ">") with theirs."""

    marks: tuple[Mark, ...]
    at_hz: float
    edge: str
    words: str


def widened(rows: tuple[tuple[Mark, ...], ...], low_hz: float, high_hz: float, width_in: float) -> float:
    """The upper end of the axis that leaves room for the names right of the last mark in every row."""
    highest = high_hz
    for row in rows:
        spots = _spots(row, low_hz, high_hz)
        inside = [spot for spot in spots if not spot.edge]
        if not inside:
            continue
        own = OFFSET_IN + text_width_in(inside[-1].words) + GAP_IN
        outside = sum(OFFSET_IN + text_width_in(spot.words) + 2 * GAP_IN for spot in spots if spot.edge == ">")
        low, at = math.log10(low_hz), math.log10(inside[-1].at_hz)
        before = math.log10(inside[-2].at_hz) if len(inside) > 1 else low
        scale = width_in / (math.log10(highest) - low)
        is_left_free = (at - before) * scale > own + OFFSET_IN
        need = OFFSET_IN + outside if is_left_free else own + outside
        # Solved for the end of the axis: the share right of the mark, in inches, is `need`.
        highest = max(highest, 10 ** ((width_in * at - need * low) / (width_in - need)))
    return highest


def draw_lane(
    lane: Axes,
    panels: tuple[Axes, ...],
    measured: tuple[Mark, ...],
    designed: tuple[Mark, ...],
    comparison: Comparison | None,
    *,
    width_in: float,
) -> None:
    """Draw the marks, measured below designed, the window of the designed zero, and guides into the panels above."""
    rows = {"measured": 0.0} | ({"designed": 1.0} if designed else {})
    lane.set_ylim(-0.5, len(rows) - 0.5)
    lane.set_yticks(list(rows.values()), list(rows))
    lane.tick_params(axis="y", length=0)
    if comparison is not None:
        _draw_window(lane, comparison)
    for row, marks in (("measured", measured), ("designed", designed)):
        if row in rows:
            _draw_row(lane, rows[row], row, marks, width_in)
    low, high = lane.get_xlim()
    for spot in _spots(measured, low, high):
        if not spot.edge:
            for axes in panels:
                axes.axvline(spot.at_hz, color="#888888", linestyle=(0, (1, 3)), linewidth=0.9, zorder=1)


def _spots(marks: tuple[Mark, ...], low_hz: float, high_hz: float) -> list[_Spot]:
    """Pole 1, pole 2 (or the pair) and the zero, lowest first. A third pole is not what the sweep is about."""
    shown = sorted((mark for mark in marks if mark.name != "pole 3"), key=_distance_hz)
    inside = [
        _Spot(marks=(mark,), at_hz=_distance_hz(mark), edge="", words=mark.label)
        for mark in shown
        if low_hz <= _distance_hz(mark) <= high_hz
    ]
    below = tuple(mark for mark in shown if _distance_hz(mark) < low_hz)
    above = tuple(mark for mark in shown if _distance_hz(mark) > high_hz)
    return [
        *([_Spot(marks=below, at_hz=0.0, edge="<", words=_far_words(below))] if below else []),
        *inside,
        *([_Spot(marks=above, at_hz=math.inf, edge=">", words=_far_words(above))] if above else []),
    ]


def _far_words(marks: tuple[Mark, ...]) -> str:
    return "; ".join(_far_word(mark) for mark in marks)


def _far_word(mark: Mark) -> str:
    """Name and value; of a region through infinity its nearer end, whichever half plane that is in."""
    if mark.is_zero and len(mark.regions_hz) == 2:
        nearest = min(abs(end) for region in mark.regions_hz for end in region)
        return f"{mark.name} > {si(nearest, 'Hz', digits=3)}"
    return mark.sentence


def _distance_hz(mark: Mark) -> float:
    """Distance from the origin. Without a value pole 1 is below the band, and all else above it."""
    if mark.value_hz is not None:
        return abs(mark.value_hz)
    return 0.0 if mark.name == "pole 1" else math.inf


def _draw_window(lane: Axes, comparison: Comparison) -> None:
    """Distances at which the zero counts as designed, behind the designed row: the half plane counts as well."""
    window = comparison.verdict.window
    nearest = max(abs(window.low_s), abs(window.high_s))
    farthest = 0.0 if window.low_s <= 0 <= window.high_s else min(abs(window.low_s), abs(window.high_s))
    low, high = lane.get_xlim()
    start = low if math.isinf(nearest) else 1 / (2 * math.pi * nearest)
    end = 1 / (2 * math.pi * farthest) if farthest else high
    lane.axvspan(start, end, 0.5, 1, facecolor=COLOURS["good"], alpha=0.35, linewidth=0, gid="zero window")


def _draw_row(lane: Axes, y: float, row: str, marks: tuple[Mark, ...], width_in: float) -> None:
    low, high = lane.get_xlim()
    scale = width_in / math.log10(high / low)
    colour = COLOURS["fitted" if row == "measured" else "designed"]
    free_to = width_in  # everything right of this is taken
    for spot in reversed(_spots(marks, low, high)):
        for start, end in (region for mark in spot.marks for region in mark.regions_hz):
            near, far = sorted((abs(start), abs(end)))
            if near < high and far > low:
                ends = [max(near, low), min(far, high)]
                lane.plot(ends, [y, y], color=colour, linewidth=4, alpha=0.4, gid="region")
        at_in = {"<": 0.1, ">": width_in - 0.1}.get(spot.edge, scale * math.log10(max(spot.at_hz, low) / low))
        extent = OFFSET_IN + text_width_in(spot.words)
        on_right = spot.edge != ">" and at_in + extent <= free_to
        free_to = at_in - OFFSET_IN - GAP_IN if on_right else at_in - extent - GAP_IN
        x = low * 10 ** (at_in / scale) if spot.edge else spot.at_hz
        lane.plot(
            [x],
            [y],
            spot.edge or ("o" if spot.marks[0].is_zero else "x"),
            color=colour,
            markerfacecolor=colour if row == "measured" else "white",
            markersize=8,
            markeredgewidth=2,
            gid=f"{row} {', '.join(mark.name for mark in spot.marks)}",
            zorder=4,
        )
        lane.annotate(
            spot.words,
            xy=(x, y),
            xytext=(OFFSET_IN * 72 * (1 if on_right else -1), 0),
            textcoords="offset points",
            ha="left" if on_right else "right",
            va="center",
            size=SMALL_PT,
        )
