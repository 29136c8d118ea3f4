"""The frame of both s-plane pictures: reach, linear part of the scale, names of the half planes, marks of infinity."""

from __future__ import annotations

import math
from collections.abc import Iterable

from matplotlib.axes import Axes

from fitamp.fitting import LoopFit
from fitamp.plots.roots import Mark
from fitamp.plots.style import COLOURS, SMALL_PT

__all__ = ["distances_hz", "linear_hz", "name_half_planes", "point_to_infinity", "reach_hz"]

# A root this many times beyond the sweep is as good as at infinity for the picture.
FARTHEST = 300.0


def reach_hz(fit: LoopFit, measured: Iterable[Mark], designed: Iterable[Mark]) -> float:
    """Half the plane's width: beyond every designed root, and every measured one that can be told from infinity."""
    found, wanted = list(measured), list(designed)
    limit = FARTHEST * fit.sweep.f_max_hz
    room = 8.0 if any(mark.reaches_infinity for mark in (*found, *wanted)) else 2.5
    distances = [d for d in distances_hz(found) if d <= limit] + distances_hz(wanted)
    return room * max(distances, default=fit.sweep.f_max_hz)


def linear_hz(marks: Iterable[Mark]) -> float:
    """Below this distance the scale is linear: the decade of the root nearest the origin."""
    nearest = min((d for d in distances_hz(marks) if d > 0), default=1.0)
    return float(10.0 ** math.floor(math.log10(nearest)))


def distances_hz(marks: Iterable[Mark]) -> list[float]:
    """Distances from the origin of all roots and of all finite ends of their regions."""
    shown = list(marks)
    ends = [abs(end) for mark in shown for region in mark.regions_hz for end in region]
    return [end for end in ends if math.isfinite(end)] + [abs(m.value_hz) for m in shown if m.value_hz is not None]


def name_half_planes(axes: Axes) -> None:
    """Tint the right half plane and name both above the axes."""
    low, high = axes.get_xlim()
    axes.axvspan(0, high, facecolor="#F3EEE6", linewidth=0, zorder=0)
    axes.axvline(0, color="#444444", linewidth=1.2, zorder=1.5)
    for x, align, words in (
        (low, "left", "◀ left half plane: a zero here adds lead"),
        (high, "right", "right half plane: a zero here adds lag ▶"),
    ):
        axes.annotate(
            words,
            xy=(x, 1),
            xycoords=axes.get_xaxis_transform(),
            xytext=(0, 5),
            textcoords="offset points",
            ha=align,
            va="bottom",
            size=SMALL_PT,
        )


def point_to_infinity(axes: Axes, y: float, region: tuple[float, float], reach: float) -> None:
    """Arrow heads at the edges that a region crosses."""
    for x, is_crossed, marker in ((0.012, region[0] < -reach, "<"), (0.988, region[1] > reach, ">")):
        if is_crossed:
            axes.plot(
                [x],
                [y],
                marker,
                color=COLOURS["fitted"],
                markersize=11,
                transform=axes.get_yaxis_transform(),
                gid="to infinity",
                zorder=3.5,
            )
