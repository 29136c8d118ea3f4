"""Where along the band a further factor would explain most of the residuals: a scan that needs no refit.

A small factor 1 + δ changes the loop-equation residual by M·w·δ. Its best size, and by how much chi-square would fall,
follow linearly once everything that the model's own parameters can do has been taken out of both (a score test:
C. R. Rao, Proc. Cambridge Philos. Soc. 44, 1948). The best places are starts for fits.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from typing import TypeVar

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.factors import Doublet, Factor, FurtherPole, RangeStep, Resonance
from fitamp.fitting.leastsq import interleaved
from fitamp.fitting.two_pole import Solution, loop_equation
from fitamp.sweep import Sweep

__all__ = ["scanned_starts"]

# More points than this are taken in blocks: what is as narrow as a block has points enough inside it to be seen.
MOST_BLOCKS = 1500
DOUBLETS_PER_DECADE = 12
QUALITIES = (2.5, 6.0, 15.0, 40.0)
# Places a resonance's width.
PLACES_PER_WIDTH = 2.0
# Sizes beyond first order are only a direction to start in.
LARGEST_DOUBLET = 1.5
LARGEST_SHIFT = 0.3
PLACES_AT_ONCE = 256
# A range step has at least so many points on either side.
LEAST_SIDE = 4

# From x = s/ω0 of shape (m, n) to the slopes of a factor's logarithm by its sizes, shape (m, n, k).
Slopes = Callable[[ComplexArray], ComplexArray]
Numbers = TypeVar("Numbers", FloatArray, ComplexArray)


def scanned_starts(solution: Solution, sweep: Sweep) -> Iterator[tuple[Factor, FloatArray]]:
    """Starts for one more factor: a doublet, a pole, resonances of the two likeliest qualities, a range step."""
    scan = _Scan(solution, sweep)
    low_hz, high_hz = sweep.f_min_hz, sweep.f_max_hz
    places_hz = _places(low_hz, high_hz, DOUBLETS_PER_DECADE)
    gains, sizes = scan.of(places_hz, _doublet_slopes)
    at = int(np.argmax(gains))
    ratio = float(np.exp(np.clip(sizes[at, 0], -LARGEST_DOUBLET, LARGEST_DOUBLET) / 2))
    yield Doublet(time_s=1 / (2 * np.pi * places_hz[at])), np.array([ratio, 1 / ratio])
    yield FurtherPole(time_s=1 / (2 * np.pi * high_hz)), np.array([0.5])
    seen = []
    for quality in QUALITIES:
        places_hz = _places(low_hz, high_hz, np.log(10) * quality * PLACES_PER_WIDTH)
        gains, sizes = scan.of(places_hz, partial(_resonance_slopes, quality))
        at = int(np.argmax(gains))
        seen.append((float(gains[at]), quality, float(places_hz[at]), sizes[at]))
    for _, quality, place_hz, size in sorted(seen, key=lambda found: -found[0])[:2]:
        yield Resonance(omega=2 * np.pi * place_hz), _resonance_start(quality, size)
    step = scan.best_step()
    if step is not None:
        yield step


def _places(low_hz: float, high_hz: float, per_decade: float) -> FloatArray:
    count = max(int(np.log10(high_hz / low_hz) * per_decade), 2)
    return np.geomspace(low_hz, high_hz, count + 2)[1:-1]


def _doublet_slopes(x: ComplexArray) -> ComplexArray:
    return np.asarray((x / (1 + x))[..., np.newaxis])


def _resonance_slopes(quality: float, x: ComplexArray) -> ComplexArray:
    below = 1 + x / quality + x**2
    return np.stack([x / below, x**2 / below], axis=-1)


def _resonance_start(quality: float, size: FloatArray) -> FloatArray:
    """Half of the size in the zeros, half in the poles; both stay damped."""
    damping, shift = np.clip(size, (-1 / quality, -LARGEST_SHIFT), (1 / quality, LARGEST_SHIFT)) / 2
    return np.array([1 / quality + damping, 1 + shift, 1 / quality - damping, 1 - shift])


class _Scan:
    """Residuals, and what a relative change of the loop gain does to them, both without what the model can do."""

    def __init__(self, solution: Solution, sweep: Sweep) -> None:
        rows, slopes = loop_equation(solution.model, solution.values, sweep, solution.noise)
        # ln g is the first parameter: its column is what a relative change of the loop gain does.
        per_change = slopes[:, 0]
        block = -(-len(sweep) // MOST_BLOCKS)
        self.freq_hz = _blocks(sweep.freq_hz, block)
        self.per_change = _blocks(per_change, block) * np.sqrt(block)
        residuals = interleaved(_blocks(rows, block) * np.sqrt(block))
        own = interleaved(np.stack([_blocks(column, block) for column in slopes.T], axis=1) * np.sqrt(block))
        self.own = np.linalg.qr(own / np.maximum(np.linalg.norm(own, axis=0), 1e-300))[0]
        self.residuals = residuals - self.own @ (self.own.T @ residuals)

    def of(self, places_hz: FloatArray, slopes: Slopes) -> tuple[FloatArray, FloatArray]:
        """What chi-square would fall by at each place, shape (m,), and the sizes of the columns there, shape (m, k)."""
        gains, sizes = [], []
        for first in range(0, len(places_hz), PLACES_AT_ONCE):
            some_hz = places_hz[first : first + PLACES_AT_ONCE]
            columns = slopes(np.asarray(1j * self.freq_hz / some_hz[:, np.newaxis], dtype=np.complex128))
            gain, size = self._explained(columns)
            gains.append(gain)
            sizes.append(size)
        return np.concatenate(gains), np.concatenate(sizes)

    def best_step(self) -> tuple[Factor, FloatArray] | None:
        """The range step that explains most."""
        count = len(self.freq_hz)
        after = np.arange(LEAST_SIDE, count - LEAST_SIDE)
        if not len(after):
            return None
        gains, sizes = [], []
        for first in range(0, len(after), PLACES_AT_ONCE):
            above = (np.arange(count) >= after[first : first + PLACES_AT_ONCE, np.newaxis]).astype(complex)
            gain, size = self._explained(np.stack([above, 1j * above], axis=-1))
            gains.append(gain)
            sizes.append(size)
        at = int(np.argmax(np.concatenate(gains)))
        edge_hz = float(np.sqrt(self.freq_hz[after[at] - 1] * self.freq_hz[after[at]]))
        return RangeStep(f_hz=edge_hz), np.concatenate(sizes)[at]

    def _explained(self, columns: ComplexArray) -> tuple[FloatArray, FloatArray]:
        """For columns of shape (m, n, k): fall of chi-square, shape (m,), and sizes, shape (m, k)."""
        changed = columns * self.per_change[:, np.newaxis]
        real = np.stack([changed.real, changed.imag], axis=2).reshape(len(columns), -1, columns.shape[-1])
        real = real - self.own @ (self.own.T @ real)
        square = np.einsum("mni,mnj->mij", real, real)
        # Where the model can do all by itself, nothing is left: a little is added so that no division fails.
        square = square + 1e-9 * np.einsum("mii->m", square)[:, np.newaxis, np.newaxis] * np.eye(columns.shape[-1])
        square = square + 1e-300 * np.eye(columns.shape[-1])
        along = -np.einsum("mni,n->mi", real, self.residuals)
        sizes = np.linalg.solve(square, along[..., np.newaxis])[..., 0]
        return np.einsum("mi,mi->m", along, sizes), sizes


def _blocks(values: Numbers, size: int) -> Numbers:
    """Means over blocks of `size` neighbours, what is left over at the end dropped."""
    if size == 1:
        return values
    whole = len(values) // size * size
    means: Numbers = values[:whole].reshape(-1, size).mean(axis=1)
    return means
