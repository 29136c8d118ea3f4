"""The lane below the phase: where designed and measured poles and zero lie along the frequency axis."""

from __future__ import annotations

import math
from dataclasses import dataclass

from matplotlib.axes import Axes

from fitamp.comparison import Comparison
from fitamp.plots.further import FURTHER_ALPHA, Further, row_name
from fitamp.plots.roots import Mark
from fitamp.plots.style import COLOURS, SMALL_PT, shortened, text_width_in
from fitamp.units import si

__all__ = ["ROOT_GUIDE", "LaneRow", "draw_lane", "lane_rows"]

ROOT_GUIDE = "root"
# From a mark's centre to its name, and between words.
OFFSET_IN = 0.13
GAP_IN = 0.1
EDGE_IN = 0.1
ROW_IN, LEVEL_IN = 0.34, 0.17


@dataclass(frozen=True, slots=True, kw_only=True)
class _Spot:
    """Marks with their words: one at a frequency, of a resonance two, or all beyond one edge ("<" or ">")."""

    marks: tuple[Mark, ...]
    at_hz: float
    edge: str
    words: str


@dataclass(frozen=True, slots=True, kw_only=True)
class _Named:
    """A spot with the place of its words: left end in inches, and level, 0 beside the mark and others below."""

    spot: _Spot
    at_in: float
    start_in: float
    level: int


@dataclass(frozen=True, slots=True, kw_only=True)
class LaneRow:
    """One row of the lane, laid out for a range of frequencies."""

    name: str
    named: tuple[_Named, ...]

    @property
    def height_in(self) -> float:
        """Height with all levels of words."""
        return ROW_IN + LEVEL_IN * max((named.level for named in self.named), default=0)


def lane_rows(
    measured: tuple[Mark, ...],
    designed: tuple[Mark, ...],
    low_hz: float,
    high_hz: float,
    width_in: float,
    *,
    further: tuple[Further, ...] = (),
) -> tuple[LaneRow, ...]:
    """Rows of the lane from the bottom: resonances and doublets if any, measured, designed where there is a design."""
    rows = [("measured", _spots(measured, low_hz, high_hz))]
    if further:
        rows.insert(0, (row_name(further), [_further_spot(one, low_hz, high_hz) for one in further]))
    if designed:
        rows.append(("designed", _spots(designed, low_hz, high_hz)))
    return tuple(LaneRow(name=name, named=_named(spots, width_in)) for name, spots in rows)


def _further_spot(one: Further, low_hz: float, high_hz: float) -> tuple[_Spot, float]:
    at_hz = min(max(_distance_hz(one.poles), low_hz), high_hz)
    return _Spot(marks=one.marks, at_hz=at_hz, edge="", words=one.words), _share(at_hz, low_hz, high_hz)


def _share(at_hz: float, low_hz: float, high_hz: float) -> float:
    return math.log(at_hz / low_hz) / math.log(high_hz / low_hz)


def _spots(marks: tuple[Mark, ...], low_hz: float, high_hz: float) -> list[tuple[_Spot, float]]:
    """Pole 1, pole 2 (or the pair) and the zero, lowest first, each with its share of the axis.

    A third pole is not what the sweep is about.
    """
    shown = sorted((mark for mark in marks if mark.name != "pole 3"), key=_distance_hz)
    inside = [mark for mark in shown if low_hz <= _distance_hz(mark) <= high_hz]
    below = tuple(mark for mark in shown if _distance_hz(mark) < low_hz)
    above = tuple(mark for mark in shown if _distance_hz(mark) > high_hz)
    spots: list[tuple[_Spot, float]] = []
    if below:
        spots.append((_Spot(marks=below, at_hz=0.0, edge="<", words=_far_words(below)), 0.0))
    for mark in inside:
        at_hz = _distance_hz(mark)
        words = mark.sentence if mark.value_hz is None else mark.label
        spots.append((_Spot(marks=(mark,), at_hz=at_hz, edge="", words=words), _share(at_hz, low_hz, high_hz)))
    if above:
        spots.append((_Spot(marks=above, at_hz=math.inf, edge=">", words=_far_words(above)), 1.0))
    return spots


def _named(spots: list[tuple[_Spot, float]], width_in: float) -> tuple[_Named, ...]:
    """Names right of their marks, else left of them, else on a level below where nothing else is."""
    places = [
        {"<": EDGE_IN, ">": width_in - EDGE_IN}.get(spot.edge, min(max(share, 0.0), 1.0) * width_in)
        for spot, share in spots
    ]
    taken: dict[int, list[tuple[float, float]]] = {0: [(at - OFFSET_IN, at + OFFSET_IN) for at in places]}
    named: list[_Named] = []
    for (spot, _), at in reversed(list(zip(spots, places, strict=True))):
        extent = text_width_in(spot.words)
        for level in range(len(spots) + 1):
            starts = [at + OFFSET_IN, at - OFFSET_IN - extent] if level == 0 else [at - extent / 2]
            if level > 0:
                starts = [min(max(starts[0], GAP_IN), width_in - extent - GAP_IN)]
            free = [
                start
                for start in starts
                if start >= GAP_IN / 2
                and start + extent <= width_in - GAP_IN / 2
                and all(end - 1e-6 <= start or start + extent <= begin + 1e-6 for begin, end in taken.get(level, []))
            ]
            if free or level == len(spots):
                start = free[0] if free else starts[0]
                taken.setdefault(level, []).append((start - GAP_IN, start + extent + GAP_IN))
                named.append(_Named(spot=spot, at_in=at, start_in=start, level=level))
                break
    return tuple(reversed(named))


def draw_lane(
    lane: Axes, panels: tuple[Axes, ...], rows: tuple[LaneRow, ...], comparison: Comparison | None, *, width_in: float
) -> None:
    """Draw the marks, measured below designed, the window of the designed zero, and guides into the panels above."""
    lane.set_ylim(0, sum(row.height_in for row in rows))
    lines: list[float] = []
    bottom = 0.0
    for row in rows:
        bottom += row.height_in
        lines.append(bottom - ROW_IN / 2)
        if row.name == "designed" and comparison is not None:
            _draw_window(lane, comparison, (bottom - row.height_in, bottom))
    lane.set_yticks(lines, [row.name for row in rows])
    lane.tick_params(axis="y", length=0)
    for row, y in zip(rows, lines, strict=True):
        _draw_row(lane, y, row, width_in)
    for named in next(row for row in rows if row.name == "measured").named:
        if not named.spot.edge and named.spot.marks[0].value_hz is not None:
            for axes in panels:
                axes.axvline(
                    named.spot.at_hz, color="#888888", linestyle=(0, (1, 3)), linewidth=0.9, zorder=1, gid=ROOT_GUIDE
                )


def _far_words(marks: tuple[Mark, ...]) -> str:
    return "; ".join(_far_word(mark) for mark in marks)


def _far_word(mark: Mark) -> str:
    """Name and value; of a region through infinity its nearer end, whichever half plane that is in."""
    if mark.is_zero and len(mark.regions_hz) == 2:
        nearest = min(abs(end) for region in mark.regions_hz for end in region)
        return f"{mark.name} > {si(nearest, 'Hz', digits=3)}"
    if mark.is_pair and mark.value_hz is not None:
        return f"{mark.name}: {si(abs(mark.value_hz), 'Hz', digits=3)}"
    return mark.sentence


def _distance_hz(mark: Mark) -> float:
    """Distance from the origin; of a region with two ends its middle. Else pole 1 is below the band, others above."""
    if mark.value_hz is not None:
        return abs(mark.value_hz)
    if len(mark.regions_hz) == 1 and all(end and math.isfinite(end) for end in mark.regions_hz[0]):
        return math.sqrt(mark.regions_hz[0][0] * mark.regions_hz[0][1])
    return 0.0 if mark.name == "pole 1" else math.inf


def _draw_window(lane: Axes, comparison: Comparison, between: tuple[float, float]) -> None:
    """Distances at which the zero counts as designed, behind the designed row: the half plane counts as well."""
    window = comparison.verdict.window
    nearest = max(abs(window.low_s), abs(window.high_s))
    farthest = 0.0 if window.low_s <= 0 <= window.high_s else min(abs(window.low_s), abs(window.high_s))
    low, high = lane.get_xlim()
    start = low if math.isinf(nearest) else 1 / (2 * math.pi * nearest)
    end = 1 / (2 * math.pi * farthest) if farthest else high
    bottom, top = (y / lane.get_ylim()[1] for y in between)
    lane.axvspan(start, end, bottom, top, facecolor=COLOURS["good"], alpha=0.35, linewidth=0, gid="zero window")


def _draw_row(lane: Axes, y: float, row: LaneRow, width_in: float) -> None:
    low, high = lane.get_xlim()
    scale = width_in / math.log10(high / low)
    for named in row.named:
        spot = named.spot
        for start, end in (region for mark in spot.marks for region in mark.regions_hz):
            near, far = sorted((abs(start), abs(end)))
            if near < high and far > low:
                ends = [max(near, low), min(far, high)]
                lane.plot(ends, [y, y], color=_colour(row), linewidth=4, alpha=0.4, gid="region")
        if spot.edge:
            names = ", ".join(mark.name for mark in spot.marks)
            _draw_symbol(lane, row, (low * 10 ** (named.at_in / scale), y), spot.edge, names)
        else:
            # Of a root without a value there is only the region.
            for mark in (mark for mark in spot.marks if mark.value_hz is not None):
                at_hz = spot.at_hz if len(spot.marks) == 1 else _distance_hz(mark)
                _draw_symbol(lane, row, (at_hz, y), "o" if mark.is_zero else "x", mark.name)
        lane.text(
            named.start_in / width_in,
            y - (0.02 + LEVEL_IN * named.level if named.level else 0.0),
            shortened(spot.words, width_in - 2 * GAP_IN),
            transform=lane.get_yaxis_transform(),
            ha="left",
            va="center",
            size=SMALL_PT,
            # A region may pass behind.
            bbox={"boxstyle": "square,pad=0.05", "facecolor": "white", "edgecolor": "none", "alpha": 0.75},
            zorder=3.5,
        )


def _colour(row: LaneRow) -> str:
    return COLOURS["designed" if row.name == "designed" else "fitted"]


def _draw_symbol(lane: Axes, row: LaneRow, at: tuple[float, float], marker: str, names: str) -> None:
    is_further = row.name not in {"measured", "designed"}
    lane.plot(
        [at[0]],
        [at[1]],
        marker,
        color=_colour(row),
        markerfacecolor=_colour(row) if row.name == "measured" else "none" if is_further else "white",
        markersize=6 if is_further else 8,
        markeredgewidth=1.3 if is_further else 2,
        alpha=FURTHER_ALPHA if is_further else None,
        gid=names if is_further else f"{row.name} {names}",
        zorder=4,
    )
