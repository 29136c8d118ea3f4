"""How surely each element will be known after each sweep of a plan, on a logarithmic scale."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

from fitamp.planning import Expected, Plan, Stage
from fitamp.plots.style import (
    COLOURS,
    SIZE_PT,
    SMALL_PT,
    WIDTH_IN,
    drawing_style,
    inert,
    new_figure,
    place_axes,
    wrapped,
)
from fitamp.report.plan_words import label_of, name_of, precision, summary, verdict_sentence

__all__ = ["plan_figure"]

MARGIN_IN, LEFT_IN, RIGHT_IN, HEIGHT_IN = 0.2, 0.85, 1.95, 4.3
LINE_IN = 0.19
# Below the axes: the axis label, and each line of the names of the sweeps.
BELOW_IN, TICK_LINE_IN = 0.45, 0.16
# With fewer decades than this, ticks stand at 2 and 5 as well.
FEW_DECADES = 2.0
LABEL_SPACING_IN = 0.2
# Share of the lines' height that is left free above them.
ROOM = 0.06
# Elements of one kind share a colour; line and mark tell them apart, and the name stands at the end of each line.
_LOOKS = {
    "gm1": ("fitted", "-", "o"),
    "gm2": ("fitted", "--", "s"),
    "R1": ("left out", "-", "o"),
    "R2": ("left out", "--", "s"),
    "Rz": ("left out", "-.", "D"),
    "C1": ("good", "-", "o"),
    "CL": ("good", "--", "s"),
    "Cc": ("good", "-.", "D"),
    "Cgd": ("good", ":", "^"),
    "mirror_pole_hz": ("ink", ":", "^"),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class _Line:
    """One element: shares of its value (None where there is none yet) before and after each sweep."""

    last: Expected
    shares: tuple[float | None, ...]
    wanted: float | None

    @property
    def end(self) -> float | None:
        """The share after the last sweep."""
        return self.shares[-1]


def plan_figure(plan: Plan) -> Figure:
    """Draw the relative standard deviation of every element against the number of sweeps.

    At 0 stands what the design's spreads say (or the sweeps already taken), hollow; an element without prior begins
    with the first sweep. An Rz that is designed 0 is drawn as a share of 1/gm2. What is wanted is a star.
    """
    lines = _lines(plan)
    with drawing_style():
        head = [inert(line) for line in wrapped(_sentence(summary(plan)), WIDTH_IN - 2 * MARGIN_IN, weight="bold")]
        below = [inert(line) for line in wrapped(f"Verdict: {verdict_sentence(plan)}.", WIDTH_IN - 2 * MARGIN_IN)]
        head_in = 0.15 + LINE_IN * (len(head) + len(below)) + 0.2
        names = _names(plan)
        bottom = BELOW_IN + TICK_LINE_IN * max(1 + name.count("\n") for name in names)
        figure = new_figure(bottom + HEIGHT_IN + head_in)
        _write_head(figure, head, below)
        width = WIDTH_IN - LEFT_IN - RIGHT_IN
        axes = place_axes(figure, left=LEFT_IN, bottom=bottom, width=width, height=HEIGHT_IN)
        _set_scales(axes, names, lines)
        for line in lines:
            _draw(axes, line)
        _name_lines(axes, lines, len(plan.sweeps))
        _explain(axes, plan, lines)
    return figure


def _lines(plan: Plan) -> list[_Line]:
    gm2 = plan.last.of("gm2").value or 1.0
    wanted = dict(plan.wanted)
    found = []
    for index, last in enumerate(plan.last.elements):
        if not last.sd and last.sd is not None:
            continue  # held as designed: nothing to be found
        # An Rz of 0 has no share; 1/gm2 is what it would have to be to matter.
        unit = abs(last.value) if last.value else 1 / gm2
        stages = [plan.stages[0].elements[index].before, *(_sd(stage, index) for stage in plan.stages[1:])]
        shares = tuple(None if sd is None else sd / unit for sd in stages)
        wish = wanted.get(last.name)
        found.append(_Line(last=last, shares=shares, wanted=None if wish is None else wish / unit))
    return found


def _sd(stage: Stage, index: int) -> float | None:
    return stage.elements[index].sd


def _write_head(figure: Figure, head: Sequence[str], below: Sequence[str]) -> None:
    height = figure.get_figheight()
    y = height - 0.15
    for text, weight in [*((line, "bold") for line in head), *((line, "normal") for line in below)]:
        figure.text(
            MARGIN_IN / WIDTH_IN, (y - LINE_IN / 2) / height, text, size=SIZE_PT, weight=weight, va="center", gid="head"
        )
        y -= LINE_IN


def _set_scales(axes: Axes, names: Sequence[str], lines: Sequence[_Line]) -> None:
    shown = [share for line in lines for share in (*line.shares, line.wanted) if share]
    low, high = (min(shown), max(shown)) if shown else (0.01, 0.1)
    axes.set_yscale("log")
    axes.set_ylim(low / 1.6, high * 1.6 * (high / low) ** ROOM)
    few = math.log10(high / low) < FEW_DECADES
    axes.yaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0) if few else (1.0,)))
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{100 * value:.6g} %"))
    axes.yaxis.set_minor_formatter(NullFormatter())
    axes.set_ylabel("standard deviation, share of the value")
    axes.grid(visible=True, which="major", axis="y")
    axes.set_xlim(-0.35, len(names) - 0.75)
    axes.set_xticks(range(len(names)), names)
    axes.set_xlabel("sweeps, one after another, and what is added for each")
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _names(plan: Plan) -> list[str]:
    """What stands below each place along the axis."""
    first = f"{plan.taken} taken\nso far" if plan.taken else "design\nalone"
    numbered = enumerate(plan.sweeps, start=1)
    return [first, *(f"{number}\n{_broken(label_of(plan, sweep))}" for number, sweep in numbered)]


def _broken(words: str) -> str:
    """Each addition on a line of its own."""
    return words.replace(" added", "\nadded").replace(" with ", "\n").replace(", ", "\n").replace(" to ", "\nto ")


def _draw(axes: Axes, line: _Line) -> None:
    colour, style, marker = _LOOKS[line.last.name]
    points = [(number, share) for number, share in enumerate(line.shares) if share is not None]
    axes.plot(
        [number for number, _ in points],
        [share for _, share in points],
        linestyle=style,
        linewidth=1.6,
        color=COLOURS[colour],
        gid=f"line {line.last.name}",
        zorder=3,
    )
    for number, share in points:
        axes.plot(
            [number],
            [share],
            marker=marker,
            markersize=6,
            color=COLOURS[colour],
            markerfacecolor=COLOURS[colour] if number else "white",
            markeredgewidth=1.4,
            gid=f"{'point' if number else 'prior'} {line.last.name}",
            zorder=4,
        )
    if line.wanted is not None:
        axes.plot(
            [len(line.shares) - 1],
            [line.wanted],
            marker="*",
            markersize=13,
            color=COLOURS[colour],
            markerfacecolor="white",
            markeredgewidth=1.2,
            gid=f"wanted {line.last.name}",
            zorder=5,
        )


def _name_lines(axes: Axes, lines: Sequence[_Line], count: int) -> None:
    """Name and final error at the end of each line, moved apart where they are close."""
    low, high = (math.log10(end) for end in axes.get_ylim())
    named = sorted((line for line in lines if line.end is not None), key=lambda line: line.end or 0.0)
    spacing = LABEL_SPACING_IN / HEIGHT_IN * (high - low)
    wanted = [math.log10(line.end or 1.0) for line in named]
    for line, own, y in zip(named, wanted, _apart(wanted, spacing, low, high), strict=True):
        words = f"{name_of(line.last)}  {precision(line.last, line.last.sd)}"
        if line.wanted is not None:
            words += f" (★ {precision(line.last, line.wanted / (line.end or 1.0) * (line.last.sd or 0.0))})"
        axes.annotate(
            words,
            xy=(count, 10**own),
            xytext=(count + 0.25, 10**y),
            annotation_clip=False,
            va="center",
            size=SMALL_PT,
            weight="bold",
            color=COLOURS[_LOOKS[line.last.name][0]],
            arrowprops={
                "arrowstyle": "-",
                "linewidth": 0.7,
                "color": "#999999",
                "shrinkA": 1,
                "shrinkB": 5,
                "relpos": (0, 0.5),
            },
            gid="name",
        )


def _explain(axes: Axes, plan: Plan, lines: Sequence[_Line]) -> None:
    """What is hollow and what a star is, where the lines leave room: in the upper right corner."""
    without = [name_of(line.last) for line in lines if line.shares[0] is None]
    words = "hollow: known from the sweeps taken" if plan.taken else "hollow: known by the design's spreads"
    words += f"; {', '.join(without)}: nothing, under test" if without else ""
    words += "; ★ wanted" if any(line.wanted for line in lines) else ""
    axes.text(0.99, 0.99, words, transform=axes.transAxes, ha="right", va="top", size=SMALL_PT, gid="key")


def _apart(wanted: Sequence[float], spacing: float, low: float, high: float) -> list[float]:
    """Rising positions at least `spacing` apart, near the wanted ones, inside the axes where there is room."""
    placed: list[float] = []
    for value in wanted:
        placed.append(max(value, placed[-1] + spacing if placed else low))
    ceiling = high
    for index in range(len(placed) - 1, -1, -1):
        placed[index] = min(placed[index], ceiling)
        ceiling = placed[index] - spacing
    return placed


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}."
