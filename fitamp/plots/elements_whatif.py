"""What the estimated part would do with another load or resistor: phase margin, overshoot, settling, with bands."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator

from fitamp.arrays import FloatArray
from fitamp.comparison.result import Nulling
from fitamp.elements import Band, Prediction
from fitamp.findings import ElementFindings
from fitamp.fitting.result import LABELS
from fitamp.plots.elements_head import figure_with_message
from fitamp.plots.elements_legend import draw_legend_row
from fitamp.plots.elements_units import in_multiples
from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.style import COLOURS, drawing_style, place_axes
from fitamp.report.elements_words import load_sentence, resistor_sentence
from fitamp.units import si

__all__ = ["whatif_figure"]

LEFT_IN, WIDTH_AXES_IN, APART_IN = 0.85, 3.6, 0.85
LABEL_IN = 0.6
BOTTOM_IN, SMALL_IN, GAP_IN, TALL_IN, TOP_IN = 0.6, 1.05, 0.12, 2.6, 0.42
DISC_IN = 0.12
KEPT_ALPHA = 0.16
LABELS_X = ("whole load at the output", "nulling resistor Rz")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Column:
    """One thing that is varied, and the stretch of it that keeps the wanted margin; an open end is infinite."""

    prediction: Prediction
    kept: tuple[float, float] | None
    restoring: float | None


def whatif_figure(findings: ElementFindings) -> Figure | None:
    """Draw two columns of three panels; None where no curves were asked for."""
    columns = _columns(findings)
    if not columns:
        return None
    body_in = BOTTOM_IN + 2 * (SMALL_IN + GAP_IN) + TALL_IN + TOP_IN
    message = f"{load_sentence(findings)}; {resistor_sentence(findings)}"
    with drawing_style():
        figure = figure_with_message(findings, message, body_in=body_in)
        _draw_legend(figure, findings, top_in=body_in)
        for number, column in enumerate(columns):
            left_in = LEFT_IN + number * (WIDTH_AXES_IN + APART_IN)
            panels = _panels(figure, left_in)
            _draw_margin(panels[0], column, findings.wanted_deg)
            _draw_curve(panels[1], column, _scaled(column.prediction.overshoot, 100.0), "%", LABELS["overshoot"])
            _draw_curve(panels[2], column, column.prediction.settling_s, "s", "settling")
            in_multiples(panels[2].xaxis, column.prediction.against.unit, LABELS_X[number])
            _write_places(panels[0], column, findings.wanted_deg)
    return figure


def _columns(findings: ElementFindings) -> list[_Column]:
    if findings.over_load is None or findings.over_resistor is None:
        return []
    loads, resistors = findings.loads, findings.resistors
    kept_loads, kept_resistors = None, None
    if loads is not None and (loads.keeps or loads.low_f is not None or loads.high_f is not None):
        low, high = (None if end is None else end.value for end in (loads.low_f, loads.high_f))
        kept_loads = (-np.inf if low is None else low, np.inf if high is None else high)
    if resistors is not None and resistors.keeps:
        low, high = resistors.low_ohm, resistors.high_ohm
        kept_resistors = (-np.inf if low is None else low, np.inf if high is None else high)
    # Nothing is to be restored where the zero is in its place, or may be.
    is_moved = findings.verdict.nulling not in {Nulling.AS_DESIGNED, Nulling.UNDECIDED}
    restoring = findings.restoring.rz_ohm.value if is_moved else None
    return [
        _Column(prediction=findings.over_load, kept=kept_loads, restoring=None),
        _Column(prediction=findings.over_resistor, kept=kept_resistors, restoring=restoring),
    ]


def _panels(figure: Figure, left_in: float) -> list[Axes]:
    """Phase margin, overshoot and settling from the top."""
    panels = []
    bottom_in = BOTTOM_IN
    for height_in in (SMALL_IN, SMALL_IN, TALL_IN):
        panels.append(place_axes(figure, left=left_in, bottom=bottom_in, width=WIDTH_AXES_IN, height=height_in))
        bottom_in += height_in + GAP_IN
    for axes in panels[1:]:
        axes.tick_params(labelbottom=False)
    return panels[::-1]


def _scaled(band: Band, factor: float) -> Band:
    return Band(
        value=band.value * factor, low=band.low * factor, high=band.high * factor, designed=band.designed * factor
    )


def _draw_curve(axes: Axes, column: _Column, band: Band, unit: str, label: str) -> None:
    """The estimated curve with its band, the designed one, the kept stretch, and both places."""
    prediction = column.prediction
    at = prediction.at
    axes.set_xlim(at[0], at[-1])
    axes.fill_between(at, band.low, band.high, color=COLOURS["fitted"], alpha=0.3, linewidth=0, zorder=1.5, gid="band")
    axes.plot(at, band.value, color=COLOURS["fitted"], linewidth=1.8, zorder=3, gid="estimated")
    axes.plot(at, band.designed, color=COLOURS["designed"], linewidth=2.0, linestyle="--", zorder=2.5, gid="designed")
    if column.kept is not None:
        start, end = (min(max(edge, at[0]), at[-1]) for edge in column.kept)
        axes.axvspan(start, end, facecolor=COLOURS["good"], alpha=KEPT_ALPHA, linewidth=0, zorder=0.2, gid="kept")
    places = (
        (prediction.estimated_at, band.value, COLOURS["fitted"], COLOURS["fitted"], "here"),
        (prediction.designed_at, band.designed, COLOURS["designed"], "white", "as designed"),
    )
    for place, curve, colour, face, name in places:
        if not at[0] <= place <= at[-1]:
            continue
        axes.plot(
            [place],
            [_on(curve, at, place)],
            "o",
            color=colour,
            markerfacecolor=face,
            markersize=8,
            markeredgewidth=2,
            zorder=4,
            clip_on=False,
            gid=name,
        )
    axes.xaxis.set_major_locator(MaxNLocator(6))
    axes.yaxis.set_major_locator(MaxNLocator(4 if axes.get_position().height < 0.25 else 7))
    axes.grid()
    _set_height(axes, band, from_zero=unit != "deg")
    in_multiples(axes.yaxis, unit, label)
    axes.yaxis.set_label_coords(-LABEL_IN / WIDTH_AXES_IN, 0.5)


def _set_height(axes: Axes, band: Band, *, from_zero: bool) -> None:
    """Room for curves and band; of what is 0 or more the floor, on which a place shall be seen."""
    curves = np.concatenate([band.value, band.low, band.high, band.designed])
    seen = curves[np.isfinite(curves)]
    if not len(seen):
        axes.text(0.5, 0.75, "no crossover", transform=axes.transAxes, ha="center", va="center", gid="none")
        return
    bottom, top = (0.0, float(seen.max())) if from_zero else (float(seen.min()), float(seen.max()))
    height = (top - bottom) or 1.0
    # Below the margin's curves is room for words.
    axes.set_ylim(bottom - (0.07 if from_zero else 0.3) * height, top + 0.1 * height)


def _on(curve: FloatArray, at: FloatArray, place: float) -> float:
    return float(np.interp(place, at, curve))


def _draw_margin(axes: Axes, column: _Column, wanted_deg: float | None) -> None:
    _draw_curve(axes, column, column.prediction.phase_margin_deg, "deg", LABELS["phase_margin_deg"])
    if wanted_deg is not None:
        axes.axhline(wanted_deg, color=COLOURS["good"], linewidth=1.6, linestyle="-.", zorder=2, gid="wanted")
        bottom, top = axes.get_ylim()
        pad = 0.07 * (top - bottom)
        axes.set_ylim(min(bottom, wanted_deg - pad), max(top, wanted_deg + pad))


def _write_places(axes: Axes, column: _Column, wanted_deg: float | None) -> None:
    """Names at both places, at the ends of the kept stretch, and at the resistor that restores the zero."""
    prediction, band = column.prediction, column.prediction.phase_margin_deg
    at, unit = prediction.at, prediction.against.unit
    bottom, top = axes.get_ylim()
    axes.set_ylim(bottom, top)
    clutter = Clutter(axes)
    for curve in (band.value, band.designed):
        seen = np.isfinite(curve)
        if seen.any():
            clutter.add_line(at[seen], curve[seen])
    if wanted_deg is not None:
        clutter.add_line([at[0], at[-1]], [wanted_deg] * 2)
    here = (prediction.estimated_at, _on(band.value, at, prediction.estimated_at))
    designed = (prediction.designed_at, _on(band.designed, at, prediction.designed_at))
    named = [
        (place, f"{name} {si(place[0], unit, digits=3)}: {place[1]:.1f}°")
        for place, name in ((here, "here"), (designed, "designed"))
        if at[0] <= place[0] <= at[-1] and np.isfinite(place[1])
    ]
    restoring = column.restoring
    if restoring is not None and at[0] <= restoring <= at[-1] and np.isfinite(_on(band.value, at, restoring)):
        place = (restoring, _on(band.value, at, restoring))
        axes.plot(
            [place[0]], [place[1]], "D", color=COLOURS["ink"], markerfacecolor="white", markersize=7,
            markeredgewidth=1.6, zorder=4.2, clip_on=False, gid="restoring",
        )  # fmt: skip
        named.append((place, f"designed zero\nback at {si(restoring, unit, digits=3)}: {place[1]:.1f}°"))
    for end, word in zip(column.kept or (), ("from", "up to"), strict=False):
        if at[0] < end < at[-1]:
            axes.axvline(end, color=COLOURS["good"], linewidth=1.4, zorder=1.8, gid="end")
            clutter.add_line([end, end], [bottom, top])
            named.insert(0, ((end, bottom + 0.08 * (top - bottom)), f"kept {word}\n{si(end, unit, digits=3)}"))
    for place, _ in named:
        clutter.add_disc(*place, DISC_IN)
    for place, words in named:
        words_at(clutter, words, place, gid="words")


def _draw_legend(figure: Figure, findings: ElementFindings, *, top_in: float) -> None:
    entries: list[tuple[Line2D | Patch, str]] = [
        (Line2D([], [], color=COLOURS["fitted"], linewidth=1.8), "part as estimated"),
        (Patch(facecolor=COLOURS["fitted"], alpha=0.3), "95 % band"),
        (Line2D([], [], color=COLOURS["designed"], linestyle="--", linewidth=2.0), "as designed"),
    ]
    if findings.wanted_deg is not None:
        wanted = f"{findings.wanted_deg:g}°"
        entries += [
            (Line2D([], [], color=COLOURS["good"], linestyle="-.", linewidth=1.6), f"wanted: {wanted}"),
            (Patch(facecolor=COLOURS["good"], alpha=KEPT_ALPHA + 0.1), f"keeps {wanted}"),
        ]
    draw_legend_row(figure, entries, left_in=0.2, y_in=top_in - 0.13)
