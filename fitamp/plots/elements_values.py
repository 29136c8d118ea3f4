"""Every element against its design: deviation with its interval, the design's own spread behind, numbers beside."""

from __future__ import annotations

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import FuncFormatter, MaxNLocator

from fitamp.elements import EstimatedElement
from fitamp.findings import ElementFindings
from fitamp.plots.elements_head import figure_with_message
from fitamp.plots.elements_legend import draw_legend_row
from fitamp.plots.style import COLOURS, SMALL_PT, drawing_style, place_axes
from fitamp.report.elements_words import (
    element_label,
    element_text,
    from_data_words,
    is_told,
    moved_elements,
    moved_sentence,
    parasitic_sentences,
    percent,
)
from fitamp.units import si

__all__ = ["values_figure"]

LEFT_IN, WIDTH_AXES_IN, BOTTOM_IN, ROW_IN, TOP_IN = 1.05, 3.3, 0.6, 0.31, 0.55
NOTE_IN = 0.2
# Right ends of the columns of numbers, from the right end of the axes.
COLUMNS_IN = (0.88, 2.33, 3.08)
SHARE_IN = 3.22
# 95 % of parts of the design's own spread.
PRIOR_QUANTILE = 1.96
# Beyond these deviations an element is an arrow at the edge: others could not be told apart.
LEAST, MOST = -1.05, 2.0
PRIOR_COLOUR = "#D9D9D9"


def values_figure(findings: ElementFindings) -> Figure:
    """Draw deviation from the design, an element a row.

    Filled where the sweeps tell the element more than the design does, hollow where its value is the design's own.
    """
    ones = (*findings.estimate.elements, *findings.estimate.bench)
    notes = list(parasitic_sentences(findings))
    height_in = ROW_IN * len(ones)
    bottom_in = BOTTOM_IN + NOTE_IN * len(notes)
    with drawing_style():
        figure = figure_with_message(findings, moved_sentence(findings), body_in=bottom_in + height_in + TOP_IN)
        axes = place_axes(figure, left=LEFT_IN, bottom=bottom_in, width=WIDTH_AXES_IN, height=height_in)
        _set_axes(axes, ones)
        moved = {one.name for one in moved_elements(findings)}
        for label, one in zip(axes.get_yticklabels(), ones, strict=True):
            label.set_fontweight("bold" if one.name in moved else "normal")
        for row, one in enumerate(ones):
            _draw_prior(axes, one, row)
            _draw_estimate(axes, one, row, is_moved=one.name in moved)
            _write_numbers(axes, one, row, is_moved=one.name in moved)
        _write_headings(axes, height_in)
        _draw_legend(figure, top_in=bottom_in + height_in + TOP_IN)
        for index, note in enumerate(notes):
            y = (NOTE_IN * (len(notes) - index - 0.5) + 0.06) / figure.get_figheight()
            figure.text(0.2 / figure.get_figwidth(), y, f"Parasitic {note}", size=SMALL_PT, va="center", gid="note")
    return figure


def _ends(one: EstimatedElement) -> tuple[float, float, float] | None:
    """Deviation and the ends of its interval, relative; None where there is no such number."""
    if one.deviation is None or not one.designed:
        return None
    low, high = (one.deviation if end is None else end / one.designed - 1 for end in one.estimate.ci95)
    return one.deviation, low, high


def _reach(one: EstimatedElement) -> float:
    """Half width of the design's own 95 %, relative."""
    spread = one.spread or 0.0
    if one.name == "bench_delay_s" and one.designed:
        spread /= one.designed
    return PRIOR_QUANTILE * spread


def _set_axes(axes: Axes, ones: tuple[EstimatedElement, ...]) -> None:
    places = [0.05, -0.05]
    for one in ones:
        places += [_reach(one), -_reach(one), *(_ends(one) or ())]
    low, high = (min(max(end, LEAST), MOST) for end in (min(places), max(places)))
    pad = 0.06 * (high - low)
    axes.set_xlim(low - pad, high + pad)
    axes.set_ylim(len(ones) - 0.5, -0.5)
    axes.set_yticks(range(len(ones)), [element_label(one.name) for one in ones])
    axes.tick_params(axis="y", length=0)
    axes.xaxis.set_major_locator(MaxNLocator(6))
    axes.xaxis.set_major_formatter(FuncFormatter(_tick))
    axes.set_xlabel("estimated against designed")
    axes.grid(axis="x")
    axes.axvline(0, color=COLOURS["designed"], linewidth=2.0, zorder=1.5, gid="designed")
    for row in range(1, len(ones)):
        axes.axhline(row - 0.5, color=COLOURS["grid"], linewidth=0.5, zorder=0.5)


def _tick(value: float, _: int) -> str:
    return "0" if abs(value) < 1e-9 else f"{100 * value:+.0f} %".replace("-", "−")


def _draw_prior(axes: Axes, one: EstimatedElement, row: int) -> None:
    if reach := _reach(one):
        axes.barh(row, 2 * reach, left=-reach, height=0.62, color=PRIOR_COLOUR, zorder=1, gid=f"prior {one.name}")


def _draw_estimate(axes: Axes, one: EstimatedElement, row: int, *, is_moved: bool) -> None:
    ends = _ends(one)
    if ends is None or one.held:
        return
    value, low, high = ends
    left, right = axes.get_xlim()
    colour = COLOURS["bad" if is_moved else "fitted" if is_told(one) else "open"]
    if not left <= value <= right:
        marker, place = (">", right) if value > right else ("<", left)
        axes.plot([place], [row], marker, color=colour, markersize=9, clip_on=False, zorder=4, gid=f"beyond {one.name}")
        return
    axes.errorbar(
        [value],
        [row],
        xerr=[[max(value - low, 0.0)], [max(high - value, 0.0)]],
        fmt="o" if is_told(one) else "D",
        color=colour,
        markerfacecolor=colour if is_told(one) else "white",
        markersize=7 if is_told(one) else 6,
        markeredgewidth=1.6,
        linewidth=1.8,
        capsize=3.5,
        zorder=4,
        gid=f"estimate {one.name}",
    )


def _write_numbers(axes: Axes, one: EstimatedElement, row: int, *, is_moved: bool) -> None:
    """Designed value, estimate, deviation and share from the data, in columns right of the axes."""
    designed = "not stated" if one.designed is None else si(one.designed, one.unit)
    off_by = "–" if one.held else percent(one.deviation)
    cells = ((designed, False), (element_text(one), False), (off_by, is_moved))
    transform = axes.get_yaxis_transform()
    for place_in, (cell, is_bold) in zip(COLUMNS_IN, cells, strict=True):
        axes.text(
            1 + place_in / WIDTH_AXES_IN,
            row,
            cell,
            transform=transform,
            ha="right",
            va="center",
            size=SMALL_PT,
            weight="bold" if is_bold else "normal",
        )
    axes.text(
        1 + SHARE_IN / WIDTH_AXES_IN,
        row,
        from_data_words(one),
        transform=transform,
        ha="left",
        va="center",
        size=SMALL_PT,
        color=COLOURS["ink"] if is_told(one) else "#777777",
        gid=f"share {one.name}",
    )


def _write_headings(axes: Axes, height_in: float) -> None:
    y = 1 + 0.12 / height_in
    headings = zip((*COLUMNS_IN, SHARE_IN), ("designed", "estimate ± 1 σ", "off by", "from the data"), strict=True)
    for place_in, words in headings:
        is_last = place_in == SHARE_IN
        axes.text(
            1 + place_in / WIDTH_AXES_IN,
            y,
            words,
            transform=axes.transAxes,
            ha="left" if is_last else "right",
            va="center",
            size=SMALL_PT,
            weight="bold",
        )


def _draw_legend(figure: Figure, *, top_in: float) -> None:
    blue, grey = COLOURS["fitted"], COLOURS["open"]
    entries: list[tuple[Line2D | Patch, str]] = [
        (Line2D([], [], marker="o", color=COLOURS["bad"], markersize=7, linewidth=1.8), "off by more than its spread"),
        (Line2D([], [], marker="o", color=blue, markersize=7, linewidth=1.8), "within it"),
        (
            Line2D([], [], marker="D", color=grey, markerfacecolor="white", markersize=6, linewidth=1.8),
            "not measured: the design's own",
        ),
        (Patch(facecolor=PRIOR_COLOUR), "the design's 95 %"),
        (Line2D([], [], color=COLOURS["designed"], linewidth=2.0), "as designed"),
    ]
    draw_legend_row(figure, entries, left_in=0.2, y_in=top_in - 0.13)
