"""A legend in one row, outside of all axes."""

from __future__ import annotations

from collections.abc import Sequence

from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from fitamp.plots.style import SMALL_PT, WIDTH_IN

__all__ = ["draw_legend_row"]


def draw_legend_row(
    figure: Figure, entries: Sequence[tuple[Line2D | Patch, str]], *, left_in: float, y_in: float
) -> None:
    """Draw the entries in a row that starts at `left_in`, centred on `y_in`."""
    figure.legend(
        [handle for handle, _ in entries],
        [label for _, label in entries],
        loc="center left",
        bbox_to_anchor=(left_in / WIDTH_IN, y_in / figure.get_figheight()),
        ncols=len(entries),
        frameon=False,
        borderpad=0,
        borderaxespad=0,
        handlelength=1.8,
        columnspacing=1.4,
        fontsize=SMALL_PT,
    )
