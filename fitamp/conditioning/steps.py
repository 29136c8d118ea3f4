"""Range steps of a sweep: from one frequency on, the receiver reads every loop gain times another constant.

A receiver that changes its range in mid-sweep has another gain there, by hundredths of a decibel or a few degrees; in
either channel it multiplies the measured loop gain. Nothing in a loop does that: what a loop has is smooth along the
frequency, or comes back within a few points.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import NoiseLevels

__all__ = ["LEAST_SIDE", "RangeStep", "find_range_steps", "step_at"]

# Points on each side of a gap that are looked at: within a factor e^SPAN in frequency, but so many at least and most.
# What is smooth over that factor is a cubic; fewer points cannot tell a step from a bend of the band's end.
SPAN = 1.15
LEAST_SIDE, MOST_SIDE = 5, 32
DEGREE = 3
# False alarms in a clean sweep, over all its gaps.
CHANCE = 0.002
# ln odds by which a step has to explain the points better than any spur or resonance nearby does.
CLEARLY_BETTER = 8.0
# Such a resonance: widths in points, and how finely its place is varied.
WIDTHS = (0.0, 0.5, 1.0, 2.0, 4.0)
PLACE_STEP = 0.25
# A place so near a point, in points, is a spur there.
ON_A_POINT = 0.05
# Of a sweep with more steps than this the receiver is not to be trusted anyway.
MOST_STEPS = 4
# Gaps with a possible step that are looked at closely.
MOST_CANDIDATES = 8
DB_PER_NEPER = 20 / math.log(10)


@dataclass(frozen=True, slots=True, kw_only=True)
class RangeStep:
    """A step between two neighbours of a sweep.

    index : last point before the step; the measured loop gain is multiplied by `factor` from index + 1 on
    f_hz : between the two points (their geometric mean)
    ln_ratio : ln of the factor; nepers and radians
    stderr : standard error of its real and of its imaginary part
    """

    index: int
    f_hz: float
    ln_ratio: complex
    stderr: float

    @property
    def factor(self) -> complex:
        """By what the loop gain beyond the step is multiplied."""
        return complex(np.exp(self.ln_ratio))

    @property
    def db(self) -> float:
        """Step of the magnitude in decibels, upward positive."""
        return DB_PER_NEPER * self.ln_ratio.real

    @property
    def db_stderr(self) -> float:
        """Standard error of `db`."""
        return DB_PER_NEPER * self.stderr

    @property
    def deg(self) -> float:
        """Step of the phase in degrees."""
        return math.degrees(self.ln_ratio.imag)

    @property
    def deg_stderr(self) -> float:
        """Standard error of `deg`."""
        return math.degrees(self.stderr)

    @property
    def significance(self) -> float:
        """Size of the step over its standard error."""
        return abs(self.ln_ratio) / self.stderr


def find_range_steps(
    freq_hz: FloatArray, gain: ComplexArray, model_gain: ComplexArray, noise: NoiseLevels
) -> tuple[RangeStep, ...]:
    """Places where the loop gain steps by a constant complex factor, and by how much.

    Parameters
    ----------
    freq_hz : shape (n,)
        Rising.
    gain : shape (n,)
        Measured loop gain; bad points should be out of it (`fitamp.conditioning.spurs`).
    model_gain : shape (n,)
        Loop gain of a current model. It may be wrong but must be smooth: without resonances of its own that only stand
        for the step.
    noise
        As estimated from the sweep about that model, or known.

    Returns
    -------
    tuple of RangeStep
        By rising frequency; empty for a sweep without steps, or with fewer than 10 points. Their sizes are starting
        values: a fit of all points knows them better.

    Notes
    -----
    About every gap a cubic in ln f, and a step on top of it, are fitted to ln(gain/model) by weighted least squares.
    The step's share in chi-square over the scatter that remains is a ratio of exponential means with the tail
    (1 + t/ν)^(−ν), as in analysis of variance; t is chosen so that all gaps together exceed it in `CHANCE` of clean
    sweeps. A step must besides explain the points better, by a factor e^8 in likelihood, than a single bad point or a
    pole-zero pair of any width close by, in its place.

    Not seen are steps within 5 points of either end, those drowned in the receivers' floors (where ln(gain/model)
    scatters by more than about a quarter of the step), and those beside a resonance that the model lacks.
    """
    if len(freq_hz) < 2 * LEAST_SIDE:
        return ()
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        ln_ratio, sd = _ln_ratio(gain, model_gain, noise)
    usable = np.isfinite(ln_ratio) & np.isfinite(sd) & (sd > 0)
    if not usable.all():
        rest = np.flatnonzero(usable)
        found = find_range_steps(freq_hz[rest], gain[rest], model_gain[rest], noise)
        return tuple(replace(step, index=int(rest[step.index])) for step in found)
    steps: list[RangeStep] = []
    while len(steps) < MOST_STEPS:
        step = _clearest(freq_hz, ln_ratio, sd)
        if step is None:
            break
        steps.append(step)
        ln_ratio = ln_ratio - np.where(np.arange(len(ln_ratio)) > step.index, step.ln_ratio, 0.0)
    return tuple(sorted(steps, key=lambda step: step.index))


def step_at(
    f_hz: float, freq_hz: FloatArray, gain: ComplexArray, model_gain: ComplexArray, noise: NoiseLevels
) -> RangeStep | None:
    """The step that the points nearby show in the gap at `f_hz`, large or small; None near an end of the band.

    For those who know the place from elsewhere: then three standard errors are no chance, where a search among all gaps
    has to ask for more.
    """
    ln_ratio, sd = _ln_ratio(gain, model_gain, noise)
    if len(freq_hz) < 2 * LEAST_SIDE:
        return None
    windows = _Windows.about_gaps(np.log(freq_hz))
    gap = int(np.searchsorted(freq_hz, f_hz)) - 1 - int(windows.before[0])
    if not 0 <= gap < len(windows.before):
        return None
    size, stderr, _ = _steps_at_gaps(windows.only(gap), ln_ratio, sd)
    index = int(windows.before[gap])
    return RangeStep(
        index=index,
        f_hz=float(np.sqrt(freq_hz[index] * freq_hz[index + 1])),
        ln_ratio=complex(size[0]),
        stderr=float(stderr[0]),
    )


def _ln_ratio(gain: ComplexArray, model_gain: ComplexArray, noise: NoiseLevels) -> tuple[ComplexArray, FloatArray]:
    """ln(gain/model), and its standard deviation per component by the loop equation."""
    size, through = np.abs(model_gain), np.abs(1 + model_gain)
    variance = (
        noise.return_channel**2
        + (size * noise.error_channel) ** 2
        + (size / through * noise.relative) ** 2
        + (noise.ratio / through) ** 2
    )
    return np.log(gain / model_gain), np.sqrt(variance / 2) * through / size


def _clearest(freq_hz: FloatArray, ln_ratio: ComplexArray, sd: FloatArray) -> RangeStep | None:
    """The step that stands out most among those that are steps and nothing else."""
    windows = _Windows.about_gaps(np.log(freq_hz))
    size, stderr, apart = _steps_at_gaps(windows, ln_ratio, sd)
    # A step is seen in the gaps beside its own, too.
    peaks = np.flatnonzero((apart > 1) & (apart >= np.roll(apart, 1)) & (apart >= np.roll(apart, -1)))
    for gap in peaks[np.argsort(-apart[peaks])][:MOST_CANDIDATES]:
        if _is_step(windows, int(gap), ln_ratio, sd):
            index = int(windows.before[gap])
            return RangeStep(
                index=index,
                f_hz=float(np.sqrt(freq_hz[index] * freq_hz[index + 1])),
                ln_ratio=complex(size[gap]),
                stderr=float(stderr[gap]),
            )
    return None


@dataclass(frozen=True, slots=True, kw_only=True)
class _Windows:
    """The points about each of m gaps, padded to one width w.

    before : shape (m,), the point before the gap
    points : shape (m, w), indices; `used` says which are no padding
    place : shape (m, w), distance from the gap's middle in ln f
    beyond : shape (w,), 1 for points after the gap
    """

    before: np.ndarray
    points: np.ndarray
    used: np.ndarray
    place: FloatArray
    beyond: FloatArray

    @classmethod
    def about_gaps(cls, ln_f: FloatArray) -> _Windows:
        before = np.arange(LEAST_SIDE - 1, len(ln_f) - LEAST_SIDE)
        middle = (ln_f[before] + ln_f[before + 1]) / 2
        reach = np.maximum(
            np.searchsorted(ln_f, middle + SPAN) - before - 1, before + 1 - np.searchsorted(ln_f, middle - SPAN)
        )
        side = int(np.clip(reach.max(), LEAST_SIDE, MOST_SIDE))
        offsets = np.arange(1 - side, side + 1)
        points = before[:, np.newaxis] + offsets
        place = ln_f[np.clip(points, 0, len(ln_f) - 1)] - middle[:, np.newaxis]
        near = (np.abs(place) <= SPAN) | ((offsets > -LEAST_SIDE) & (offsets <= LEAST_SIDE))
        return cls(
            before=before,
            points=np.clip(points, 0, len(ln_f) - 1),
            used=near & (points >= 0) & (points < len(ln_f)),
            place=place,
            beyond=(offsets > 0).astype(float),
        )

    def only(self, gap: int) -> _Windows:
        """The points about one gap."""
        rows = slice(gap, gap + 1)
        return replace(
            self, before=self.before[rows], points=self.points[rows], used=self.used[rows], place=self.place[rows]
        )


def _powers(place: FloatArray, used: np.ndarray) -> FloatArray:
    """1, u, … u^DEGREE with u from −1 to 1 over the used points; the last axis counts the powers."""
    reach = np.where(used, np.abs(place), 0.0).max(axis=-1, keepdims=True)
    return np.asarray((place / reach)[..., np.newaxis] ** np.arange(DEGREE + 1))


def _steps_at_gaps(
    windows: _Windows, ln_ratio: ComplexArray, sd: FloatArray
) -> tuple[ComplexArray, FloatArray, FloatArray]:
    """Step at each gap, its standard error per component, and how far it stands out, 1 being the threshold."""
    weight = windows.used / sd[windows.points]
    beyond = np.broadcast_to(windows.beyond, weight.shape)[..., np.newaxis]
    columns = np.concatenate([_powers(windows.place, windows.used), beyond], axis=2) * weight[..., np.newaxis]
    values = ln_ratio[windows.points] * weight
    transposed = columns.transpose(0, 2, 1)
    covariance = np.linalg.inv(transposed @ columns)
    fitted = covariance @ (transposed @ values[..., np.newaxis])
    left = values - (columns @ fitted)[..., 0]
    step, variance = fitted[:, -1, 0], covariance[:, -1, -1]
    degrees = windows.used.sum(axis=1) - columns.shape[2]
    # Half the squares of complex values in standard deviations per component are exponential with mean 1.
    scatter = np.maximum((np.abs(left) ** 2).sum(axis=1) / 2 / degrees, 1.0)
    share = np.abs(step) ** 2 / 2 / variance / scatter
    threshold = degrees * np.expm1(math.log(len(ln_ratio) / CHANCE) / degrees)
    return step, np.sqrt(variance * scatter), share / threshold


def _is_step(windows: _Windows, gap: int, ln_ratio: ComplexArray, sd: FloatArray) -> bool:
    """Whether a step explains the points about a gap better than a spur or a resonance in its place."""
    used = windows.used[gap]
    points, place = windows.points[gap][used], windows.place[gap][used]
    weight = 1 / sd[points]
    smooth, _ = np.linalg.qr(_powers(place, np.ones(len(place), dtype=bool)) * weight[:, np.newaxis])

    def without_smooth(columns: ComplexArray) -> ComplexArray:
        weighted = columns * weight[:, np.newaxis]
        return np.asarray(weighted - smooth @ (smooth.T @ weighted))

    values = without_smooth(ln_ratio[points][:, np.newaxis])[:, 0]
    shapes = [windows.beyond[used].astype(complex)[:, np.newaxis], np.eye(len(points), dtype=complex)]
    shapes.append(_resonances(place))
    shape = without_smooth(np.concatenate(shapes, axis=1))
    size = (np.abs(shape) ** 2).sum(axis=0)
    shares = np.abs(shape.conj().T @ values) ** 2 / 2 / np.maximum(size, np.finfo(float).tiny)
    degrees = len(points) - smooth.shape[1] - 1
    left = float((np.abs(values) ** 2).sum()) / 2 - shares[0]
    return bool((shares[0] - shares[1:].max()) / max(left / degrees, 1.0) > CLEARLY_BETTER)


def _resonances(place: FloatArray) -> ComplexArray:
    """Pole-zero pairs as they look in ln(gain) about a gap, shape (points, shapes): one over the distance from each."""
    spacing = 2 * float(place[place > 0][0])
    at = np.arange(place[0] / spacing, place[-1] / spacing, PLACE_STEP)
    poles = (at[:, np.newaxis] + 1j * np.array(WIDTHS)).ravel()
    distance = place[:, np.newaxis] / spacing - poles
    return np.asarray(1 / distance[:, np.abs(distance).min(axis=0) > ON_A_POINT])
