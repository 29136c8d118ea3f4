"""Repeats of one sweep to their average, with the noise that their differences show.

Loop gain is a ratio with a noisy denominator: its average is not the loop gain where the error channel drowns. The
noise adds in the closed loop instead. With drive 1 and e = 1/(1 + T) the receivers read E = e + n_e and
R = 1 − e + n_r, so

    1/(1 + T_meas) = E/(E + R) = (e + n_e)/(1 + n_e + n_r) = e + (1 − e) n_e − e n_r + O(n²)

however small e is: what is left of a bias is of the order n², against n²/e² for T. So e is averaged in the complex
plane, and T = 1/ē − 1. The loop equation (T − M)/(1 + T) = 1 − e (1 + M) is linear in e, too: fitting the average is
fitting all repeats (J. Schoukens, R. Pintelon and Y. Rolain, "Broadband versus stepped sine FRF measurements", IEEE
Trans. Instrum. Meas. 49, 2000, on averaging ratios; from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.drift import Differences, drifts, noisier_repeat
from fitamp.conditioning.scatter import scatter_of_mean
from fitamp.conditioning.spurs import MOST_SHARE, find_spurs
from fitamp.errors import SweepError, UsageError
from fitamp.noise import FLOOR, variance_components
from fitamp.sweep import Concern, Decision, LeftOut, NoiseLevels, Origin, Sweep

__all__ = ["SAME_FREQUENCY_RTOL", "average_repeats"]

# Two files that round one frequency differently, at six digits or more, still mean the same.
SAME_FREQUENCY_RTOL = 2e-6
# As for a fit: four noise levels, and something left to judge by.
MIN_POINTS = 12
# Topics of what is said about repeats.
DRIFT, NOISE = "drift of repeats", "noise of repeats"
# So many names are written out.
MOST_NAMES = 3


def average_repeats(sweeps: Sequence[Sweep], *, noise: NoiseLevels | None = None, keep_all: bool = False) -> Sweep:
    """Average sweeps of the same loop, taken one after another at the same frequencies and settings.

    Parameters
    ----------
    sweeps
        In the order in which they were taken, so that a trend can be told. One alone is returned as it is.
    noise
        Noise levels of one sweep where they are known; those of the average are less by the square root of the number
        of repeats. Otherwise they are estimated from the differences between repeats.
    keep_all
        Keep points at which one repeat stands apart from the others (a glitch). Otherwise they are left out, and
        listed with the repeat's name.

    Returns
    -------
    Sweep
        T = 1/ē − 1 with ē the mean of 1/(1 + T). ``left_out`` lists what is left out of any repeat: the noise levels
        are those of one number of repeats at every frequency. ``decisions`` name repeats that drifted (in 1 % of sets
        of clean repeats, too), one that is noisier (in 0.5 %), and say where repeats and the scatter along frequency
        contradict each other (in 1 %); then ``noise`` is None where the scatter is the larger, and a fit estimates it.

    Raises
    ------
    SweepError
        When frequencies or signs differ, one sweep is there twice, or a loop gain is exactly −1.
    UsageError
        When there is no sweep.
    """
    if not sweeps:
        raise UsageError("average_repeats takes one sweep or more, but got none")
    if len(sweeps) == 1:
        return sweeps[0] if noise is None else replace(sweeps[0], noise=noise)
    names = _names(sweeps)
    _check(sweeps, names)
    stack, left_out = _aligned(sweeps, names)
    if not keep_all:
        stack, glitches = _without_glitches(stack)
        left_out += glitches
    count = len(sweeps)
    average = Sweep(
        freq_hz=stack.freq_hz,
        gain=1 / stack.mean - 1,
        noise=None if noise is None else _over_root(noise, count, f"given, for the mean of {count} repeats"),
        origin=Origin(
            file=f"average of {_listed(names)}", form="average", averaged=tuple(sweep.origin for sweep in sweeps)
        ),
        sign=sweeps[0].sign,
        decisions=(*_shared(sweeps), _decision(names)),
        left_out=tuple(sorted(left_out, key=lambda point: point.f_hz)),
    )
    return _with_noise(average, stack)


def _with_noise(average: Sweep, stack: _Stack) -> Sweep:
    """The average with noise from the differences between repeats, unless it is given, and what these say."""
    if len(average) < MIN_POINTS:
        return average
    count = len(stack.names)
    differences = stack.differences()
    found = drifts(differences, stack.names)
    for drift in found:
        average = average.with_decision(DRIFT, drift.choice, drift.reason, concern=Concern.CAUTION)
    noisier = noisier_repeat(differences, stack.names)
    if noisier is not None:
        average = average.with_decision(NOISE, noisier.choice, noisier.reason, concern=Concern.CAUTION)
    if average.noise is not None:
        return average
    levels = _levels(stack, count)
    against = scatter_of_mean(stack.freq_hz, stack.mean, stack.variance(levels), count)
    # That repeats differ by more than scatter is news only where no drift says so.
    if against is not None and (against.too_small or not found):
        average = average.with_decision(NOISE, against.choice, against.reason, concern=Concern.CAUTION)
    return average if against is not None and against.too_small else replace(average, noise=levels)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Stack:
    """Repeats on one axis: freq_hz, shape (n,), and closed = 1/(1 + T), shape (repeats, n)."""

    names: tuple[str, ...]
    freq_hz: FloatArray
    closed: ComplexArray

    @property
    def mean(self) -> ComplexArray:
        return np.asarray(self.closed.mean(axis=0))

    @property
    def size(self) -> FloatArray:
        """|e|² + |1 − e|², by which variances are divided, so that a peak of the closed loop does not rule them."""
        return np.asarray(np.abs(self.mean) ** 2 + np.abs(1 - self.mean) ** 2)

    @property
    def parts(self) -> FloatArray:
        """Variance of e for a unit of n_r², n_e², rel² and ratio², shape (n, 4)."""
        error, through = np.abs(self.mean) ** 2, np.abs(1 - self.mean) ** 2
        return np.stack([error, through, error * through, error**2], axis=1)

    def variance(self, levels: NoiseLevels) -> FloatArray:
        squares = np.array([levels.return_channel, levels.error_channel, levels.relative, levels.ratio]) ** 2
        return np.asarray(self.parts @ squares)

    def differences(self) -> Differences:
        """Deviations from the mean, with the noise of one repeat that no slow drift can swell."""
        return Differences.of(self.freq_hz, self.mean, self.closed - self.mean, self.parts, self.size)

    def without(self, keep: NDArray[np.bool_]) -> _Stack:
        return replace(self, freq_hz=self.freq_hz[keep], closed=self.closed[:, keep])


def _levels(stack: _Stack, count: int) -> NoiseLevels:
    """Levels of the average: each point's scatter among repeats is a Gamma variable of shape `count` − 1."""
    observed = (np.abs(stack.closed - stack.mean) ** 2).sum(axis=0) / (count - 1)
    variances = variance_components(observed / stack.size, stack.parts / stack.size[:, np.newaxis])
    n_return, n_error, relative, ratio = np.sqrt(variances)
    single = NoiseLevels(
        error_channel=float(n_error),
        return_channel=float(n_return),
        relative=float(np.hypot(relative, FLOOR)),
        ratio=float(ratio),
    )
    return replace(_over_root(single, count, f"from {count} repeats"), repeats=count)


def _over_root(noise: NoiseLevels, count: int, source: str) -> NoiseLevels:
    return NoiseLevels(
        error_channel=noise.error_channel / count**0.5,
        return_channel=noise.return_channel / count**0.5,
        relative=noise.relative / count**0.5,
        ratio=noise.ratio / count**0.5,
        source=source,
    )


def _without_glitches(stack: _Stack) -> tuple[_Stack, list[LeftOut]]:
    """The repeats without the points at which one of them stands apart from its neighbours and from the others."""
    if len(stack.freq_hz) < MIN_POINTS:
        return stack, []
    count = len(stack.names)
    apart = stack.differences().in_sigma()
    reasons: dict[int, str] = {}
    # The repeat farthest off is the one to blame; the others stand apart from the mean only by its share in it.
    for repeat, residuals in enumerate(apart):
        for spur in find_spurs(stack.freq_hz, residuals):
            worst = int(np.argmax(np.abs(apart[:, spur.index])))
            name = f"{stack.names[0]} or {stack.names[1]}" if count == 2 else stack.names[worst]
            if repeat == worst or spur.index not in reasons:
                reasons[spur.index] = f"{name}: {spur.reason}"
    if not reasons or len(reasons) > MOST_SHARE * len(stack.freq_hz):
        return stack, []
    gone = sorted(reasons)
    left_out = [
        LeftOut(f_hz=float(stack.freq_hz[i]), gain=complex(1 / stack.mean[i] - 1), reason=reasons[i]) for i in gone
    ]
    return stack.without(~np.isin(np.arange(len(stack.freq_hz)), gone)), left_out


def _check(sweeps: Sequence[Sweep], names: Sequence[str]) -> None:
    first = sweeps[0]
    for name, sweep in zip(names[1:], sweeps[1:], strict=True):
        if sweep.sign is not first.sign:
            raise SweepError(
                f"{name}: its sign is {sweep.sign.value}, that of {names[0]} {first.sign.value}; repeats of one "
                "setting have one sign: give --sign, or leave the file out"
            )
    for name, sweep in zip(names, sweeps, strict=True):
        if (sweep.gain == -1).any():
            raise SweepError(
                f"{name}: loop gain is exactly -1 at {sweep.freq_hz[np.argmax(sweep.gain == -1)]:g} Hz, where the "
                "closed loop has no value; leave the point out"
            )
    for later in range(1, len(sweeps)):
        for earlier in range(later):
            if np.array_equal(sweeps[earlier].gain, sweeps[later].gain):
                raise SweepError(
                    f"{names[later]}: holds the very numbers of {names[earlier]}, so it is no repeat; name each once"
                )


def _aligned(sweeps: Sequence[Sweep], names: tuple[str, ...]) -> tuple[_Stack, list[LeftOut]]:
    """The points that all repeats have; those that one of them leaves out are left out of all."""
    gone_hz = np.array([point.f_hz for sweep in sweeps for point in sweep.left_out])
    rest = [sweep.without(~_is_in(sweep.freq_hz, gone_hz), "") for sweep in sweeps if not _all_gone(sweep, gone_hz)]
    if len(rest) < len(sweeps):
        raise SweepError(f"{names[0]}: no frequency is in all repeats; average fewer of them")
    for name, sweep in zip(names[1:], rest[1:], strict=True):
        _check_frequencies(rest[0].freq_hz, names[0], sweep.freq_hz, name)
    closed = np.stack([1 / (1 + sweep.gain) for sweep in rest])
    if not closed.mean(axis=0).all():
        raise SweepError(f"{names[0]}: the repeats cancel; check that the columns hold loop gain")
    left_out: list[LeftOut] = []
    for name, sweep in zip(names, sweeps, strict=True):
        for point in sweep.left_out:
            if not _is_in(np.array([point.f_hz]), np.array([other.f_hz for other in left_out])).any():
                left_out.append(replace(point, reason=f"{name}: {point.reason}"))
    return _Stack(names=names, freq_hz=rest[0].freq_hz, closed=closed), left_out


def _all_gone(sweep: Sweep, gone_hz: FloatArray) -> bool:
    return bool(_is_in(sweep.freq_hz, gone_hz).all())


def _is_in(freq_hz: FloatArray, others_hz: FloatArray) -> NDArray[np.bool_]:
    """Whether each frequency is among the others, as far as files write it."""
    same = np.isclose(freq_hz[:, np.newaxis], others_hz[np.newaxis], rtol=SAME_FREQUENCY_RTOL, atol=0.0)
    return np.asarray(same.any(axis=1))


def _check_frequencies(first_hz: FloatArray, first: str, freq_hz: FloatArray, name: str) -> None:
    shared = min(len(first_hz), len(freq_hz))
    differ = ~np.isclose(freq_hz[:shared], first_hz[:shared], rtol=SAME_FREQUENCY_RTOL, atol=0.0)
    if differ.any():
        index = int(np.argmax(differ))
        raise SweepError(
            f"{name}: point {index + 1} is at {freq_hz[index]:g} Hz, but that of {first} at {first_hz[index]:g} Hz; "
            "repeats have the same frequencies"
        )
    if len(first_hz) != len(freq_hz):
        raise SweepError(
            f"{name}: {len(freq_hz)} points, but {first} has {len(first_hz)}; repeats have the same frequencies"
        )


def _names(sweeps: Sequence[Sweep]) -> tuple[str, ...]:
    files = [sweep.origin.file for sweep in sweeps]
    if len(set(files)) == len(files):
        return tuple(files)
    return tuple(f"repeat {number} of {file}" for number, file in enumerate(files, start=1))


def _listed(names: Sequence[str]) -> str:
    if len(names) <= MOST_NAMES:
        return f"{', '.join(names[:-1])} and {names[-1]}"
    return f"{names[0]} and {len(names) - 1} more"


def _shared(sweeps: Sequence[Sweep]) -> tuple[Decision, ...]:
    """What was decided alike in all repeats, with the reason seen in the first."""
    chosen = [{(decision.topic, decision.choice) for decision in sweep.decisions} for sweep in sweeps[1:]]
    return tuple(d for d in sweeps[0].decisions if all((d.topic, d.choice) in others for others in chosen))


def _decision(names: Sequence[str]) -> Decision:
    return Decision(
        topic="repeats",
        choice=f"average of {len(names)}",
        reason=f"{', '.join(names)}; averaged in 1/(1 + T), where the receivers' noise adds",
        concern=Concern.RESULT,
    )
