"""Do the residuals look like the noise: in level, and without structure along the frequency axis?"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.fitting.stretches import place_in_words, stretches_of
from fitamp.sweep import NoiseLevels

__all__ = ["Adequacy", "Judged", "judge"]

# Both statistics are about standard normal for a right model; 4.5 keeps false alarms below one in a few thousand
# sweeps, the noise having been estimated from the same points.
ALARM = 4.5
# Relative scatter below which a sweep was computed, not measured.
COMPUTED = 1e-9
# Residuals below this share of the drive are arithmetic, and arithmetic has patterns of its own.
ROUNDING = 1e-12
HUNDRED = 99.5  # two digits make this 100


class Judged(Protocol):
    """What can be judged: complex residuals in standard deviations per component, shape (n,), and their noise."""

    @property
    def residuals(self) -> ComplexArray: ...

    @property
    def noise(self) -> NoiseLevels: ...

    @property
    def reduced_chi_square(self) -> float: ...


@dataclass(frozen=True, slots=True, kw_only=True)
class Adequacy:
    """Verdict on the model's residuals.

    level, structure : reduced chi-square and lag correlation, each as standard deviations from what noise gives
    inflation : factor on the covariance, 1 for an adequate model, otherwise reduced chi-square times the correlation
        length of the residuals: neighbours that err together count as fewer points
    where_hz : stretches (from, to) of the band that hold most of what raised the alarm, rising; empty where it is
        spread over the band or there is none; None where the frequencies were not given
    """

    reduced_chi_square: float
    level: float
    structure: float
    inflation: float
    noise_too_large: bool
    where_hz: tuple[tuple[float, float], ...] | None = None

    @property
    def adequate(self) -> bool:
        """Whether neither statistic raises the alarm; a level far too low means that the noise is overestimated."""
        return self.level < ALARM and self.structure < ALARM and not self.noise_too_large

    @property
    def sentence(self) -> str:
        """What was seen, in plain words."""
        if self.adequate:
            return "residuals look like the noise"
        if self.noise_too_large:
            seen = ["are far smaller than the scatter from point to point, as of a sweep too coarse for its shape"]
            if self.structure >= ALARM:
                seen.insert(0, "follow a pattern along frequency")
            return f"the residuals {' and '.join(seen)}"
        place = "" if self.where_hz is None else place_in_words(self.where_hz)
        times = float(np.sqrt(self.reduced_chi_square))
        large = f"are {f'{times:.2g}' if times < HUNDRED else f'{times:.0f}'} times as large as the scatter allows"
        if self.structure < ALARM:
            return f"the residuals {large}{place and f', {place}'}"
        pattern = f"follow a pattern along frequency{place and f', {place}'}"
        if self.level < ALARM:
            return f"the residuals {pattern}"
        return f"the residuals {pattern}{place and ','} and {large}"


def judge(solution: Judged, freq_hz: FloatArray | None = None) -> Adequacy:
    """Compare residuals with noise; with `freq_hz`, shape (n,), also say where along the band they are unlike it.

    The lag correlations ρ_l of the complex residuals are each normal with variance 1/(2n) under white noise; their sum
    over n/12 lags catches slow patterns that a single lag misses (portmanteau idea of G. E. P. Box and D. A. Pierce,
    one-sided because a wrong model makes neighbours err alike).
    """
    residuals = solution.residuals
    count = len(residuals)
    chi = solution.reduced_chi_square
    estimated = solution.noise.source.startswith("estimated")
    # The noise level comes from second differences of the same points: variance 35/18 in place of 1. That of K repeats
    # has K − 1 degrees of freedom a point, whose variance adds to that of the residuals.
    of_repeats = 1 / (solution.noise.repeats - 1) if solution.noise.repeats > 1 else 0.0
    level = (chi - 1) * np.sqrt(count / (35 / 18 if estimated else 1.0 + of_repeats))
    lags = max(count // 12, 1)
    correlations = _correlations(residuals, lags)
    structure = float(correlations.sum() * np.sqrt(2 * count / lags))
    noise = solution.noise
    if np.sqrt(chi) * max(noise.error_channel, noise.return_channel, noise.relative) < ROUNDING:
        structure = 0.0
    inflation = 1.0
    if level >= ALARM or structure >= ALARM:
        inflation = max(chi, 1.0) * max(1 + 2 * float(_correlations(residuals, count // 4).clip(0).sum()), 1.0)
    return Adequacy(
        reduced_chi_square=chi,
        level=float(level),
        structure=structure,
        inflation=inflation,
        # Without noise there is only rounding, of which second differences make too much.
        noise_too_large=bool(estimated and level <= -ALARM and solution.noise.relative > COMPUTED),
        where_hz=None if freq_hz is None else _where_hz(residuals, freq_hz, level, structure, lags),
    )


def _where_hz(
    residuals: ComplexArray, freq_hz: FloatArray, level: float, structure: float, lags: int
) -> tuple[tuple[float, float], ...]:
    """Stretches that hold most of the alarms, each point weighed by what it adds to level and structure."""
    square = np.abs(residuals) ** 2 / 2
    misfit = np.zeros(len(residuals))
    if level >= ALARM:
        misfit += level * (square - 1) / max(float((square - 1).sum()), 1e-300)
    if structure >= ALARM:
        alike = np.zeros(len(residuals))
        for lag in range(1, lags + 1):
            # Half of what two points have in common belongs to either.
            common = (residuals[lag:] * np.conj(residuals[:-lag])).real / 2
            alike[lag:] += common
            alike[:-lag] += common
        misfit += structure * alike / max(float(alike.sum()), 1e-300)
    return tuple((float(freq_hz[first]), float(freq_hz[last])) for first, last in stretches_of(misfit))


def _correlations(residuals: ComplexArray, lags: int) -> FloatArray:
    """Correlation at 1, 2, … `lags` points, by Fourier transforms: the time grows as the number of points."""
    # A pattern counts against the noise: one in residuals far below it harms nobody.
    energy = max(float((np.abs(residuals) ** 2).sum()), 2.0 * len(residuals))
    padded = 1 << (len(residuals) + lags - 1).bit_length()
    products = np.fft.ifft(np.abs(np.fft.fft(residuals, padded)) ** 2)[1 : lags + 1].real
    return np.asarray(products / energy)
