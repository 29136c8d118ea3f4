"""What is marked on the loop-gain picture: crossover, phase margin and limits."""

from __future__ import annotations

import math

from matplotlib.axes import Axes

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.fitting.result import text_of
from fitamp.plots.style import COLOURS, SMALL_PT, text_width_in

__all__ = ["NARROW_DEG", "draw_crossover", "draw_limits", "draw_phase_margin"]

# Below this phase margin its arrow is too short to write beside.
NARROW_DEG = 30.0
HALO = {"boxstyle": "square,pad=0.15", "facecolor": "white", "edgecolor": "none", "alpha": 0.85}


def draw_crossover(magnitude: Axes, phase: Axes, fit: LoopFit, width_in: float) -> None:
    """A vertical line where the fitted magnitude is 0 dB, with its frequency; words alone where that is out of view."""
    crossover = fit.margins.crossover_hz
    if crossover.value is None:
        return
    words = f"crossover {text_of('crossover_hz', crossover)}"
    low, high = magnitude.get_xlim()
    if not low < crossover.value < high:
        beyond = "above" if crossover.value >= high else "below"
        magnitude.text(
            0.99,
            0.96,
            f"{words}, {beyond} this range",
            transform=magnitude.transAxes,
            ha="right",
            va="top",
            size=SMALL_PT,
            bbox=HALO,
        )
        return
    for axes in (magnitude, phase):
        axes.axvline(crossover.value, color=COLOURS["ink"], linestyle=":", linewidth=1.2, gid="crossover")
    at_right = (1 - _share(magnitude, crossover.value)) * width_in > text_width_in(words) + 0.2
    # Right of the crossover the curve is below 0 dB and left of it above, so one corner is free.
    bottom, top = magnitude.get_ylim()
    at_top = at_right or -bottom < 0.15 * (top - bottom)
    magnitude.annotate(
        words,
        xy=(crossover.value, 1 if at_top else 0),
        xycoords=magnitude.get_xaxis_transform(),
        xytext=(8 if at_right else -8, -6 if at_top else 6),
        textcoords="offset points",
        ha="left" if at_right else "right",
        va="top" if at_top else "bottom",
        size=SMALL_PT,
        bbox=HALO,
    )


def draw_phase_margin(phase: Axes, fit: LoopFit) -> None:
    """A double arrow from −180° up to the phase at the crossover, with its value."""
    crossover, margin = fit.margins.crossover_hz, fit.margins.phase_margin_deg
    low, high = phase.get_xlim()
    if crossover.value is None or margin.value is None or not low < crossover.value < high:
        return
    phase.annotate(
        "",
        xy=(crossover.value, -180 + margin.value),
        xytext=(crossover.value, -180),
        arrowprops={"arrowstyle": "<->", "color": COLOURS["ink"], "linewidth": 1.4, "shrinkA": 0, "shrinkB": 0},
        gid="phase margin",
    )
    words = f"phase margin {text_of('phase_margin_deg', margin)}"
    if fit.parameters.delay_s.value:  # the curve has the bench's delay, the margin does not
        words += ", without the path delay"
    # Beside the arrow where that is long enough; else clear of the curve, which falls through −180° here.
    place: tuple[float, int, str]
    if margin.value > NARROW_DEG:
        place = (-180 + 0.45 * margin.value, 0, "center")
    elif margin.value > 0:
        place = (-180.0, -5, "top")
    else:
        place = (-180.0, 5, "bottom")
    on_right = margin.value < 0 or _share(phase, crossover.value) < 0.5
    phase.annotate(
        words,
        xy=(crossover.value, place[0]),
        xytext=(8 if on_right else -8, place[1]),
        textcoords="offset points",
        ha="left" if on_right else "right",
        va=place[2],
        size=SMALL_PT,
        bbox=HALO,
    )


def _share(axes: Axes, freq_hz: float) -> float:
    """Where a frequency stands along the axis, from 0 to 1."""
    low, high = axes.get_xlim()
    return math.log(freq_hz / low) / math.log(high / low)


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
