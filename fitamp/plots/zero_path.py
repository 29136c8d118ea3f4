"""Where the zero goes as the nulling resistor grows: a straight line of zero times, through infinity at 0."""

from __future__ import annotations

import math
from dataclasses import dataclass

from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter

from fitamp.amplifier import Elements
from fitamp.comparison import Comparison, Nulling
from fitamp.comparison.verdict import WINDOW_QUANTILE, nulling_product, regions_of
from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.header import VERDICT_COLOURS, figure_with_head
from fitamp.plots.style import COLOURS, SMALL_PT, drawing_style, place_axes
from fitamp.units import si, si_with_error

__all__ = ["zero_path_figure"]

LEFT_IN, BOTTOM_IN, WIDTH_PATH_IN, HEIGHT_IN, STRIP_IN, TOP_IN = 0.95, 0.6, 5.6, 4.0, 1.15, 0.3
NAME_SPACING_IN = 0.19
TICK_SPACING_IN = 0.21
DISC_IN = 0.12
_PREFIXES = ((1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"), (1e-12, "p"))


@dataclass(frozen=True, slots=True, kw_only=True)
class _Place:
    """A zero on the path: resistor in Ω and zero time in s, with 95 % intervals where measured."""

    resistor_ohm: float
    zero_time_s: float
    reach_ohm: float = 0.0
    ends_s: tuple[float, float] | None = None


def zero_path_figure(comparison: Comparison) -> Figure | None:
    """Draw zero time over nulling resistor; None for a design that has no elements.

    The designed place, the measured one with its 95 % intervals (across: the resistor that would explain the zero with
    gm2 and Cc as designed, within their spreads), the regions of the verdict, and the advised change.
    """
    elements = comparison.design.elements
    if elements is None:
        return None
    with drawing_style():
        figure = figure_with_head(comparison.fit, comparison, body_in=BOTTOM_IN + HEIGHT_IN + TOP_IN)
        path = place_axes(figure, left=LEFT_IN, bottom=BOTTOM_IN, width=WIDTH_PATH_IN, height=HEIGHT_IN)
        strip = place_axes(figure, left=LEFT_IN + WIDTH_PATH_IN, bottom=BOTTOM_IN, width=STRIP_IN, height=HEIGHT_IN)
        designed = _Place(
            resistor_ohm=_resistor_ohm(elements, comparison.design.zero_time_s),
            zero_time_s=comparison.design.zero_time_s,
        )
        measured = _measured(comparison, elements)
        _set_limits(path, strip, comparison, designed=designed, measured=measured)
        _draw_regions(path, strip, comparison)
        _draw_line(path, elements)
        _draw_places(path, designed, measured)
        clutter = _clutter(path, elements, designed, measured)
        # Where the verdict is open, nothing is to be changed yet.
        if measured is not None and comparison.verdict.nulling not in {Nulling.AS_DESIGNED, Nulling.UNDECIDED}:
            _draw_advice(clutter, comparison, elements, measured)
        _write_places(clutter, designed, measured)
        _label_frequencies(strip)
    return figure


def _resistor_ohm(elements: Elements, zero_time_s: float) -> float:
    """The resistor on the designed line, Rz = (τz + Cgd/gm2)/Cc + 1/gm2."""
    return (zero_time_s + elements.Cgd / elements.gm2) / elements.Cc + 1 / elements.gm2


def _zero_time_s(elements: Elements, resistor_ohm: float) -> float:
    return elements.Cc * (resistor_ohm - 1 / elements.gm2) - elements.Cgd / elements.gm2


def _measured(comparison: Comparison, elements: Elements) -> _Place | None:
    zero_time = comparison.verdict.zero_time_s
    product = nulling_product(zero_time, comparison.design)
    low, high = zero_time.ci95
    if zero_time.value is None or low is None or high is None:
        return None
    return _Place(
        resistor_ohm=_resistor_ohm(elements, zero_time.value),
        zero_time_s=zero_time.value,
        reach_ohm=WINDOW_QUANTILE * (product.stderr or 0.0) / elements.gm2,
        ends_s=(low, high),
    )


def _set_limits(path: Axes, strip: Axes, comparison: Comparison, *, designed: _Place, measured: _Place | None) -> None:
    """Room for both places and their words, for the line from Rz = 0, and for infinity."""
    elements = comparison.design.elements
    assert elements is not None
    places = [designed] if measured is None else [designed, measured]
    points = [0.0, 2 / elements.gm2, *(place.resistor_ohm for place in places)]
    times = [_zero_time_s(elements, resistor) for resistor in points]
    # The window's ends, where they are not so far that the places would shrink to a corner.
    window, farthest = comparison.verdict.window, 2 * max(abs(time) for time in times)
    times += [end for end in (window.low_s, window.high_s) if abs(end) <= farthest]
    times += [end for place in places for end in place.ends_s or ()]
    low = min(*points, *(place.resistor_ohm - place.reach_ohm for place in places))
    high = max(*points, *(place.resistor_ohm + place.reach_ohm for place in places))
    # Room for words right of the last place and left of the designed one.
    high = max(high, low + (max(points) - low) / 0.74)
    low = min(low, designed.resistor_ohm - 0.2 * (high - low))
    path.set_xlim(low - 0.05 * (high - low), high + 0.05 * (high - low))
    height = max(times) - min(times)
    for axes in (path, strip):
        axes.set_ylim(min(times) - 0.2 * height, max(times) + 0.2 * height)
    _in_unit(path.xaxis, "Ω", "nulling resistor Rz, with gm2 and Cc as designed")
    _in_unit(path.yaxis, "s", "zero time τz")


def _in_unit(axis: Axis, unit: str, label: str) -> None:
    """Ticks as plain numbers in one multiple of the unit, which the label names."""
    largest = max(abs(end) for end in axis.get_view_interval())
    factor, prefix = next((f, p) for f, p in _PREFIXES if f <= largest or f == _PREFIXES[-1][0])
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value / factor:.6g}".replace("-", "−")))
    axis.set_label_text(f"{label} ({prefix}{unit})")


def _draw_regions(path: Axes, strip: Axes, comparison: Comparison) -> None:
    """A band a region across both axes, and their names in the strip, moved apart where bands are thin."""
    low, high = strip.get_ylim()
    named: list[tuple[float, Nulling]] = []
    for verdict, start, end in sorted(regions_of(comparison.design, comparison.verdict.window), key=lambda t: t[1]):
        bottom, top = max(start, low), min(end, high)
        if bottom >= top:
            continue
        for axes in (path, strip):
            axes.axhspan(
                bottom,
                top,
                facecolor=VERDICT_COLOURS[verdict],
                alpha=0.22,
                linewidth=0,
                zorder=0,
                gid=f"region {verdict.value}",
            )
            axes.axhline(bottom, color="#888888", linewidth=0.6, zorder=0.5)
        named.append(((bottom + top) / 2, verdict))
    spacing = NAME_SPACING_IN / HEIGHT_IN * (high - low)
    for y, (centre, verdict) in zip(_apart([c for c, _ in named], spacing, low, high), named, strict=True):
        is_here = verdict is comparison.verdict.nulling
        strip.annotate(
            verdict.value,
            xy=(0, centre),
            xytext=(0.14, y),
            ha="left",
            va="center",
            size=SMALL_PT,
            weight="bold" if is_here else "normal",
            arrowprops={"arrowstyle": "-", "linewidth": 0.7, "color": "#666666", "shrinkA": 0, "shrinkB": 0},
        )
    strip.set_xlim(0, 1)
    strip.set_xticks([])
    strip.tick_params(labelleft=False, left=False)
    strip.set_title("verdict", size=SMALL_PT, pad=5)


def _apart(wanted: list[float], spacing: float, low: float, high: float) -> list[float]:
    """Rising positions at least `spacing` apart, near the wanted ones, inside the axes."""
    placed: list[float] = []
    for value in wanted:
        placed.append(max(value, placed[-1] + spacing if placed else low + spacing / 2))
    ceiling = high - spacing / 2
    for index in range(len(placed) - 1, -1, -1):
        placed[index] = min(placed[index], ceiling)
        ceiling = placed[index] - spacing
    return placed


def _draw_line(path: Axes, elements: Elements) -> None:
    low, high = path.get_xlim()
    ends = [max(0.0, low), high]
    path.plot(ends, [_zero_time_s(elements, r) for r in ends], color="#444444", linewidth=1.4, gid="path", zorder=2)
    path.axhline(0, color="#444444", linewidth=1.0, linestyle="--", zorder=1)


def _draw_places(path: Axes, designed: _Place, measured: _Place | None) -> None:
    path.plot(
        [designed.resistor_ohm],
        [designed.zero_time_s],
        "o",
        color=COLOURS["designed"],
        markerfacecolor="white",
        markersize=12,
        markeredgewidth=2.4,
        gid="designed",
        zorder=4,
    )
    if measured is None or measured.ends_s is None:
        return
    low, high = measured.ends_s
    path.errorbar(
        [measured.resistor_ohm],
        [measured.zero_time_s],
        xerr=[[measured.reach_ohm], [measured.reach_ohm]],
        yerr=[[measured.zero_time_s - low], [high - measured.zero_time_s]],
        fmt="o",
        color=COLOURS["fitted"],
        markersize=7,
        capsize=4,
        linewidth=1.4,
        gid="measured",
        zorder=5,
    )


def _clutter(path: Axes, elements: Elements, designed: _Place, measured: _Place | None) -> Clutter:
    """What words have to keep clear of: the line, the places with their error bars, and the level of infinity."""
    clutter = Clutter(path)
    low, high = path.get_xlim()
    ends = [max(0.0, low), high]
    clutter.add_line(ends, [_zero_time_s(elements, r) for r in ends])
    clutter.add_line([low, high], [0, 0])
    clutter.add_disc(designed.resistor_ohm, designed.zero_time_s, DISC_IN)
    if measured is not None and measured.ends_s is not None:
        at, reach = measured.resistor_ohm, measured.reach_ohm
        clutter.add_line([at - reach, at + reach], [measured.zero_time_s] * 2)
        clutter.add_line([at, at], measured.ends_s)
        clutter.add_disc(at, measured.zero_time_s, DISC_IN)
    return clutter


def _write_places(clutter: Clutter, designed: _Place, measured: _Place | None) -> None:
    at = (designed.resistor_ohm, designed.zero_time_s)
    words_at(clutter, f"designed\n{si(designed.resistor_ohm, 'Ω', digits=3)}", at, gid="words")
    if measured is not None:
        equivalent = si_with_error(measured.resistor_ohm, measured.reach_ohm / WINDOW_QUANTILE, "Ω")
        at = (measured.resistor_ohm, measured.zero_time_s)
        words_at(clutter, f"measured: as if Rz\nwere {equivalent}", at, gid="words")


def _draw_advice(clutter: Clutter, comparison: Comparison, elements: Elements, measured: _Place) -> None:
    """An arrow along the path over the advised change of Rz."""
    change = comparison.advice.rz_change_ohm
    if change.value is None:
        return
    start = (measured.resistor_ohm, measured.zero_time_s)
    end_ohm = measured.resistor_ohm + change.value
    end = (end_ohm, _zero_time_s(elements, end_ohm))
    clutter.axes.annotate(
        "",
        xy=end,
        xytext=start,
        arrowprops={
            "arrowstyle": "-|>",
            "mutation_scale": 18,
            "linewidth": 2.6,
            "color": COLOURS["ink"],
            "shrinkA": 7,
            "shrinkB": 8,
        },
        zorder=3,
        gid="advice",
    )
    clutter.add_line(*zip(start, end, strict=True))
    verb = "raise" if change.value > 0 else "lower"
    words = f"{verb} Rz by\n{si_with_error(abs(change.value), change.stderr, 'Ω')}"
    middle = ((start[0] + end[0]) / 2, (start[1] + end[1]) / 2)
    words_at(clutter, words, middle, size_pt=SMALL_PT + 1, weight="bold", gid="words")


def _label_frequencies(strip: Axes) -> None:
    """The same axis as zero frequency and half plane, on the right; ticks too close to another are left out."""
    low, high = strip.get_ylim()
    spacing = TICK_SPACING_IN / HEIGHT_IN * (high - low)
    ticks: list[tuple[float, str]] = [(0.0, "at infinity")] if low < 0 < high else []
    for frequency_hz in _round_frequencies(max(abs(low), abs(high)), spacing):
        for side, name in ((1, "left"), (-1, "right")):
            zero_time_s = side / (2 * math.pi * frequency_hz)
            if low < zero_time_s < high and all(abs(zero_time_s - taken) >= spacing for taken, _ in ticks):
                ticks.append((zero_time_s, f"{si(frequency_hz, 'Hz', digits=1)} {name}"))
    strip.yaxis.set_label_position("right")
    strip.yaxis.tick_right()
    strip.tick_params(labelright=True, right=True)
    strip.set_yticks([place for place, _ in ticks], [words for _, words in ticks])
    strip.set_ylabel("zero frequency and half plane")


def _round_frequencies(largest_s: float, smallest_s: float) -> list[float]:
    """1, 2, 5, 10 … Hz over the zero times from `largest_s` down to `smallest_s`, lowest frequency first."""
    first, last = (math.floor(math.log10(1 / (2 * math.pi * time_s))) for time_s in (largest_s, smallest_s))
    return [digit * 10.0**exponent for exponent in range(first, last + 1) for digit in (1, 2, 5)]
