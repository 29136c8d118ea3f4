"""A free place for words in axes: beside what they belong to, and on nothing that is drawn."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from matplotlib.axes import Axes
from numpy.typing import ArrayLike, NDArray

from fitamp.arrays import FloatArray
from fitamp.plots.style import DPI, SMALL_PT, text_width_in

__all__ = ["Box", "Clutter", "words_at"]

# Lines are sampled this densely, finer than any letter.
STEP_IN = 0.03
# Places are tried on a grid of this pitch; the nearest free one is taken.
PITCH_IN = 0.07
PAD_IN = 0.05
LINE_HEIGHT = 1.25
# Farther than this from its place, words get a leader.
LEADER_IN = 0.32
HIT_COST_IN = 0.2

Box = tuple[float, float, float, float]


@dataclass(slots=True)
class Clutter:
    """What is drawn in axes, in inches from their lower left corner; grows as words are placed.

    hard : points of curves and marks, each shape (n, 2); soft : of lines that words may cover, each with the distance
        that words go to avoid it; boxes : words already there, as (x0, y0, x1, y1)
    """

    axes: Axes
    hard: list[FloatArray] = field(default_factory=list)
    soft: list[tuple[FloatArray, float]] = field(default_factory=list)
    boxes: list[Box] = field(default_factory=list)

    @property
    def size_in(self) -> tuple[float, float]:
        """Width and height of the axes."""
        box = self.axes.bbox
        return float(box.width) / DPI, float(box.height) / DPI

    def to_inches(self, x: ArrayLike, y: ArrayLike) -> FloatArray:
        """Data coordinates as inches, shape (n, 2), kept near the axes."""
        width, height = self.size_in
        points = np.stack(np.broadcast_arrays(np.asarray(x, dtype=float), np.asarray(y, dtype=float)), axis=-1)
        share = self.axes.transLimits.transform(self.axes.transScale.transform(points.reshape(-1, 2)))
        return np.asarray(np.clip(share, -2, 3) * [width, height])

    def add_points(self, x: ArrayLike, y: ArrayLike) -> None:
        """Separate points."""
        self.hard.append(self.to_inches(x, y))

    def add_line(self, x: ArrayLike, y: ArrayLike, *, soft_in: float | None = None) -> None:
        """A polyline through points; one that words may cover, where `soft_in` is the distance to go to avoid that."""
        points = self.to_inches(x, y)
        along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
        at = np.linspace(0, along[-1], 2 + int(along[-1] / STEP_IN))
        line = np.stack([np.interp(at, along, points[:, 0]), np.interp(at, along, points[:, 1])], axis=-1)
        if soft_in is None:
            self.hard.append(line)
        else:
            self.soft.append((line, soft_in))

    def add_disc(self, x: float, y: float, radius_in: float) -> None:
        """A mark at a place."""
        angle = np.linspace(0, 2 * np.pi, 16, endpoint=False)
        ring = np.stack([np.cos(angle), np.sin(angle)], axis=-1) * radius_in
        self.hard.append(self.to_inches([x], [y]) + np.concatenate([ring, ring / 2, [[0, 0]]]))


def words_at(
    clutter: Clutter,
    words: str,
    at: tuple[float, float],
    *,
    size_pt: float = SMALL_PT,
    weight: str = "normal",
    gid: str | None = None,
    leader: bool = True,
) -> Box:
    """Write words (one line or more) at the free place nearest to `at` (data coordinates), with a leader if far.

    Returns the words' box in inches, which is also added to `clutter`.
    """
    lines = words.split("\n")
    size_in = (
        max(text_width_in(line, size_pt, weight) for line in lines),
        len(lines) * size_pt * LINE_HEIGHT / 72,
    )
    anchor = clutter.to_inches([at[0]], [at[1]])[0]
    box = _free_box(clutter, size_in, anchor)
    clutter.boxes.append(box)
    width, height = clutter.size_in
    axes = clutter.axes
    near = (float(np.clip(anchor[0], box[0], box[2])), float(np.clip(anchor[1], box[1], box[3])))
    if leader and np.hypot(near[0] - anchor[0], near[1] - anchor[1]) > LEADER_IN:
        axes.plot(
            [anchor[0] / width, near[0] / width],
            [anchor[1] / height, near[1] / height],
            color="#777777",
            linewidth=0.8,
            transform=axes.transAxes,
            zorder=3.2,
            gid="leader",
        )
    axes.text(
        box[0] / width,
        (box[1] + box[3]) / 2 / height,
        words,
        size=size_pt,
        weight=weight,
        ha="left",
        va="center",
        transform=axes.transAxes,
        zorder=6,
        gid=gid,
    )
    return box


def _free_box(clutter: Clutter, size_in: tuple[float, float], anchor: FloatArray) -> Box:
    """The box of this size with the least cost: distance to the anchor, and what it would cover."""
    width, height = clutter.size_in
    x = np.arange(PAD_IN, max(width - size_in[0] - PAD_IN, PAD_IN) + 1e-9, PITCH_IN)
    y = np.arange(PAD_IN, max(height - size_in[1] - PAD_IN, PAD_IN) + 1e-9, PITCH_IN)
    left, bottom = (grid.ravel() for grid in np.meshgrid(x, y))
    right, top = left + size_in[0], bottom + size_in[1]
    away_x = np.maximum(np.maximum(left - anchor[0], anchor[0] - right), 0)
    away_y = np.maximum(np.maximum(bottom - anchor[1], anchor[1] - top), 0)
    cost = np.hypot(away_x, away_y)
    edges = (left - PAD_IN, bottom - PAD_IN, right + PAD_IN, top + PAD_IN)
    hard = _counts(clutter.hard, edges, clutter.size_in)
    cost = cost + np.where(hard > 0, 100 + HIT_COST_IN * hard, 0)
    for line, soft_in in clutter.soft:
        cost = cost + np.where(_counts([line], edges, clutter.size_in) > 0, soft_in, 0)
    for box in clutter.boxes:
        covers = (edges[0] < box[2]) & (box[0] < edges[2]) & (edges[1] < box[3]) & (box[1] < edges[3])
        cost = cost + np.where(covers, 200.0, 0)
    best = int(np.argmin(cost))
    return float(left[best]), float(bottom[best]), float(right[best]), float(top[best])


def _counts(
    parts: Sequence[FloatArray],
    edges: tuple[FloatArray, FloatArray, FloatArray, FloatArray],
    size_in: tuple[float, float],
) -> FloatArray:
    """How many cells with points lie in each of the boxes, shape (boxes,): a table of sums, one look-up a corner."""
    shape = tuple(int(length / STEP_IN) + 3 for length in size_in)
    taken = np.zeros((shape[0] + 1, shape[1] + 1))
    for points in parts:
        cells = np.floor(points / STEP_IN).astype(int) + 1
        inside = ((cells >= 0) & (cells < shape)).all(axis=1)
        taken[cells[inside, 0] + 1, cells[inside, 1] + 1] = 1
    sums = taken.cumsum(axis=0).cumsum(axis=1)

    def at(edge: FloatArray, axis: int, *, end: bool) -> NDArray[np.int_]:
        """The cell that holds an edge, counted in as a whole."""
        cell = np.floor(edge / STEP_IN).astype(int) + (2 if end else 1)
        return np.asarray(np.clip(cell, 0, shape[axis]))

    left, bottom = at(edges[0], 0, end=False), at(edges[1], 1, end=False)
    right, top = at(edges[2], 0, end=True), at(edges[3], 1, end=True)
    return np.asarray(sums[right, top] - sums[left, top] - sums[right, bottom] + sums[left, bottom])
