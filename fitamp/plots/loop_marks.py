"""What is marked on the loop-gain picture: crossover, phase margin, limits, and the lane of poles and zero."""

from __future__ import annotations

import math

from matplotlib.axes import Axes

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.fitting.result import text_of
from fitamp.plots.roots import Mark
from fitamp.plots.style import COLOURS, SMALL_PT, text_width_in

__all__ = ["draw_crossover", "draw_lane", "draw_limits", "draw_phase_margin"]

HALO = {"boxstyle": "square,pad=0.15", "facecolor": "white", "edgecolor": "none", "alpha": 0.85}


def draw_crossover(magnitude: Axes, phase: Axes, fit: LoopFit) -> None:
    """A vertical line where the fitted magnitude is 0 dB, with its frequency."""
    crossover = fit.margins.crossover_hz
    if crossover.value is None:
        return
    for axes in (magnitude, phase):
        axes.axvline(crossover.value, color=COLOURS["ink"], linestyle=":", linewidth=1.2, gid="crossover")
    words = f"crossover {text_of('crossover_hz', crossover)}"
    magnitude.annotate(
        words,
        xy=(crossover.value, 1),
        xycoords=magnitude.get_xaxis_transform(),
        xytext=(-6, -6),
        textcoords="offset points",
        ha="right",
        va="top",
        size=SMALL_PT,
        bbox=HALO,
    )


def draw_phase_margin(phase: Axes, fit: LoopFit) -> None:
    """A double arrow from −180° up to the phase at the crossover, with its value."""
    crossover, margin = fit.margins.crossover_hz, fit.margins.phase_margin_deg
    if crossover.value is None or margin.value is None:
        return
    phase.annotate(
        "",
        xy=(crossover.value, -180 + margin.value),
        xytext=(crossover.value, -180),
        arrowprops={"arrowstyle": "<->", "color": COLOURS["ink"], "linewidth": 1.4, "shrinkA": 0, "shrinkB": 0},
    )
    phase.annotate(
        f"phase margin {text_of('phase_margin_deg', margin)}",
        xy=(crossover.value, -180 + 0.45 * margin.value),
        xytext=(-8, 0),
        textcoords="offset points",
        ha="right",
        va="center",
        size=SMALL_PT,
        bbox=HALO,
    )


def draw_limits(magnitude: Axes, phase: Axes, comparison: Comparison, fit: LoopFit) -> None:
    """Where the crossover and the phase at it may lie."""
    limits = comparison.design.limits
    crossover = limits.get("crossover_hz")
    if crossover is not None:
        low = 1e-30 if crossover.low is None else crossover.low
        high = 1e30 if crossover.high is None else crossover.high
        magnitude.plot(
            [low, high], [0, 0], color=COLOURS["good"], alpha=0.35, linewidth=9, solid_capstyle="butt", gid="limit"
        )
    margin = limits.get("phase_margin_deg")
    at = fit.margins.crossover_hz.value
    if margin is not None and at is not None:
        low = -180 if margin.low is None else margin.low - 180
        high = 0 if margin.high is None else margin.high - 180
        phase.plot(
            [at, at], [low, high], color=COLOURS["good"], alpha=0.35, linewidth=9, solid_capstyle="butt", gid="limit"
        )


def draw_lane(
    lane: Axes,
    panels: tuple[Axes, ...],
    measured: tuple[Mark, ...],
    designed: tuple[Mark, ...],
    comparison: Comparison | None,
) -> None:
    """Poles and zero along the frequency axis, measured below designed, with the window of the zero."""
    rows = {"measured": 0.0}
    if designed:
        rows["designed"] = 1.0
    lane.set_ylim(-0.5, len(rows) - 0.5)
    lane.set_yticks(list(rows.values()), list(rows))
    lane.tick_params(axis="y", length=0)
    if comparison is not None:
        _draw_window(lane, comparison)
    for row, marks in (("measured", measured), ("designed", designed)):
        shown = [mark for mark in marks if mark.name != "pole 3"]
        _draw_row(lane, rows.get(row, 0.0), shown, filled=row == "measured")
    for mark in measured:
        if mark.value_hz is not None and mark.name != "pole 3":
            for axes in panels:
                axes.axvline(abs(mark.value_hz), color="#888888", linestyle=(0, (1, 3)), linewidth=0.9, zorder=1)


def _draw_window(lane: Axes, comparison: Comparison) -> None:
    """Distances at which the zero counts as designed."""
    window = comparison.verdict.window
    ends = sorted((abs(window.low_s), abs(window.high_s)))
    reaches_infinity = window.low_s <= 0 <= window.high_s
    near = 1 / (2 * math.pi * ends[1]) if ends[1] else 1e30
    far = 1e30 if reaches_infinity or not ends[0] else 1 / (2 * math.pi * ends[0])
    if math.isinf(ends[1]):
        near = 1e-30
    lane.axvspan(near, far, facecolor=COLOURS["good"], alpha=0.2, linewidth=0, gid="zero window")


def _draw_row(lane: Axes, y: float, marks: list[Mark], *, filled: bool) -> None:
    low, high = lane.get_xlim()
    colour = COLOURS["fitted"] if filled else COLOURS["designed"]
    width_in = lane.get_position().width * lane.figure.get_figwidth()  # type: ignore[union-attr]  # a figure, not a subfigure
    scale = width_in / math.log10(high / low)
    placed = sorted(((_distance(mark, low, high), mark) for mark in marks), key=lambda pair: pair[0])
    for index, (x, mark) in enumerate(placed):
        edge = "left" if x <= low else "right" if x >= high else ""
        for start, end in mark.regions_hz:
            ends = sorted((abs(start), abs(end)))
            lane.plot(
                [max(ends[0], low), min(ends[1], high)], [y, y], color=colour, linewidth=3, alpha=0.6, gid="region"
            )
        if edge:
            marker = "<" if edge == "left" else ">"
            at = low if edge == "left" else high
        else:
            marker, at = ("o" if mark.is_zero else "x"), x
        lane.plot(
            [at],
            [y],
            marker,
            color=colour,
            markerfacecolor=colour if filled else "white",
            markersize=8,
            markeredgewidth=2,
            clip_on=False,
            gid=f"{'measured' if filled else 'designed'} {mark.name}",
            zorder=4,
        )
        follower = placed[index + 1][0] if index + 1 < len(placed) else math.inf
        words = mark.label if not edge else f"{mark.label} {mark.words}"
        room = scale * math.log10(min(follower, high) / at) if at < high else 0.0
        on_left = edge == "right" or (edge == "" and room < text_width_in(words) + 0.25)
        lane.annotate(
            words,
            xy=(at, y),
            xytext=(-9 if on_left else 9, 0),
            textcoords="offset points",
            ha="right" if on_left else "left",
            va="center",
            size=SMALL_PT,
        )


def _distance(mark: Mark, low: float, high: float) -> float:
    """Where along the axis a mark stands; beyond an edge for one that lies there or has no value."""
    if mark.value_hz is not None:
        return abs(mark.value_hz)
    if mark.is_zero or any(math.isinf(end) for region in mark.regions_hz for end in region):
        return math.inf
    return 0.0
