"""How repeats of one sweep differ: by one noise alone, or by a drift, or by the noise of one of them.

Everything is in e = 1/(1 + T), where the noise adds. Tests are of sums of squares over parts of the band, complex and
of unit variance under noise alone; as the variance is itself estimated, they are F tests.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.scatter import mean_without_glitches
from fitamp.noise import CONTRAST, FLOOR, variance_components
from fitamp.units import si

__all__ = ["Differences", "Drift", "drifts", "noisier_repeat"]

# False alarms in a set of clean repeats: any drift, and a repeat that is noisier than the others.
CHANCE_DRIFT, CHANCE_NOISIER = 0.01, 0.005
# A drift is looked for over parts of the band of this width, in which its phase hardly turns, with points enough.
PART_DECADES = 0.5
PART_POINTS = 6
# The noise levels come from the differences themselves, each from about this share of them.
SHARE_PER_LEVEL = 0.15
# Second differences of white noise are worth this many independent values each.
WORTH = 18 / 35
# A contrast of which no more than this is left was found already.
LEAST_LEFT = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class Drift:
    """Repeats that depart by more than noise: who, and where by how much."""

    choice: str
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Differences:
    """Deviations of each repeat's e from their mean.

    freq_hz, mean : shape (n,); deviations : shape (repeats, n)
    variance : of e in one repeat, shape (n,), from second differences of the deviations along frequency, in which
        neither the loop nor a slow drift is left
    second : squares of these in each repeat over their mean under one noise for all, shape (repeats, n − 2)
    """

    freq_hz: FloatArray
    mean: ComplexArray
    deviations: ComplexArray
    variance: FloatArray
    second: FloatArray

    @classmethod
    def of(
        cls, freq_hz: FloatArray, mean: ComplexArray, deviations: ComplexArray, parts: FloatArray, size: FloatArray
    ) -> Differences:
        """With the variance as a sum of `parts`, shape (n, 4), estimated in units of `size`, shape (n,)."""
        scaled = deviations / np.sqrt(size)
        second = np.array([np.convolve(row, CONTRAST, mode="valid") for row in scaled])
        observed = (np.abs(second) ** 2).sum(axis=0) / (len(deviations) - 1)
        columns = (parts / size[:, np.newaxis]).T
        design = np.stack([np.convolve(column, CONTRAST**2, mode="valid") for column in columns], axis=1)
        components = variance_components(observed, design) + np.array([0.0, 0.0, FLOOR**2, 0.0])
        count = len(deviations)
        return cls(
            freq_hz=freq_hz,
            mean=mean,
            deviations=deviations,
            variance=parts @ components,
            second=np.abs(second) ** 2 / (design @ components) / (1 - 1 / count),
        )

    def in_sigma(self) -> ComplexArray:
        """Deviations in standard deviations per component, shape (repeats, n)."""
        count = len(self.deviations)
        return np.asarray(self.deviations / np.sqrt(self.variance * (1 - 1 / count) / 2))


def drifts(differences: Differences, names: Sequence[str]) -> tuple[Drift, ...]:
    """Repeats that depart from the rest along the band, steps and a trend in their order, the strongest first.

    Each is a contrast v between repeats; in each part of the band the mean of vᵀz/√(vᵀPv), z the deviations over their
    standard deviation, is a complex normal variable, where P takes out the mean and what was found already. Found are
    contrasts whose sum of squares over all parts, or square in one, is beyond the F distribution's quantile.
    """
    count = len(names)
    parts = band_parts(differences.freq_hz)
    whitened = differences.deviations / np.sqrt(differences.variance)
    means = np.stack([whitened[:, part].sum(axis=1) / np.sqrt(len(part)) for part in parts], axis=1)
    degrees = SHARE_PER_LEVEL * len(differences.freq_hz) * (count - 1)
    contrasts = _contrasts_between(names)
    # Half the chance for the whole band, half for a part of it.
    chance = CHANCE_DRIFT / 2 / len(contrasts)
    found: list[Drift] = []
    projector = np.eye(count) - 1 / count
    for _ in range(count - 1):
        best, squares = None, np.zeros(len(parts))
        for contrast in contrasts:
            left = float(contrast.vector @ projector @ contrast.vector)
            if left < LEAST_LEFT:
                continue
            sums = np.abs(contrast.vector @ projector @ means) ** 2 / left
            if sums.sum() > squares.sum() * (1 + 1e-9):
                best, squares = contrast, sums
        if best is None or not _beyond(squares, degrees, chance):
            break
        direction = projector @ best.vector / np.sqrt(best.vector @ projector @ best.vector)
        part = parts[int(np.argmax(squares))]
        found.append(_drift(differences, best, direction, part=part, sigma=float(np.sqrt(2 * squares.max()))))
        projector = projector - np.outer(direction, direction)
    return tuple(found)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Contrast:
    """A way in which repeats may differ, shape (repeats,), in units of the change that `choice` speaks of."""

    choice: str
    vector: FloatArray


def _contrasts_between(names: Sequence[str]) -> list[_Contrast]:
    count = len(names)
    if count == 2:
        return [_Contrast(choice=f"{names[1]} departs from {names[0]}", vector=np.array([0.0, 1.0]))]
    singles = [
        _Contrast(choice=f"{name} departs from the others", vector=vector)
        for name, vector in zip(names, np.eye(count), strict=True)
    ]
    # One at an end is a step, too.
    steps = [
        _Contrast(
            choice=f"a step between {names[index - 1]} and {names[index]}",
            vector=(np.arange(count) >= index).astype(float),
        )
        for index in range(2, count - 1)
    ]
    trend = _Contrast(choice=f"a trend from {names[0]} to {names[-1]}", vector=np.linspace(0.0, 1.0, count))
    return [*singles, *steps, trend]


def _beyond(squares: FloatArray, degrees: float, chance: float) -> bool:
    from scipy.special import fdtrc

    count = len(squares)
    over_all = fdtrc(2 * count, 2 * degrees, squares.mean())
    in_one = count * fdtrc(2, 2 * degrees, squares.max())
    return bool(min(over_all, in_one) < chance)


def _drift(
    differences: Differences, contrast: _Contrast, direction: FloatArray, *, part: np.ndarray, sigma: float
) -> Drift:
    """Say who departs, where most, by how many standard errors, and how much that is of the loop gain."""
    band = f"from {si(float(differences.freq_hz[part[0]]), 'Hz')} to {si(float(differences.freq_hz[part[-1]]), 'Hz')}"
    # d ln T = −de/(e (1 − e)).
    slope = differences.mean[part] * (1 - differences.mean[part])
    departure = direction @ differences.deviations[:, part] / (direction @ contrast.vector)
    weights = np.conj(slope) / differences.variance[part]
    change = -complex((weights * departure).sum() / (weights * slope).sum())
    return Drift(
        choice=contrast.choice,
        reason=f"most {band}, by {sigma:.0f} standard errors: loop gain {_as_percent(change)}; the intervals hold no "
        "drift: leave out what is not a repeat, or let the part settle",
    )


def _as_percent(change: complex) -> str:
    text = f"{100 * change.real:+.2g} % in magnitude, {np.degrees(change.imag):+.2g}° in phase"
    return text.replace("-", "−")


def band_parts(freq_hz: FloatArray) -> list[np.ndarray]:
    """Indices of the parts of the band, each with some points."""
    place = np.floor(np.log10(freq_hz / freq_hz[0]) / PART_DECADES)
    parts: list[np.ndarray] = []
    for part in np.split(np.arange(len(freq_hz)), np.flatnonzero(np.diff(place)) + 1):
        if parts and len(parts[-1]) < PART_POINTS:
            parts[-1] = np.concatenate([parts[-1], part])
        else:
            parts.append(part)
    if len(parts) > 1 and len(parts[-1]) < PART_POINTS:
        last = parts.pop()
        parts[-1] = np.concatenate([parts[-1], last])
    return parts


def noisier_repeat(differences: Differences, names: Sequence[str]) -> Drift | None:
    """The repeat whose scatter along frequency is beyond that of the others, where there are others to tell by.

    An F test of second differences of its deviations against those of the rest.
    """
    from scipy.special import fdtrc

    count = len(names)
    if count < 3:
        return None
    own = np.array([mean_without_glitches(squares) for squares in differences.second])
    worst = int(np.argmax(own))
    rest = float(np.delete(own, worst).mean())
    degrees = 2 * WORTH * differences.second.shape[1]
    if fdtrc(degrees, (count - 1) * degrees, own[worst] / rest) * count > CHANCE_NOISIER:
        return None
    # Deviations from the mean hold some of every repeat: (1 − 1/K)² of the own variance and 1/K² of each other one.
    share, other = (1 - 1 / count) ** 2, 1 / count**2
    mixing = np.array([[share, (count - 1) * other], [other, share + (count - 2) * other]])
    noisy, quiet = np.linalg.solve(mixing, [own[worst], rest])
    times = f"{np.sqrt(noisy / quiet):.2g} times" if quiet > 0 else "many times"
    return Drift(
        choice=f"{names[worst]} is noisier",
        reason=f"taken over the band, it scatters from point to point {times} as much as the others do; leave it out, "
        "or take it with the same settings",
    )
