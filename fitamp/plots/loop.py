"""The loop gain as measured, fitted and designed: magnitude, phase, roots along the frequency axis, residuals."""

from __future__ import annotations

from matplotlib.axes import Axes
from matplotlib.figure import Figure

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import frequency_axis
from fitamp.plots.header import figure_with_head
from fitamp.plots.lane import draw_lane, widened
from fitamp.plots.loop_legend import ROW_IN, draw_legend, reason_lines
from fitamp.plots.loop_marks import draw_crossover, draw_limits, draw_phase_margin
from fitamp.plots.loop_panels import curves_of, draw_magnitude, draw_phase, draw_residuals, drawable, shade_beyond
from fitamp.plots.roots import Mark, designed_marks, measured_marks
from fitamp.plots.style import WIDTH_IN, drawing_style, place_axes

__all__ = ["loop_figure"]

LEFT_IN, RIGHT_IN, BOTTOM_IN = 0.95, 0.25, 0.55
PANEL_IN = WIDTH_IN - LEFT_IN - RIGHT_IN
RESIDUALS_IN, MAGNITUDE_IN, PHASE_IN, LANE_ROW_IN = 1.1, 2.3, 2.1, 0.34
GAPS_IN = (0.32, 0.1, 0.1)  # above the residuals (their title), the lane, the phase
# Roots this far beyond the band are still shown in place; farther ones become arrows at the edge.
BEYOND_BAND = 5.0


def loop_figure(fit: LoopFit, comparison: Comparison | None = None) -> Figure:
    """Draw the loop gain over frequency.

    Panels from the top, over one range of frequency: magnitude (dB); phase (degrees, 0 for a positive gain at DC);
    where poles and zero lie, as distances; residuals in standard deviations.

    Parameters
    ----------
    fit
        Gives the sweep, the fitted curve and its residuals.
    comparison
        Adds the designed response with the bench's load and delay, the limits, and the verdict.
    """
    with drawing_style():
        measured = measured_marks(fit)
        designed = designed_marks(comparison.design) if comparison is not None else ()
        reasons = reason_lines(fit.sweep.left_out, PANEL_IN - 0.5)
        legend_in = ROW_IN * (1 + len(reasons)) + 0.05
        heights = (RESIDUALS_IN, LANE_ROW_IN * (2 if designed else 1), PHASE_IN, MAGNITUDE_IN)
        body_in = BOTTOM_IN + sum(heights) + sum(GAPS_IN) + legend_in
        figure = figure_with_head(fit, comparison, body_in=body_in)
        residuals, lane, phase, magnitude = _panels(figure, heights)
        low_hz, high_hz = _view(fit, measured, designed)
        for panel in (magnitude, phase, lane, residuals):
            frequency_axis(panel, low_hz, high_hz, labelled=panel is residuals)
        curves = curves_of(fit, comparison, low_hz, high_hz)
        draw_magnitude(magnitude, fit, curves)
        draw_phase(phase, fit, curves)
        for panel in (magnitude, phase):
            shade_beyond(panel, fit)
        draw_residuals(residuals, fit, PANEL_IN)
        draw_lane(lane, (magnitude, phase), measured, designed, comparison, width_in=PANEL_IN)
        draw_crossover(magnitude, phase, fit, PANEL_IN)
        draw_phase_margin(phase, fit)
        if comparison is not None:
            draw_limits(magnitude, phase, comparison, fit)
        draw_legend(figure, comparison, reasons, left_in=LEFT_IN, top_in=body_in)
    return figure


def _panels(figure: Figure, heights: tuple[float, ...]) -> list[Axes]:
    panels: list[Axes] = []
    bottom = BOTTOM_IN
    for height, gap in zip(heights, (*GAPS_IN, 0.0), strict=True):
        panels.append(place_axes(figure, left=LEFT_IN, bottom=bottom, width=PANEL_IN, height=height))
        bottom += height + gap
    return panels


def _view(fit: LoopFit, measured: tuple[Mark, ...], designed: tuple[Mark, ...]) -> tuple[float, float]:
    """The band with the points left out, widened to roots just outside it and to their names."""
    low, high = fit.sweep.f_min_hz, fit.sweep.f_max_hz
    seen = [low, high, *(point.f_hz for point in drawable(fit.sweep.left_out))]
    distances = [abs(mark.value_hz) for mark in (*measured, *designed) if mark.value_hz is not None]
    seen += [distance for distance in distances if low / BEYOND_BAND <= distance <= high * BEYOND_BAND]
    low, high = min(seen) / 1.25, max(seen) * 1.25
    return low, widened((measured, designed), low, high, PANEL_IN)
