"""The head of a picture: verdict, reason and what to do in words, or the file's name where nothing was compared.

What a verdict alone would hide is framed beside it: a limit that is broken, a model that does not fit.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from matplotlib.figure import Figure

from fitamp.comparison import Comparison, Nulling
from fitamp.fitting import LoopFit
from fitamp.fitting.result import LABELS
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

__all__ = ["VERDICT_COLOURS", "figure_with_head", "figure_with_verdict"]

MARGIN_IN = 0.2
HEAD_IN = WIDTH_IN - 2 * MARGIN_IN
LINE_IN = 0.18
TITLE_IN = 0.36
TITLE_PT, TAG_PT = 13.0, 10.0
PADDING = 0.3  # of a frame, in letter sizes
TAG_GAP_IN = 0.16
# With less room than this beside the tags, the names of the files get a line of their own.
NAMES_IN = 3.2

VERDICT_COLOURS = {
    Nulling.AS_DESIGNED: COLOURS["good"],
    Nulling.TOO_LITTLE: COLOURS["off"],
    Nulling.TOO_MUCH: COLOURS["off"],
    Nulling.WRONG_SIDE: COLOURS["bad"],
    Nulling.AT_INFINITY: COLOURS["gone"],
    Nulling.UNDECIDED: COLOURS["open"],
}


@dataclass(frozen=True, slots=True, kw_only=True)
class _Text:
    """One line of the head, or a framed tag where there is a frame colour."""

    text: str
    size_pt: float = SIZE_PT
    weight: str = "normal"
    frame: str | None = None

    @property
    def width_in(self) -> float:
        """Width, with the frame's padding."""
        return text_width_in(self.text, self.size_pt, self.weight) + 2 * PADDING * self.size_pt / 72

    @property
    def height_in(self) -> float:
        """Height of the line."""
        return TITLE_IN if self.frame or self.size_pt == TITLE_PT else LINE_IN


def figure_with_head(fit: LoopFit, comparison: Comparison | None, *, body_in: float) -> Figure:
    """A figure whose lower `body_in` inches are free, under a head as tall as its words need."""
    file = inert(fit.sweep.origin.file)
    is_described = fit.adequacy.adequate if comparison is None else comparison.is_described
    warnings = [] if is_described else ["MODEL DOES NOT FIT"]
    if comparison is not None:
        return figure_with_verdict(
            comparison.verdict.nulling,
            warnings,
            broken=comparison.broken_limits,
            names=(file, comparison.design.file),
            reason=comparison.verdict.reason,
            advice=comparison.advice.sentence,
            body_in=body_in,
        )
    title = _Text(text=shortened(file, HEAD_IN, TITLE_PT, "bold"), size_pt=TITLE_PT, weight="bold")
    tags = _flowed([_warning(words) for words in warnings])
    sentence = _sentence(zero_sentence(fit), "Zero: ")
    return _figure([[title], *tags, *([_Text(text=line)] for line in wrapped(sentence, HEAD_IN))], "", body_in)


def figure_with_verdict(
    nulling: Nulling,
    warnings: Sequence[str],
    *,
    broken: Sequence[str],
    names: tuple[str, str],
    reason: str,
    advice: str,
    body_in: float,
) -> Figure:
    """The same for a verdict, with what stands framed beside it, what was held against what, and two sentences."""
    tags = [_Text(text=nulling.value.upper(), size_pt=TITLE_PT, weight="bold", frame=VERDICT_COLOURS[nulling])]
    if broken:
        words = f"LIMIT{'S' if len(broken) > 1 else ''} BROKEN: {', '.join(LABELS[name] for name in broken)}"
        tags += [_warning(line) for line in wrapped(words, HEAD_IN - 0.2, TAG_PT, "bold")]
    rows = _flowed([*tags, *map(_warning, warnings)])
    measured, design = (inert(name) for name in names)
    room = HEAD_IN - sum(tag.width_in + TAG_GAP_IN for tag in rows[0])
    is_beside = room >= min(NAMES_IN, text_width_in(f"{measured} against {design}"))
    aside = _against(measured, design, room if is_beside else HEAD_IN)
    if not is_beside:
        rows.append([_Text(text=aside, size_pt=SMALL_PT)])
    rows += [[_Text(text=line)] for line in wrapped(inert(_sentence(reason)), HEAD_IN)]
    advised = wrapped(inert(f"What to do: {advice}"), HEAD_IN, weight="bold")
    rows += [[_Text(text=line, weight="bold")] for line in advised]
    return _figure(rows, aside if is_beside else "", body_in)


def _figure(rows: list[list[_Text]], aside: str, body_in: float) -> Figure:
    """Rows of the head from the top, and what stands at the right of the first one."""
    head_in = 0.1 + sum(row[0].height_in for row in rows) + 0.08
    figure = new_figure(body_in + head_in)
    top = body_in + head_in - 0.1
    for row in rows:
        y = (top - row[0].height_in / 2) / (body_in + head_in)
        top -= row[0].height_in
        x = MARGIN_IN
        for text in row:
            padding = PADDING * text.size_pt / 72 if text.frame else 0.0
            box = {"boxstyle": f"square,pad={PADDING}", "facecolor": "white", "edgecolor": text.frame, "linewidth": 2.5}
            figure.text(
                (x + padding) / WIDTH_IN,
                y,
                text.text,
                size=text.size_pt,
                weight=text.weight,
                va="center",
                bbox=box if text.frame else None,
            )
            x += text.width_in + TAG_GAP_IN
        if aside and row is rows[0]:
            figure.text(1 - MARGIN_IN / WIDTH_IN, y, aside, size=SMALL_PT, va="center", ha="right")
    return figure


def _warning(words: str) -> _Text:
    return _Text(text=words, size_pt=TAG_PT, weight="bold", frame=COLOURS["bad"])


def _flowed(tags: list[_Text]) -> list[list[_Text]]:
    """Tags in as many rows as they need."""
    rows: list[list[_Text]] = []
    for tag in tags:
        if rows and sum(other.width_in + TAG_GAP_IN for other in rows[-1]) + tag.width_in <= HEAD_IN:
            rows[-1].append(tag)
        else:
            rows.append([tag])
    return rows


def _against(file: str, design: str, width_in: float) -> str:
    """Both names, shortened alike where they are too long."""
    against = " against "
    half = (width_in - text_width_in(against)) / 2
    return shortened(file, half) + against + shortened(design, half)


def _sentence(text: str, lead: str = "") -> str:
    text = lead + text
    return text[:1].upper() + text[1:] + ("" if text.endswith(".") else ".")
