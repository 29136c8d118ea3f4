"""Through sweeps: both receivers on the same node, so that what is read is the bench's own path between them.

Ideally that is 1·e^(−sτ), with τ the delay by which the return path is longer. The same delay is in every loop gain
read with these cables, where it passes for a right-half-plane zero; from a through sweep it is known.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.conditioning.drift import WORTH, band_parts
from fitamp.conditioning.path import NOISE_WINDOW, PathFit, fitted_path
from fitamp.conditioning.spurs import without_spurs
from fitamp.errors import SweepError
from fitamp.sweep import LeftOut, Sweep
from fitamp.units import si, si_with_error, to_db

__all__ = ["Departure", "DepartureKind", "ThroughDelay", "divided_by_through", "through_delay"]

MIN_POINTS = 12
# Cables, probes and their connectors lose less; what departs from 1 by more is a loop gain, or another trace.
FAR_DB = 20.0
# False alarms on a clean through sweep, in each of gain, flatness and phase.
CHANCE = 0.003
# A phase that scatters so much about the best delay, in radians, follows none.
LOST_PHASE = 1.0
# Below this scatter a sweep was computed, and what stands apart is arithmetic.
COMPUTED = 1e-9
# Two files may round the ends of one band differently.
SAME_FREQUENCY_RTOL = 2e-6


class DepartureKind(StrEnum):
    """In what a through sweep is not 1·e^(−sτ)."""

    GAIN = "gain"  # in dB, all over
    MAGNITUDE = "magnitude"  # in dB, in a part of the band against the rest
    PHASE = "phase"  # in degrees, in a part of the band against the delay


@dataclass(frozen=True, slots=True, kw_only=True)
class Departure:
    """A departure beyond noise: from where to where along the band, by how much, by how many standard errors."""

    kind: DepartureKind
    f_min_hz: float
    f_max_hz: float
    amount: float
    sigma: float

    def __str__(self) -> str:
        unit = "°" if self.kind is DepartureKind.PHASE else " dB"
        size = f"{self.kind.value} {self.amount:+.2g}{unit}".replace("-", "−")
        band = f"from {si(self.f_min_hz, 'Hz')} to {si(self.f_max_hz, 'Hz')}"
        where = "all over, and so in T(0)" if self.kind is DepartureKind.GAIN else band
        return f"{size} {where} ({self.sigma:.0f} standard errors)"


@dataclass(frozen=True, slots=True, kw_only=True)
class ThroughDelay:
    """The path delay as a through sweep shows it.

    delay_s, stderr_s : delay of the return path against the error path, and its standard error; below 0 where the
        error path is the longer
    gain : ratio of the receivers at DC; near −1 for an inverting read-out
    scatter : noise of the sweep relative to its gain, complex standard deviation, root mean square over the band
    departures : in what it is no pure delay; the standard error is widened for those of the phase
    left_out : points that stand apart from their neighbours
    """

    file: str
    sha256: str | None
    f_min_hz: float
    f_max_hz: float
    points: int
    delay_s: float
    stderr_s: float
    gain: float
    scatter: float
    departures: tuple[Departure, ...]
    left_out: tuple[LeftOut, ...]

    @property
    def is_pure_delay(self) -> bool:
        """Whether nothing departs from 1·e^(−sτ) beyond noise."""
        return not self.departures

    @property
    def sentence(self) -> str:
        """In what it is no pure delay, in one line."""
        if self.is_pure_delay:
            return "flat, and a pure delay, within its noise"
        return f"departs from a pure delay: {', '.join(map(str, self.departures))}"

    def __str__(self) -> str:
        return f"delay {si_with_error(self.delay_s, self.stderr_s, 's')}, measured with a through sweep {self.file}"


def through_delay(sweep: Sweep) -> ThroughDelay:
    """The delay of the path between the receivers, from a sweep with both on the same node.

    The record is fitted by A e^(−jωτ), A real, in the complex plane and weighted by its own local scatter. Where its
    phase is no pure delay, the standard error is widened by how much and how far along the band neighbours err alike.

    Parameters
    ----------
    sweep
        At least 12 points, return over error; its sign does not matter.

    Returns
    -------
    ThroughDelay

    Raises
    ------
    SweepError
        When there are too few points, the magnitude is more than 20 dB away from 1 or changes by more along the band,
        or the phase follows no delay.
    """
    if len(sweep) < MIN_POINTS:
        raise SweepError(f"{sweep.origin.file}: {len(sweep)} points, a through sweep needs {MIN_POINTS} or more")
    _check_magnitude(sweep)
    path = fitted_path(sweep)
    rest = sweep
    if path.scatter.max() > COMPUTED:
        rest = without_spurs(sweep, path.residuals / path.scatter * np.sqrt(2))
        path = fitted_path(rest)
    weights = 1 / path.scatter**2
    phase_error = float(np.sqrt(np.average(np.angle(1 + path.residuals) ** 2, weights=weights)))
    if phase_error > LOST_PHASE:
        raise _no_through(sweep, f"its phase follows no delay (it misses the best by {np.degrees(phase_error):.0f}°)")
    departures = _departures(path)
    # The scatter is that of so many points: the standard deviation of Student's t.
    degrees = 2 * WORTH * min(NOISE_WINDOW, len(rest) - 2)
    delay_stderr_s = path.delay_stderr_s * np.sqrt(degrees / (degrees - 2))
    if any(departure.kind is DepartureKind.PHASE for departure in departures):
        delay_stderr_s *= np.sqrt(_inflation(path.rows[1], path.freq_hz / path.scatter))
    return ThroughDelay(
        file=sweep.origin.file,
        sha256=sweep.origin.sha256,
        f_min_hz=sweep.f_min_hz,
        f_max_hz=sweep.f_max_hz,
        points=len(rest),
        delay_s=path.delay_s,
        stderr_s=float(delay_stderr_s),
        gain=path.gain,
        scatter=float(np.sqrt(np.mean(path.scatter**2))),
        departures=departures,
        left_out=rest.left_out[len(sweep.left_out) :],
    )


def divided_by_through(sweep: Sweep, through: Sweep) -> Sweep:
    """The sweep with the bench's path taken out point by point: T over what the through sweep reads.

    Between its points the through sweep, turned back by its delay, is interpolated linearly in ln f; beyond its band
    nothing is known, and points there are left out. Its sign is not taken over, as that of the sweep is settled.

    Parameters
    ----------
    sweep
        Loop gain; a noise that it carries grows by the scatter of the through sweep.
    through
        Of the same bench, both receivers on the same node. Points of it that stand apart are not used.

    Raises
    ------
    SweepError
        As `through_delay`, and when no point of the sweep lies inside its band.
    """
    found = through_delay(through)
    bad_hz = [point.f_hz for point in found.left_out]
    used = through.without(~np.isin(through.freq_hz, bad_hz), "")
    sign = 1.0 if found.gain > 0 else -1.0
    turned = sign * used.gain * np.exp(2j * np.pi * used.freq_hz * found.delay_s)
    inside = (sweep.freq_hz >= used.f_min_hz * (1 - SAME_FREQUENCY_RTOL)) & (
        sweep.freq_hz <= used.f_max_hz * (1 + SAME_FREQUENCY_RTOL)
    )
    if not inside.any():
        raise SweepError(
            f"{sweep.origin.file}: no point lies in the band of the through sweep {found.file}, "
            f"{si(used.f_min_hz, 'Hz')} to {si(used.f_max_hz, 'Hz')}; take it over the band of the sweep"
        )
    divided = sweep.without(inside, f"outside the band of the through sweep {found.file}")
    log_f, known_log_f = np.log(divided.freq_hz), np.log(used.freq_hz)
    path = np.interp(log_f, known_log_f, turned.real) + 1j * np.interp(log_f, known_log_f, turned.imag)
    gain = divided.gain / (path * np.exp(-2j * np.pi * divided.freq_hz * found.delay_s))
    noise = divided.noise
    if noise is not None:
        noise = replace(noise, relative=float(np.hypot(noise.relative, found.scatter)))
    divided = replace(divided, gain=gain, noise=noise)
    return divided.with_decision("through sweep", "divided out", f"{found}; {found.sentence}")


def _check_magnitude(sweep: Sweep) -> None:
    """Refuse what is no through sweep: a magnitude far from 1, or one that changes far too much."""
    sizes = np.abs(sweep.gain)
    if not sizes.any():
        raise _no_through(sweep, "it is 0 throughout")
    levels = [to_db(max(float(np.median(sizes[part])), 1e-30)) for part in band_parts(sweep.freq_hz)]
    if max(levels) > FAR_DB or min(levels) < -FAR_DB or max(levels) - min(levels) > FAR_DB:
        raise _no_through(sweep, f"its magnitude runs from {levels[0]:.0f} dB to {levels[-1]:.0f} dB")


def _no_through(sweep: Sweep, seen: str) -> SweepError:
    return SweepError(
        f"{sweep.origin.file}: this is no through sweep: {seen}, where two receivers on one node read 0 dB and a small "
        "delay; check the file and its trace"
    )


def _departures(path: PathFit) -> tuple[Departure, ...]:
    """What is beyond noise: gain, and magnitude and phase along parts of the band."""
    from scipy.special import fdtrc

    ln_size, phase = path.rows
    in_db = 20 / np.log(10)
    along = (
        _along_band(path, ln_size, DepartureKind.MAGNITUDE, in_db),
        _along_band(path, phase, DepartureKind.PHASE, float(np.degrees(1.0))),
    )
    found = [departure for departure in along if departure is not None]
    stderr = path.ln_gain_stderr
    if along[0] is not None:
        stderr *= np.sqrt(_inflation(ln_size, 1 / path.scatter))
    sigma = abs(np.log(abs(path.gain))) / stderr
    if fdtrc(1, 2 * WORTH * len(ln_size), sigma**2) < CHANCE:
        ends = float(path.freq_hz[0]), float(path.freq_hz[-1])
        amount = to_db(abs(path.gain))
        gain = Departure(kind=DepartureKind.GAIN, f_min_hz=ends[0], f_max_hz=ends[1], amount=amount, sigma=float(sigma))
        found.insert(0, gain)
    return tuple(found)


def _along_band(path: PathFit, rows: FloatArray, kind: DepartureKind, unit: float) -> Departure | None:
    """The part of the band in which the mean of standard normal rows, shape (n,), is farthest from 0, if it is."""
    from scipy.special import fdtrc

    parts = band_parts(path.freq_hz)
    sums = np.array([rows[part].sum() / np.sqrt(len(part)) for part in parts])
    degrees = 2 * WORTH * min(NOISE_WINDOW, len(rows))
    over_all = fdtrc(len(sums), degrees, np.mean(sums**2))
    in_one = len(sums) * fdtrc(1, degrees, np.max(sums**2))
    if min(over_all, in_one) > CHANCE / 2:
        return None
    worst = int(np.argmax(np.abs(sums)))
    part = parts[worst]
    values = path.residuals.real if kind is DepartureKind.MAGNITUDE else path.residuals.imag
    amount = unit * float(np.average(values[part], weights=path.scatter[part] ** -2.0))
    ends = float(path.freq_hz[part[0]]), float(path.freq_hz[part[-1]])
    return Departure(kind=kind, f_min_hz=ends[0], f_max_hz=ends[1], amount=amount, sigma=float(abs(sums[worst])))


def _inflation(rows: FloatArray, slope: FloatArray) -> float:
    """Factor on the variance of a parameter where neighbours err together, from standard normal rows, shape (n,).

    Their mean square times their correlation length, each point counted by its say in the parameter, `slope`, shape
    (n,): the derivative over the standard deviation.
    """
    counted = rows * slope
    energy = float(counted @ counted)
    lags = range(1, max(len(rows) // 4, 2))
    correlations = np.array([counted[lag:] @ counted[:-lag] for lag in lags]) / energy
    return max(energy / float(slope @ slope), 1.0) * max(1 + 2 * float(correlations.clip(0).sum()), 1.0)
