"""The words around the loop-gain picture: legend and path delay above it, why points were left out, notes below it."""

from __future__ import annotations

from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.fitting.result import text_of
from fitamp.plots.style import COLOURS, SIZE_PT, SMALL_PT, WIDTH_IN, inert, shortened, wrapped
from fitamp.sweep import LeftOut
from fitamp.units import si

__all__ = ["NOTE_LINE_IN", "ROW_IN", "delay_words", "draw_legend", "draw_notes", "note_lines", "reason_lines"]

ROW_IN = 0.22
NOTE_LINE_IN = 0.165
MAX_REASONS = 3
MAX_NOTES = 2


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


def delay_words(fit: LoopFit) -> str:
    """The path delay in the fitted curve, and where it comes from."""
    delay, prior = fit.parameters.delay_s, fit.solution.model.delay
    known = fit.solution.model.known
    own = f"; the loop's own {si(known.delay_s, 's', digits=3)} as designed" if known and known.delay_s else ""
    if not prior.sd_s:
        return f"path delay held at {si(prior.mean_s, 's', digits=3)}{own}"
    words = f"path delay {text_of('delay_s', delay)}, fitted"
    if prior.sd_s < float("inf"):
        words += f" (stated: {si(prior.mean_s, 's', digits=3)} ± {si(prior.sd_s, 's', digits=2)})"
    return words + own


def note_lines(fit: LoopFit, comparison: Comparison | None, width_in: float) -> list[str]:
    """The first warnings in wrapped lines, and how many more there are."""
    notes = [*(comparison.notes if comparison is not None else ()), *fit.warnings]
    lines: list[str] = []
    for note in notes[:MAX_NOTES]:
        lines += wrapped(inert(f"note: {note.message}"), width_in, SMALL_PT)
    if len(notes) > MAX_NOTES:
        rest = len(notes) - MAX_NOTES
        lines.append(f"note: {rest} more note{'s' if rest > 1 else ''} in the report's text")
    return lines


def draw_notes(figure: Figure, lines: list[str], *, left_in: float, top_in: float) -> None:
    """Write the notes downwards from `top_in`."""
    for index, line in enumerate(lines):
        y = (top_in - (index + 0.5) * NOTE_LINE_IN) / figure.get_figheight()
        figure.text(left_in / WIDTH_IN, y, line, size=SMALL_PT, va="center", gid="note")


def draw_legend(
    figure: Figure, fit: LoopFit, comparison: Comparison | None, reasons: list[str], *, left_in: float, top_in: float
) -> None:
    """Draw the legend downwards from `top_in`: curves in one row, the path delay, then a row a reason."""
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
    height_in = figure.get_figheight()
    _draw_row(figure, entries, SIZE_PT - 1, (left_in / WIDTH_IN, (top_in - 0.5 * ROW_IN) / height_in))
    figure.text(left_in / WIDTH_IN, (top_in - 1.5 * ROW_IN) / height_in, delay_words(fit), size=SMALL_PT, va="center")
    for index, line in enumerate(reasons):
        cross = Line2D(
            [], [], marker="x", linestyle="none", color=COLOURS["left out"], markersize=7, markeredgewidth=1.6
        )
        _draw_row(
            figure, [(cross, line)], SMALL_PT, (left_in / WIDTH_IN, (top_in - (index + 2.5) * ROW_IN) / height_in)
        )


def _draw_row(
    figure: Figure, entries: list[tuple[Line2D | Patch, str]], size_pt: float, place: tuple[float, float]
) -> None:
    figure.legend(
        [handle for handle, _ in entries],
        [label for _, label in entries],
        loc="center left",
        bbox_to_anchor=place,
        ncols=len(entries),
        frameon=False,
        borderpad=0,
        borderaxespad=0,
        handlelength=1.8,
        columnspacing=1.4,
        fontsize=size_pt,
    )
