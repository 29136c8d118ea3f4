"""The loop gain as measured, fitted and designed: magnitude, phase, roots along the frequency axis, residuals."""

from __future__ import annotations

from matplotlib.axes import Axes
from matplotlib.figure import Figure

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.axes import frequency_axis
from fitamp.plots.further import further_marks
from fitamp.plots.header import figure_with_head
from fitamp.plots.lane import draw_lane, lane_rows
from fitamp.plots.loop_legend import NOTE_LINE_IN, ROW_IN, draw_legend, draw_notes, note_lines, reason_lines
from fitamp.plots.loop_marks import draw_crossover, draw_limits, draw_phase_margin, limit_phases_deg
from fitamp.plots.loop_panels import curves_of, draw_magnitude, draw_phase, drawable, shade_beyond
from fitamp.plots.loop_residuals import draw_residuals, residual_title, title_room_in
from fitamp.plots.loop_steps import draw_range_steps, name_range_steps
from fitamp.plots.roots import Mark, designed_marks, measured_marks
from fitamp.plots.style import WIDTH_IN, drawing_style, place_axes

__all__ = ["loop_figure"]

LEFT_IN, RIGHT_IN, BOTTOM_IN = 0.95, 0.35, 0.55
PANEL_IN = WIDTH_IN - LEFT_IN - RIGHT_IN
NOTES_IN = WIDTH_IN - LEFT_IN - 0.2
RESIDUALS_IN, MAGNITUDE_IN, PHASE_IN = 1.1, 2.3, 2.1
GAP_IN = 0.1
# The picture goes this far below and above the sweep, and up to ten times beyond where that shows a root in place;
# roots farther out become arrows at the edge.
BELOW, ABOVE, ROOTS_BEYOND = 1.25, 2.2, 10.0


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
        measured = measured_marks(fit, comparison)
        designed = designed_marks(comparison.design) if comparison is not None else ()
        low_hz, high_hz = _view(fit, measured, designed)
        rows = lane_rows(measured, designed, low_hz, high_hz, PANEL_IN, further=further_marks(fit))
        reasons = reason_lines(fit.sweep.left_out, PANEL_IN - 0.5)
        title = residual_title(fit, PANEL_IN)
        notes = note_lines(fit, comparison, NOTES_IN)
        notes_in = NOTE_LINE_IN * len(notes) + (0.05 if notes else 0.0)
        heights = (RESIDUALS_IN, sum(row.height_in for row in rows), PHASE_IN, MAGNITUDE_IN)
        gaps = (title_room_in(fit, title), GAP_IN, GAP_IN)
        body_in = notes_in + BOTTOM_IN + sum(heights) + sum(gaps) + ROW_IN * (2 + len(reasons)) + 0.05
        figure = figure_with_head(fit, comparison, body_in=body_in)
        panels = _panels(figure, heights, gaps, notes_in + BOTTOM_IN)
        for panel in panels:
            frequency_axis(panel, low_hz, high_hz, labelled=panel is panels[0])
        draw_lane(panels[1], (panels[3], panels[2]), rows, comparison, width_in=PANEL_IN)
        _draw_panels(panels, fit, comparison)
        draw_residuals(panels[0], fit, title)
        draw_legend(figure, fit, comparison, reasons, left_in=LEFT_IN, top_in=body_in)
        draw_notes(figure, notes, left_in=LEFT_IN, top_in=notes_in + 0.03)
    return figure


def _panels(figure: Figure, heights: tuple[float, ...], gaps: tuple[float, ...], bottom_in: float) -> list[Axes]:
    panels: list[Axes] = []
    bottom = bottom_in
    for height, gap in zip(heights, (*gaps, 0.0), strict=True):
        panels.append(place_axes(figure, left=LEFT_IN, bottom=bottom, width=PANEL_IN, height=height))
        bottom += height + gap
    return panels


def _draw_panels(panels: list[Axes], fit: LoopFit, comparison: Comparison | None) -> None:
    """Magnitude and phase with their curves, then the words where nothing is drawn."""
    low_hz, high_hz = panels[3].get_xlim()
    curves = curves_of(fit, comparison, low_hz, high_hz)
    magnitude = draw_magnitude(panels[3], fit, curves)
    phase = draw_phase(panels[2], fit, curves, limit_phases_deg(comparison))
    for panel in (panels[3], panels[2]):
        shade_beyond(panel, fit)
    if comparison is not None:
        draw_limits(magnitude, phase, comparison, fit)
    draw_range_steps(fit, magnitude, phase, panels[0])
    draw_crossover(fit, magnitude, phase)
    draw_phase_margin(fit, phase)
    name_range_steps(fit, magnitude)


def _view(fit: LoopFit, measured: tuple[Mark, ...], designed: tuple[Mark, ...]) -> tuple[float, float]:
    """The band with the points left out, a little more, and roots within a decade of it."""
    low, high = fit.sweep.f_min_hz, fit.sweep.f_max_hz
    seen = [low / BELOW, high * ABOVE, *(point.f_hz for point in drawable(fit.sweep.left_out))]
    distances = [
        abs(mark.value_hz) for mark in (*measured, *designed) if mark.value_hz is not None and mark.name != "pole 3"
    ]
    near = [distance for distance in distances if low / ROOTS_BEYOND <= distance <= high * ROOTS_BEYOND]
    return min([*seen, *(0.8 * d for d in near)]), max([*seen, *(1.25 * d for d in near)])
