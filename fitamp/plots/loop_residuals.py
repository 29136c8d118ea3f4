"""The residuals below the loop-gain picture, on a scale that shows the small and the large, with a title in words."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import FixedLocator, FuncFormatter, NullLocator

from fitamp.fitting import LoopFit
from fitamp.plots.style import COLOURS, SMALL_PT, WIDTH_IN, text_width_in, wrapped
from fitamp.units import si

__all__ = ["draw_residuals", "residual_title", "title_room_in"]

TITLE_GAP_IN, TITLE_LINE_IN = 0.155, 0.165
TITLE_PAD_PT = 4.0
# Residuals up to here are on a linear scale; where the largest is far beyond, the rest is in decades.
LINEAR_SIGMA, LINEAR_UP_TO = 4.0, 10.0
# Noise does not give one like this in a few hundred points: it is named.
STRIKING_SIGMA = 5.0
HUNDRED = 99.5  # two digits make this 100
# Over a stretch of the band that the title names as well.
MISFIT_WORDS, MISFIT_WORDS_OF_TWO = "▼ mostly here ▼", "▼ here ▼"
MISFIT_ROW_IN = 0.17
NARROWEST = 0.004


def residual_title(fit: LoopFit, width_in: float) -> list[str]:
    """The title in lines of at most `width_in`: signs, verdict on the residuals, and the largest where it matters."""
    words = (
        f"residuals: ● real, ○ imaginary part, band ±2 σ; {fit.adequacy.sentence} "
        f"(reduced chi-square {fit.adequacy.reduced_chi_square:.3g})"
    )
    sigma, freq_hz = _largest(fit)
    if sigma > STRIKING_SIGMA or not fit.adequacy.adequate:
        size = f"{sigma:.2g}" if sigma < HUNDRED else f"{sigma:.0f}"
        words += f"; largest magnitude {size} σ at {si(freq_hz, 'Hz', digits=3)}"
    return wrapped(words, width_in, SMALL_PT, _weight(fit))


def title_room_in(fit: LoopFit, title: list[str]) -> float:
    """Height above the axes for the title, and the words between it and them where there are any."""
    return TITLE_GAP_IN + TITLE_LINE_IN * len(title) + _misfit_row_in(fit)


def _misfit_row_in(fit: LoopFit) -> float:
    return MISFIT_ROW_IN if fit.adequacy.where_hz else 0.0


def _weight(fit: LoopFit) -> str:
    return "normal" if fit.adequacy.adequate else "bold"


def _largest(fit: LoopFit) -> tuple[float, float]:
    """The largest magnitude in σ, and its frequency."""
    size = np.abs(fit.residuals())
    return float(size.max()), float(fit.sweep.freq_hz[np.argmax(size)])


def draw_residuals(axes: Axes, fit: LoopFit, title: list[str]) -> None:
    """Draw both parts over frequency, and a ring around the largest where the title names it."""
    residuals = fit.residuals()
    axes.axhspan(-2, 2, color="#E8E8E8", zorder=0, linewidth=0)
    axes.axhline(0, color="#666666", linewidth=0.8)
    _shade_misfit(axes, fit)
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
    sigma, freq_hz = _largest(fit)
    _set_scale(axes, sigma)
    if sigma > STRIKING_SIGMA:
        index = int(np.argmax(fit.sweep.freq_hz == freq_hz))
        value = max(residuals[index].real, residuals[index].imag, key=abs)
        axes.plot(
            [freq_hz],
            [value],
            "o",
            color=COLOURS["bad"],
            markerfacecolor="none",
            markersize=9,
            markeredgewidth=1.6,
            gid="largest residual",
        )
    axes.set_ylabel("residual (σ)")
    axes.set_xlabel("frequency")
    axes.grid(True)
    pad = TITLE_PAD_PT + 72 * _misfit_row_in(fit)
    axes.set_title("\n".join(title), loc="left", size=SMALL_PT, weight=_weight(fit), pad=pad)


def _shade_misfit(axes: Axes, fit: LoopFit) -> None:
    """Tint the stretches that hold most of what the noise does not explain, and point at them from above the axes."""
    low, high = np.log(axes.get_xlim())
    width_in = axes.get_position().width * WIDTH_IN
    where_hz = fit.adequacy.where_hz or ()
    words = MISFIT_WORDS if len(where_hz) == 1 else MISFIT_WORDS_OF_TWO
    half = text_width_in(words) / 2 / width_in
    for start_hz, end_hz in where_hz:
        # A single point still gets a band that can be seen.
        start, end = (np.log(edge) + side * NARROWEST * (high - low) for edge, side in ((start_hz, -1), (end_hz, 1)))
        axes.axvspan(
            np.exp(start), np.exp(end), color=COLOURS["bad"], alpha=0.14, linewidth=0, zorder=0.5, gid="misfit"
        )
        axes.text(
            float(np.clip(((start + end) / 2 - low) / (high - low), half, 1 - half)),
            1.0,
            words,
            transform=axes.transAxes,
            ha="center",
            va="bottom",
            size=SMALL_PT,
            color=COLOURS["bad"],
            gid="misfit words",
        )


def _set_scale(axes: Axes, largest: float) -> None:
    if largest <= LINEAR_UP_TO:
        reach = max(LINEAR_SIGMA, 1.15 * largest)
    else:
        reach = 2.0 * largest
        axes.set_yscale("symlog", linthresh=LINEAR_SIGMA, linscale=1.0)
        decades = [10.0**e for e in range(1, 1 + int(np.log10(reach)))]
        decades = decades[:: -(-len(decades) // 2)]
        axes.yaxis.set_major_locator(FixedLocator([-d for d in reversed(decades)] + [-2, 0, 2, *decades]))
        axes.yaxis.set_minor_locator(NullLocator())
        axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}".replace("-", "−")))
    axes.set_ylim(-reach, reach)
