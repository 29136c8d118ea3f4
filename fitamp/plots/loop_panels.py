"""The panels of the loop-gain picture: magnitude, phase and residuals, with the curves they show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from matplotlib.axes import Axes

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.loop_marks import NARROW_DEG
from fitamp.plots.style import COLOURS, SMALL_PT, shortened
from fitamp.sweep import LeftOut

__all__ = ["Curves", "curves_of", "draw_magnitude", "draw_phase", "draw_residuals", "drawable", "shade_beyond"]

POINTS = 500
# Left-out points farther than this from everything else are drawn at the panel's edge.
STRAY_DB = 20.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Curves:
    """Fitted and designed loop gain on one grid, phases counted continuously from DC."""

    freq_hz: FloatArray
    fitted: ComplexArray
    fitted_deg: FloatArray
    designed: ComplexArray | None
    designed_deg: FloatArray | None


def drawable(points: tuple[LeftOut, ...]) -> list[LeftOut]:
    return [p for p in points if np.isfinite(p.f_hz) and p.f_hz > 0 and np.isfinite(p.gain) and p.gain != 0]


def curves_of(fit: LoopFit, comparison: Comparison | None, low_hz: float, high_hz: float) -> Curves:
    freq_hz = np.geomspace(low_hz, high_hz, POINTS)
    # The phase is counted from DC, so the count starts well below pole 1.
    lead = np.geomspace(min(low_hz, abs(fit.response.poles_hz[0])) / 100, low_hz, POINTS, endpoint=False)
    whole = np.concatenate([lead, freq_hz])
    fitted = fit.evaluate(whole)
    designed = comparison.design.on_bench().evaluate(whole) if comparison is not None else None
    return Curves(
        freq_hz=freq_hz,
        fitted=fitted[POINTS:],
        fitted_deg=_continuous_deg(fitted)[POINTS:],
        designed=None if designed is None else designed[POINTS:],
        designed_deg=None if designed is None else _continuous_deg(designed)[POINTS:],
    )


def _continuous_deg(gain: ComplexArray) -> FloatArray:
    return np.asarray(np.degrees(np.unwrap(np.angle(gain))), dtype=float)


def _db(gain: ComplexArray) -> FloatArray:
    return np.asarray(20 * np.log10(np.maximum(np.abs(gain), 1e-30)), dtype=float)


def draw_magnitude(axes: Axes, fit: LoopFit, curves: Curves) -> None:
    axes.axhline(0, color="#666666", linewidth=0.8)
    _draw_data(axes, fit.sweep.freq_hz, _db(fit.sweep.gain))
    everything = [_db(fit.sweep.gain), _db(curves.fitted)]
    if curves.designed is not None:
        everything.append(_db(curves.designed))
        _draw_designed(axes, curves.freq_hz, everything[-1])
    _draw_fitted(axes, curves.freq_hz, everything[1])
    left = drawable(fit.sweep.left_out)
    low, high = (
        float(pick([part_end for part in everything for part_end in (part.min(), part.max())])) for pick in (min, max)
    )
    if left:
        levels = np.clip(_db(np.array([p.gain for p in left])), low - STRAY_DB, high + STRAY_DB)
        low, high = min(low, float(levels.min())), max(high, float(levels.max()))
        _draw_left_out(axes, [p.f_hz for p in left], levels)
    room = 0.06 * (high - low)
    axes.set_ylim(low - room, high + room)
    axes.set_ylabel("magnitude (dB)")
    axes.grid(True)


def draw_phase(axes: Axes, fit: LoopFit, curves: Curves) -> None:
    def beside_fit(freq_hz: FloatArray, gain: ComplexArray) -> FloatArray:
        """Phase on the fitted curve's branch: noise cannot make it slip by a turn."""
        fitted_deg = np.interp(np.log(freq_hz), np.log(curves.freq_hz), curves.fitted_deg)
        off = np.degrees(np.angle(gain)) - fitted_deg
        return np.asarray(np.degrees(np.angle(gain)) - 360 * np.round(off / 360), dtype=float)

    data = beside_fit(fit.sweep.freq_hz, fit.sweep.gain)
    axes.axhline(-180, color="#666666", linewidth=0.8)
    _draw_data(axes, fit.sweep.freq_hz, data)
    parts = [curves.fitted_deg]
    if curves.designed_deg is not None:
        parts.append(curves.designed_deg)
        _draw_designed(axes, curves.freq_hz, curves.designed_deg)
    _draw_fitted(axes, curves.freq_hz, curves.fitted_deg)
    left = drawable(fit.sweep.left_out)
    low = min(-180.0, *(float(part.min()) for part in parts), float(data.min()))
    high = max(0.0, *(float(part.max()) for part in parts), float(data.max()))
    if left:
        freq_hz = np.array([p.f_hz for p in left])
        phases = np.clip(beside_fit(freq_hz, np.array([p.gain for p in left])), low, high)
        _draw_left_out(axes, list(freq_hz), phases)
    margin = fit.margins.phase_margin_deg.value
    if margin is not None and 0 < margin < NARROW_DEG:
        low = min(low, -200.0)  # room for the margin's words below −180°
    axes.set_ylim(low - 12, high + 12)
    axes.set_yticks(np.arange(45 * np.ceil((low - 12) / 45), high + 12, 45 if high - low < 400 else 90))
    axes.set_ylabel("phase (°)")
    axes.grid(True)


def shade_beyond(axes: Axes, fit: LoopFit) -> None:
    """Grey where nothing was measured: the curves go on there by calculation alone."""
    low, high = axes.get_xlim()
    for start, end in ((low, fit.sweep.f_min_hz), (fit.sweep.f_max_hz, high)):
        axes.axvspan(start, end, facecolor="#EFEFEF", linewidth=0, zorder=0, gid="beyond the sweep")


def _draw_data(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, ".", color=COLOURS["measured"], markersize=4.5, gid="measured", zorder=2.4)


def _draw_fitted(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "-", color=COLOURS["fitted"], linewidth=1.4, gid="fitted", zorder=2.6)


def _draw_designed(axes: Axes, freq_hz: FloatArray, values: FloatArray) -> None:
    axes.plot(freq_hz, values, "--", color=COLOURS["designed"], linewidth=2.0, gid="designed", zorder=2.5)


def _draw_left_out(axes: Axes, freq_hz: list[float], values: FloatArray) -> None:
    axes.plot(
        freq_hz, values, "x", color=COLOURS["left out"], markersize=7, markeredgewidth=1.6, gid="left out", zorder=4
    )


def draw_residuals(axes: Axes, fit: LoopFit, width_in: float) -> None:
    residuals = fit.residuals()
    axes.axhspan(-2, 2, color="#E8E8E8", zorder=0, linewidth=0)
    axes.axhline(0, color="#666666", linewidth=0.8)
    for part, marker, face, name in (
        (residuals.real, "o", "#000000", "real"),
        (residuals.imag, "o", "none", "imaginary"),
    ):
        axes.plot(
            fit.sweep.freq_hz,
            part,
            marker,
            color=COLOURS["measured"] if name == "real" else COLOURS["fitted"],
            markerfacecolor=face,
            markersize=2.4 if name == "real" else 3.0,
            markeredgewidth=0.6,
            gid=f"residual {name}",
        )
    reach = max(4.0, 1.1 * float(np.max(np.abs(np.concatenate([residuals.real, residuals.imag])))))
    axes.set_ylim(-reach, reach)
    axes.set_ylabel("residual (σ)")
    axes.set_xlabel("frequency")
    axes.grid(True)
    words = (
        f"residuals: ● real, ○ imaginary part, band ±2 σ; {fit.adequacy.sentence} "
        f"(reduced chi-square {fit.adequacy.reduced_chi_square:.3g})"
    )
    weight = "normal" if fit.adequacy.adequate else "bold"
    axes.set_title(shortened(words, width_in, SMALL_PT, weight), loc="left", size=SMALL_PT, weight=weight, pad=4)
