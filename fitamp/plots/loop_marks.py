"""What is marked on the loop-gain picture: crossover, phase margin and limits."""

from __future__ import annotations

from typing import Any

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.fitting.result import text_of
from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.style import COLOURS, SMALL_PT

__all__ = ["draw_crossover", "draw_limits", "draw_phase_margin", "limit_phases_deg"]

# A shorter arrow has its heads outside, as in a drawing of a small dimension.
SHORT_IN, TAIL_IN = 0.32, 0.22
LIMIT_PT = 9.0


def draw_crossover(fit: LoopFit, magnitude: Clutter, phase: Clutter) -> None:
    """A vertical line where the fitted magnitude is 0 dB, with its frequency; words alone where that is out of view."""
    crossover = fit.margins.crossover_hz
    if crossover.value is None:
        return
    words = f"crossover {text_of('crossover_hz', crossover)}"
    low, high = magnitude.axes.get_xlim()
    if not low < crossover.value < high:
        is_above = crossover.value >= high
        words += f", {'above' if is_above else 'below'} this range"
        words_at(magnitude, words, (high if is_above else low, magnitude.axes.get_ylim()[1]))
        return
    for clutter in (magnitude, phase):
        axes = clutter.axes
        axes.axvline(crossover.value, color=COLOURS["ink"], linestyle=":", linewidth=1.2, gid="crossover")
        clutter.add_line([crossover.value] * 2, axes.get_ylim())
    # Right of the crossover the curve is below 0 dB: the upper end of the line is nearest to free room.
    words_at(magnitude, words, (crossover.value, magnitude.axes.get_ylim()[1]), gid="crossover words", leader=False)


def draw_phase_margin(fit: LoopFit, phase: Clutter) -> None:
    """A double arrow from −180° up to the phase at the crossover, with its value."""
    axes = phase.axes
    crossover, margin = fit.margins.crossover_hz, fit.margins.phase_margin_deg
    low, high = axes.get_xlim()
    if crossover.value is None or margin.value is None or not low < crossover.value < high:
        return
    ends = (-180.0, -180 + margin.value)
    length_in = abs(margin.value) / abs(axes.get_ylim()[1] - axes.get_ylim()[0]) * phase.size_in[1]
    style: dict[str, Any] = {"color": COLOURS["ink"], "linewidth": 1.4, "shrinkA": 0, "shrinkB": 0}
    if length_in >= SHORT_IN:
        axes.annotate(
            "",
            xy=(crossover.value, ends[1]),
            xytext=(crossover.value, ends[0]),
            arrowprops={"arrowstyle": "<->", **style},
            gid="phase margin",
        )
    else:
        for end, side in ((min(ends), -1), (max(ends), 1)):
            axes.annotate(
                "",
                xy=(crossover.value, end),
                xytext=(0, side * TAIL_IN * 72),
                textcoords="offset points",
                arrowprops={"arrowstyle": "->", **style},
                gid="phase margin",
            )
    words = f"phase margin {text_of('phase_margin_deg', margin)}"
    if fit.parameters.delay_s.value:  # the curve has the bench's delay, the margin does not
        words += ", without the path delay"
    words_at(phase, words, (crossover.value, sum(ends) / 2), size_pt=SMALL_PT, gid="phase margin words")


def limit_phases_deg(comparison: Comparison | None) -> tuple[float, ...]:
    """Phases that the limits on the margin allow at the crossover, where they are stated."""
    limit = comparison.design.limits.get("phase_margin_deg") if comparison is not None else None
    if limit is None:
        return ()
    return tuple(end - 180 for end in (limit.low, limit.high) if end is not None and 0 <= end <= 180)


def draw_limits(magnitude: Clutter, phase: Clutter, comparison: Comparison, fit: LoopFit) -> None:
    """Where the crossover and the phase at it may lie."""
    limits = comparison.design.limits
    style: dict[str, Any] = {
        "color": COLOURS["good"],
        "alpha": 0.35,
        "linewidth": LIMIT_PT,
        "solid_capstyle": "butt",
        "gid": "limit",
    }
    crossover = limits.get("crossover_hz")
    if crossover is not None:
        low = 1e-30 if crossover.low is None else crossover.low
        high = 1e30 if crossover.high is None else crossover.high
        magnitude.axes.plot([low, high], [0, 0], **style)
        start, end = magnitude.axes.get_xlim()
        magnitude.add_line([max(low, start), min(high, end)], [0, 0])
    margin = limits.get("phase_margin_deg")
    at = fit.margins.crossover_hz.value
    if margin is not None and at is not None:
        low = -180 if margin.low is None else margin.low - 180
        high = 0 if margin.high is None else margin.high - 180
        phase.axes.plot([at, at], [low, high], **style)
