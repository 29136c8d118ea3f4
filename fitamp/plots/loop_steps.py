"""Steps of a receiver's range on the loop-gain picture: a line through the panels, with their size in words."""

from __future__ import annotations

from matplotlib.axes import Axes

from fitamp.fitting import LoopFit
from fitamp.fitting.result import FittedStep
from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.style import COLOURS
from fitamp.units import si

__all__ = ["draw_range_steps", "name_range_steps", "step_words"]

# A turn within so many standard errors of none is not worth a word.
TURNED_SIGMA = 2.0
DASHES = (0, (6, 2, 1, 2))
# So far words go to avoid the line.
COVER_IN = 0.5


def step_words(step: FittedStep) -> str:
    """Where and how large: "range step at 3.07 MHz: +0.174 dB, −1.20°"."""
    words = f"range step at {si(step.f_hz, 'Hz', digits=3)}: {step.size_db.value:+.3f} dB"
    turn_deg, stderr_deg = step.turn_deg.value or 0.0, step.turn_deg.stderr or 0.0
    if abs(turn_deg) > TURNED_SIGMA * stderr_deg:
        words += f", {turn_deg:+.2f}°"
    return words.replace("-", "−")


def draw_range_steps(fit: LoopFit, magnitude: Clutter, phase: Clutter, residuals: Axes) -> None:
    """Mark each step in the panels of magnitude, phase and residuals."""
    for step in fit.range_steps:
        for axes in (magnitude.axes, phase.axes, residuals):
            axes.axvline(step.f_hz, color=COLOURS["bad"], linestyle=DASHES, linewidth=1.2, zorder=1.5, gid="range step")
        for clutter in (magnitude, phase):
            clutter.add_line([step.f_hz] * 2, clutter.axes.get_ylim(), soft_in=COVER_IN)


def name_range_steps(fit: LoopFit, magnitude: Clutter) -> None:
    """Write each step's size beside its line in the panel of the magnitude, left below the falling curve."""
    for step in fit.range_steps:
        words_at(magnitude, step_words(step), (step.f_hz, magnitude.axes.get_ylim()[0]), gid="range step words")
