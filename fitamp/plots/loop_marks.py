"""What is marked on the loop-gain picture: crossover, phase margin and limits."""

from __future__ import annotations

from matplotlib.axes import Axes

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.fitting.result import text_of
from fitamp.plots.style import COLOURS, SMALL_PT

__all__ = ["draw_crossover", "draw_limits", "draw_phase_margin"]

HALO = {"boxstyle": "square,pad=0.15", "facecolor": "white", "edgecolor": "none", "alpha": 0.85}


def draw_crossover(magnitude: Axes, phase: Axes, fit: LoopFit) -> None:
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
    align, offset = _beside(magnitude, crossover.value)
    magnitude.annotate(
        words,
        xy=(crossover.value, 1),
        xycoords=magnitude.get_xaxis_transform(),
        xytext=(offset, -6),
        textcoords="offset points",
        ha=align,
        va="top",
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
    align, offset = _beside(phase, crossover.value)
    phase.annotate(
        words,
        xy=(crossover.value, -180 + 0.45 * margin.value),
        xytext=(offset, 0),
        textcoords="offset points",
        ha=align,
        va="center",
        size=SMALL_PT,
        bbox=HALO,
    )


def _beside(axes: Axes, freq_hz: float) -> tuple[str, int]:
    """Alignment and offset in points of words beside a frequency: on the side with more room."""
    low, high = axes.get_xlim()
    return ("right", -8) if freq_hz**2 > low * high else ("left", 8)


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
