"""The head of a picture: verdict, reason and what to do in words, or the file's name where nothing was compared."""

from __future__ import annotations

from dataclasses import dataclass

from matplotlib.figure import Figure

from fitamp.comparison import Comparison, Nulling
from fitamp.fitting import LoopFit
from fitamp.plots.style import (
    COLOURS,
    SIZE_PT,
    SMALL_PT,
    WIDTH_IN,
    inert,
    new_figure,
    shortened,
    text_width_in,
    wrapped,
)
from fitamp.report.tables import zero_sentence

__all__ = ["VERDICT_COLOURS", "figure_with_head"]

MARGIN_IN = 0.2
LINE_IN = 0.18
TITLE_IN = 0.36
TITLE_PT = 13.0

VERDICT_COLOURS = {
    Nulling.AS_DESIGNED: COLOURS["good"],
    Nulling.TOO_LITTLE: COLOURS["off"],
    Nulling.TOO_MUCH: COLOURS["off"],
    Nulling.WRONG_SIDE: COLOURS["bad"],
    Nulling.AT_INFINITY: COLOURS["gone"],
    Nulling.UNDECIDED: COLOURS["open"],
}


@dataclass(frozen=True, slots=True, kw_only=True)
class _Line:
    text: str
    weight: str = "normal"


def figure_with_head(fit: LoopFit, comparison: Comparison | None, *, body_in: float) -> Figure:
    """A figure whose lower `body_in` inches are free, under a head as tall as its words need."""
    title, colour, aside, lines = _words(fit, comparison)
    head_in = 0.1 + TITLE_IN + LINE_IN * len(lines) + 0.08
    figure = new_figure(body_in + head_in)
    top = body_in + head_in - 0.1 - TITLE_IN / 2
    total = body_in + head_in
    frame = None
    if colour is not None:
        frame = {"boxstyle": "square,pad=0.3", "facecolor": "white", "edgecolor": colour, "linewidth": 2.5}
    figure.text(
        (MARGIN_IN + (0.08 if frame else 0)) / WIDTH_IN,
        top / total,
        title,
        size=TITLE_PT,
        weight="bold",
        va="center",
        bbox=frame,
    )
    if aside:
        figure.text(1 - MARGIN_IN / WIDTH_IN, top / total, aside, size=SMALL_PT, va="center", ha="right")
    y = top - TITLE_IN / 2 - LINE_IN / 2
    for line in lines:
        figure.text(MARGIN_IN / WIDTH_IN, y / total, line.text, size=SIZE_PT, weight=line.weight, va="center")
        y -= LINE_IN
    return figure


def _words(fit: LoopFit, comparison: Comparison | None) -> tuple[str, str | None, str, list[_Line]]:
    """Title, its frame's colour, what stands beside it, and the lines below."""
    width = WIDTH_IN - 2 * MARGIN_IN
    file = inert(fit.sweep.origin.file)
    if comparison is None:
        title = shortened(file, width, TITLE_PT, "bold")
        return title, None, "", [_Line(text=text) for text in wrapped(_sentence(zero_sentence(fit), "Zero: "), width)]
    verdict = comparison.verdict
    title = verdict.nulling.value.upper()
    room = width - text_width_in(title, TITLE_PT, "bold") - 0.5
    against = " against "
    half = (room - text_width_in(against)) / 2
    aside = shortened(file, half) + against + shortened(inert(comparison.design.file), half)
    lines = [_Line(text=text) for text in wrapped(inert(_sentence(verdict.reason)), width)]
    advice = inert(f"What to do: {comparison.advice.sentence}")
    lines += [_Line(text=text, weight="bold") for text in wrapped(advice, width, weight="bold")]
    return title, VERDICT_COLOURS[verdict.nulling], aside, lines


def _sentence(text: str, lead: str = "") -> str:
    text = lead + text
    return text[:1].upper() + text[1:] + ("" if text.endswith(".") else ".")
