"""The legend of the loop-gain picture, above it, with a line for every reason why points were left out."""

from __future__ import annotations

from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from fitamp.comparison import Comparison
from fitamp.plots.style import COLOURS, SIZE_PT, SMALL_PT, WIDTH_IN, inert, shortened
from fitamp.sweep import LeftOut

__all__ = ["ROW_IN", "draw_legend", "reason_lines"]

ROW_IN = 0.22
MAX_REASONS = 3


def reason_lines(left_out: tuple[LeftOut, ...], width_in: float) -> list[str]:
    """One line a reason, with its number of points, cut to `width_in`."""
    counts: dict[str, int] = {}
    for point in left_out:
        counts[point.reason] = counts.get(point.reason, 0) + 1
    lines = [f"left out, {count} point{'s' if count > 1 else ''}: {inert(reason)}" for reason, count in counts.items()]
    if len(lines) > MAX_REASONS:
        rest = sum(list(counts.values())[MAX_REASONS - 1 :])
        lines = [*lines[: MAX_REASONS - 1], f"left out, {rest} more points for other reasons"]
    return [shortened(line, width_in) for line in lines]


def draw_legend(
    figure: Figure, comparison: Comparison | None, reasons: list[str], *, left_in: float, top_in: float
) -> None:
    """Draw the legend downwards from `top_in`: curves in one row, then a row a reason."""
    entries: list[tuple[Line2D | Patch, str]] = [
        (Line2D([], [], marker=".", linestyle="none", color=COLOURS["measured"], markersize=7), "measured"),
        (Line2D([], [], color=COLOURS["fitted"], linewidth=1.6), "fitted"),
    ]
    if comparison is not None:
        entries.append((Line2D([], [], color=COLOURS["designed"], linestyle="--", linewidth=2.0), "designed"))
        limited = bool({"crossover_hz", "phase_margin_deg"} & set(comparison.design.limits))
        words = "wanted: limits, zero window" if limited else "wanted: zero window"
        entries.append((Patch(facecolor=COLOURS["good"], alpha=0.35), words))
    entries.append((Patch(facecolor="#EFEFEF", edgecolor="#CCCCCC", linewidth=0.5), "beyond the sweep"))
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
    for index, row in enumerate(rows):
        figure.legend(
            [handle for handle, _ in row],
            [label for _, label in row],
            loc="center left",
            bbox_to_anchor=(left_in / WIDTH_IN, (top_in - (index + 0.5) * ROW_IN) / figure.get_figheight()),
            ncols=len(row),
            frameon=False,
            borderpad=0,
            borderaxespad=0,
            handlelength=1.8,
            columnspacing=1.4,
            fontsize=SMALL_PT if index else SIZE_PT - 1,
        )
