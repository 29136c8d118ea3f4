"""What moved zero, second pole and phase margin: signed contributions from the designed value to the estimated one."""

from __future__ import annotations

from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from fitamp.comparison.result import Row
from fitamp.elements import Contribution, Quantity, QuantityBlame
from fitamp.estimate import Estimate
from fitamp.findings import ElementFindings
from fitamp.fitting.result import LABELS, text_of, unit_of
from fitamp.plots.elements_head import figure_with_message
from fitamp.plots.elements_legend import draw_legend_row
from fitamp.plots.elements_units import in_multiples
from fitamp.plots.style import COLOURS, SMALL_PT, drawing_style, place_axes
from fitamp.report.elements_words import blame_sentence, element_label, is_told, percent, share_text
from fitamp.units import si

__all__ = ["BLAMED", "blame_figure"]

BLAMED = (Quantity.ZERO_TIME, Quantity.POLE2, Quantity.PHASE_MARGIN)
LEFT_IN, WIDTH_AXES_IN, ROW_IN = 1.75, 5.75, 0.235
BETWEEN_IN, BOTTOM_IN, TOP_IN = 0.66, 0.55, 0.36
# Contributions below this share of the largest are drawn as one, and not where that cannot be seen.
WORTH_A_ROW, WORTH_SEEING = 0.03, 0.004
HATCH = "////"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Bar:
    """One row: from where to where, with the standard error of its length."""

    name: str
    words: str
    start: float
    share: float
    stderr: float
    is_told: bool


def blame_figure(findings: ElementFindings) -> Figure | None:
    """Draw a panel for each quantity; None where no quantity exists in both designed and estimated part.

    Bars run from the designed value to the estimated one, an element a row, each from where the one before it ended.
    """
    blamed = [one for one in (findings.blame.of(quantity) for quantity in BLAMED) if one is not None]
    if not blamed:
        return None
    told = {one.name for one in (*findings.estimate.elements, *findings.estimate.bench) if is_told(one)}
    panels = [(one, _bars(one, told)) for one in blamed]
    heights = [ROW_IN * (len(bars) + 2) for _, bars in panels]
    body_in = TOP_IN + sum(heights) + BETWEEN_IN * (len(panels) - 1) + BOTTOM_IN
    with drawing_style():
        figure = figure_with_message(findings, blame_sentence(blamed), body_in=body_in)
        _draw_legend(figure, top_in=body_in)
        top_in = body_in - TOP_IN
        for (one, bars), height_in in zip(panels, heights, strict=True):
            top_in -= height_in
            axes = place_axes(figure, left=LEFT_IN, bottom=top_in, width=WIDTH_AXES_IN, height=height_in)
            row = next((row for row in findings.rows if row.quantity == one.quantity.value), None)
            _draw_panel(axes, one, bars, row)
            top_in -= BETWEEN_IN
    return figure


def _bars(one: QuantityBlame, told: set[str]) -> list[_Bar]:
    """Contributions worth a row, largest first, and the rest as one."""
    largest = max((abs(part.share.value or 0.0) for part in one.contributions), default=0.0)
    shown = [part for part in one.contributions if abs(part.share.value or 0.0) > WORTH_A_ROW * largest]
    rest = [part for part in one.contributions if part not in shown]
    bars: list[_Bar] = []
    at = one.designed
    for part in shown:
        share = part.share.value or 0.0
        bars.append(
            _Bar(
                name=part.name,
                words=_name(part),
                start=at,
                share=share,
                stderr=part.share.stderr or 0.0,
                is_told=part.name in told,
            )
        )
        at += share
    others = sum(part.share.value or 0.0 for part in rest)
    if rest and abs(others) > WORTH_SEEING * largest:
        bars.append(_Bar(name="others", words="others", start=at, share=others, stderr=0.0, is_told=True))
    return bars


def _name(part: Contribution) -> str:
    deviation = part.estimated / part.designed - 1 if part.designed else None
    return f"{element_label(part.name)}  {percent(deviation)}" if deviation is not None else element_label(part.name)


def _draw_panel(axes: Axes, one: QuantityBlame, bars: list[_Bar], row: Row | None) -> None:
    rows = len(bars) + 2
    axes.set_ylim(rows - 0.5, -0.5)
    ends = [
        one.designed,
        one.estimated,
        *(bar.start + bar.share + sign * bar.stderr for bar in bars for sign in (-2, 2)),
    ]
    low, high = min(ends), max(ends)
    pad = 0.05 * (high - low or abs(high) or 1.0)
    axes.set_xlim(low - pad, high + pad)
    _draw_limits(axes, row)
    for place, value, colour, name in (
        (0, one.designed, COLOURS["designed"], "designed"),
        (rows - 1, one.estimated, COLOURS["fitted"], "estimated"),
    ):
        axes.plot([value], [place], "o", color=colour, markersize=8, zorder=4, gid=name)
        axes.axvline(value, color=colour, linewidth=1.2, linestyle="--", zorder=1.2)
    for place, bar in enumerate(bars, start=1):
        _draw_bar(axes, bar, place, next_start=bar.start + bar.share)
    names = ["designed", *(bar.words for bar in bars), "estimated"]
    axes.set_yticks(range(rows), names)
    axes.tick_params(axis="y", length=0)
    _write_values(axes, one, bars)
    axes.grid(axis="x")
    axes.xaxis.set_major_locator(MaxNLocator(7))
    in_multiples(axes.xaxis, one.quantity.unit, LABELS[one.quantity.value])
    axes.set_xlabel(f"{axes.get_xlabel()}: moved by {share_text(one.quantity.value, one.change)} in all")


def _draw_limits(axes: Axes, row: Row | None) -> None:
    """What was promised, behind everything."""
    if row is None or (row.low is None and row.high is None):
        return
    left, right = axes.get_xlim()
    start = left if row.low is None else max(row.low, left)
    end = right if row.high is None else min(row.high, right)
    if start < end:
        axes.axvspan(start, end, facecolor=COLOURS["good"], alpha=0.16, linewidth=0, zorder=0.2, gid="limits")


def _draw_bar(axes: Axes, bar: _Bar, place: int, *, next_start: float) -> None:
    colour = COLOURS["open"] if bar.name == "others" else COLOURS["fitted"]
    axes.barh(
        place,
        bar.share,
        left=bar.start,
        height=0.62,
        facecolor=colour if bar.is_told else "white",
        edgecolor=colour,
        hatch=None if bar.is_told else HATCH,
        linewidth=1.2,
        zorder=2.5,
        gid=f"share {bar.name}",
    )
    if bar.stderr:
        axes.errorbar(
            [next_start],
            [place],
            xerr=[[2 * bar.stderr], [2 * bar.stderr]],
            fmt="none",
            ecolor=COLOURS["ink"],
            capsize=2.5,
            linewidth=1.2,
            zorder=3.5,
        )
    axes.plot([next_start] * 2, [place, place + 1], color="#888888", linewidth=0.8, zorder=2, gid="step")


def _write_values(axes: Axes, one: QuantityBlame, bars: list[_Bar]) -> None:
    """Values at the right: designed, every share with its error, estimated."""
    name = one.quantity.value
    shares = {part.name: part.share for part in one.contributions}
    words = [text_of(name, _bare(one.designed))]
    words += [share_text(name, shares[bar.name]) if bar.name in shares else _signed(name, bar.share) for bar in bars]
    words.append(text_of(name, _bare(one.estimated)))
    for place, text in enumerate(words):
        axes.text(
            1.015,
            place,
            text,
            transform=axes.get_yaxis_transform(),
            va="center",
            ha="left",
            size=SMALL_PT,
            weight="bold" if place in {0, len(words) - 1} else "normal",
        )


def _signed(quantity: str, share: float) -> str:
    return f"{'+' if share > 0 else ''}{si(share, unit_of(quantity), digits=2)}"


def _bare(value: float) -> Estimate:
    return Estimate(value=value, stderr=None, ci95=(None, None))


def _draw_legend(figure: Figure, *, top_in: float) -> None:
    blue = COLOURS["fitted"]
    entries: list[tuple[Line2D | Patch, str]] = [
        (Patch(facecolor=blue), "element told by the sweeps"),
        (Patch(facecolor="white", edgecolor=blue, hatch=HATCH), "value mostly the design's own"),
        (Line2D([], [], color=COLOURS["ink"], marker="|", markersize=7, linewidth=1.2), "± 2 σ of that bar alone"),
        (Patch(facecolor=COLOURS["good"], alpha=0.25), "inside the limits"),
    ]
    draw_legend_row(figure, entries, left_in=0.2, y_in=top_in - 0.13)
