"""The closed loop T/(1 + T): its poles and its step response.

Results are polished to rounding, so that they can be differentiated numerically with respect to whatever T was
computed from.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.roots import EPSILON, clusters, polynomial_roots
from fitamp.transfer import TWO_PI, Transfer

__all__ = ["StepResponse", "bracketed_root", "closed_loop_poles_hz", "closed_loop_step", "step_error"]

# Order of the Padé approximation of a delay. It rounds off the kink that a delayed step has: with 33° of phase margin
# behind one pole and a delay, order 5 misses the overshoot by 2e-4, order 7 by 5e-5 of the final value.
PADE_ORDER = 7
# A closed-loop pole counts as stable when its damping is above rounding.
LEAST_DAMPING = 1e-12
# An overshoot below this is none.
LEAST_OVERSHOOT = 1e-9
# Step response grid: log-spaced for slow tails, and this fine along every oscillation that still matters.
TIMES_PER_DECADE = 40
TIMES_PER_CYCLE = 16
# Bounds time and memory where an oscillation goes on for more than 10 000 cycles; beyond, the envelope still shows.
MOST_TIMES = 160_000
# Sixteen points a cycle show a peak to cos(π/16) = 0.98 of its height at least.
PEAK_AT_GRID = 0.9
MOST_PEAKS = 20

Curve = Callable[[float], tuple[float, float]]  # value and slope at a point


@dataclass(frozen=True, slots=True, kw_only=True)
class StepResponse:
    """Unit step of the closed loop T/(1 + T), final value T0/(1 + T0).

    overshoot : largest excess over the final value, as a fraction of it; 0 for none, None when unstable
    peak_s : instant of that; None without one
    settling_s : time from which on the response stays within ±band of its final value; None when unstable
    stable : whether every closed-loop pole is in the left half plane
    band : settling band as a fraction of the final value
    """

    overshoot: float | None
    peak_s: float | None
    settling_s: float | None
    stable: bool
    band: float


def closed_loop_poles_hz(response: Transfer) -> tuple[complex, ...]:
    """Return the poles of T/(1 + T) in Hz, signed, nearest the origin first.

    A delay enters by its Padé approximation of order 7 and brings seven poles more. Where T0 = −1 one is at the origin.
    """
    return tuple(pole / TWO_PI for pole in _closed_loop_poles(response))


def closed_loop_step(response: Transfer, *, band: float = 0.01) -> StepResponse:
    """Return overshoot and settling of the closed loop's unit step.

    The response is the sum of the exponentials of the closed-loop poles (a delay by Padé approximation), searched on
    a time grid that is logarithmic for slow tails and dense along oscillations, then polished.

    Parameters
    ----------
    band
        Settling band as a fraction of the final value, between 0 and 1.

    Raises
    ------
    ValueError
        When the band is not between 0 and 1, or T has more zeros than poles (its step response is no function).
    """
    if not 0 < band < 1:
        raise ValueError(f"settling band must be between 0 and 1, but is {band!r}")
    if len(response.zeros_hz) > len(response.poles_hz):
        raise ValueError("a loop gain with more zeros than poles has no step response; it lacks a pole")
    poles = _closed_loop_poles(response)
    # Where T → −1 at high frequency a closed-loop pole is lost at infinity: such a loop cannot be closed.
    lost = len(poles) < len(response.poles_hz)
    if lost or any(pole.real >= -LEAST_DAMPING * abs(pole) for pole in poles):
        return StepResponse(overshoot=None, peak_s=None, settling_s=None, stable=False, band=band)
    course = _course(response, poles, band)
    overshoot, peak_s = _overshoot(course)
    return StepResponse(overshoot=overshoot, peak_s=peak_s, settling_s=_settling(course), stable=True, band=band)


def step_error(response: Transfer, times_s: Sequence[float]) -> tuple[tuple[float, float], ...]:
    """Relative error y(t)/y(∞) − 1 of the closed loop's unit step and its slope (1/s), at some instants."""
    rates, weights = _modes(response, _spread(_closed_loop_poles(response)))
    curve = _curve(rates, weights)
    return tuple(curve(time_s) for time_s in times_s)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Course:
    """Relative error e(t) = y(t)/y(∞) − 1 = Σ Re(w·exp(s·t)) of the step response, and what a grid shows of it.

    rates, weights : s and w, one of each conjugate pair, shape (m,)
    times, error : grid and error on it, shape (n,)
    turns : indices of grid points before a turning point
    """

    rates: ComplexArray
    weights: ComplexArray
    band: float
    times: FloatArray
    error: FloatArray
    turns: NDArray[np.intp]

    def curve(self, order: int = 0) -> Curve:
        """Error, or its derivative of that order, with its slope, at one instant."""
        return _curve(self.rates, self.weights * self.rates**order)

    def turning_point(self, index: int) -> float:
        """Instant of the turning point after a grid point."""
        return bracketed_root(self.curve(order=1), float(self.times[index]), float(self.times[index + 1]))


def _curve(rates: ComplexArray, weights: ComplexArray) -> Curve:
    """Σ Re(w·exp(s·t)) with its slope."""
    terms = list(zip(rates.tolist(), weights.tolist(), strict=True))

    def curve(time_s: float) -> tuple[float, float]:
        value = slope = 0.0
        for rate, weight in terms:
            term = weight * cmath.exp(rate * time_s)
            value += term.real
            slope += (rate * term).real
        return value, slope

    return curve


def _course(response: Transfer, poles: tuple[complex, ...], band: float) -> _Course:
    rates, weights = _modes(response, _spread(poles))
    times = _times(rates, weights, band)
    modes = weights * np.exp(times[:, np.newaxis] * rates)
    slope = (modes * rates).real.sum(axis=1)
    return _Course(
        rates=rates,
        weights=weights,
        band=band,
        times=times,
        error=modes.real.sum(axis=1),
        turns=np.flatnonzero(slope[:-1] * slope[1:] < 0),
    )


def bracketed_root(curve: Curve, low: float, high: float) -> float:
    """Return the zero of a curve between two points of opposite sign: Newton's method, kept inside by bisection."""
    rising = curve(high)[0] > 0
    x = 0.5 * (low + high)
    for _ in range(200):
        value, slope = curve(x)
        if value == 0:
            return x
        if (value > 0) == rising:
            high = x
        else:
            low = x
        step = x - value / slope if slope else math.nan
        following = step if low < step < high else 0.5 * (low + high)
        if abs(following - x) <= 2 * EPSILON * abs(x):
            return following
        x = following
    return x


def _closed_loop_poles(response: Transfer) -> tuple[complex, ...]:
    """Roots in rad/s of D·Q(s) + T0·N·Q(−s), with Q(−s)/Q(s) for the delay."""
    numerator, denominator = response.polynomials()
    delay = _pade(response.delay_s)
    tops = np.convolve(numerator, delay * (-1.0) ** np.arange(len(delay)))
    bottoms = np.convolve(denominator, delay)
    total = np.zeros(max(len(tops), len(bottoms)))
    total[: len(tops)] += tops
    total[: len(bottoms)] += bottoms
    return polynomial_roots(total)


def _pade(delay_s: float) -> FloatArray:
    """Denominator of the diagonal Padé approximation of exp(−s·delay), ascending in s; 1 without delay."""
    if delay_s == 0:
        return np.ones(1)
    n = PADE_ORDER
    return np.array(
        [math.comb(n, k) * math.factorial(2 * n - k) / math.factorial(2 * n) * delay_s**k for k in range(n + 1)]
    )


def _spread(poles: tuple[complex, ...]) -> list[complex]:
    """Set coinciding poles apart on a small circle, so that partial fractions exist.

    With m poles on a circle of relative radius d, the polynomial changes by d^m and rounding is amplified by
    d^(1 − m); the radius balances both.
    """
    spread: list[complex] = []
    for cluster in clusters(poles):
        count = len(cluster)
        centre = sum(cluster) / count
        radius = float(EPSILON ** (1 / (2 * count - 1))) * abs(centre)
        if count == 1 or max(abs(pole - centre) for pole in cluster) > 0.1 * radius:
            spread += cluster
        else:
            spread += [centre + radius * cmath.exp(1j * math.pi * (2 * k + 1) / count) for k in range(count)]
    return [complex(pole.real) if abs(pole.imag) < 1e-13 * abs(pole) else pole for pole in spread]


def _modes(response: Transfer, poles: list[complex]) -> tuple[ComplexArray, ComplexArray]:
    """Rates and weights of the step's exponentials by partial fractions, one of each conjugate pair."""
    delay = _pade(response.delay_s)
    rates, weights = [], []
    for index, pole in enumerate(poles):
        if pole.imag < 0:
            continue
        weight = -(1 if pole.imag == 0 else 2) * complex(np.polynomial.polynomial.polyval(-pole, delay))
        for zero in response.zeros_hz:
            weight *= 1 - pole / (TWO_PI * zero)
        for other_index, other in enumerate(poles):
            if other_index != index:
                weight /= 1 - pole / other
        rates.append(pole)
        weights.append(weight)
    return np.array(rates, dtype=complex), np.array(weights, dtype=complex)


def _times(rates: ComplexArray, weights: ComplexArray, band: float) -> FloatArray:
    """Time grid from 0 until every exponential is surely inside the band."""
    small = 0.25 * band / len(rates)
    # Until when each exponential matters for the band, and until when any can make an overshoot.
    lasting = np.log(np.maximum(np.abs(weights) / small, 1.0)) / -rates.real
    end = (np.log(np.maximum(np.abs(weights) / LEAST_OVERSHOOT, 2.0)) / -rates.real).max()
    start = 1e-2 / np.abs(rates).max()
    count = int(math.log10(end / start) * TIMES_PER_DECADE) + 2
    grids = [np.zeros(1), np.geomspace(start, end, count)]
    for rate, until in zip(rates, lasting, strict=True):
        cycles = rate.imag * until / TWO_PI
        if cycles > 0.5:
            grids.append(np.linspace(0, until, min(int(cycles * TIMES_PER_CYCLE) + 2, MOST_TIMES)))
    return np.unique(np.concatenate(grids))


def _overshoot(course: _Course) -> tuple[float, float | None]:
    """Largest error above the final value, and when; or 0."""
    first = int(np.argmax(course.error))
    best, at_s = float(course.error[first]), float(course.times[first])
    peaks = np.maximum(course.error[course.turns], course.error[course.turns + 1])
    # The highest peak may lie between points that are lower than those of another.
    for index in course.turns[(peaks > 0) & (peaks > PEAK_AT_GRID * best)][:MOST_PEAKS]:
        turn_s = course.turning_point(index)
        height = course.curve()(turn_s)[0]
        if height > best:
            best, at_s = height, turn_s
    return (best, at_s) if best > 0 else (0.0, None)


def _settling(course: _Course) -> float:
    """Last instant at which the error is as large as the band; 0 when it never is."""
    level, band = course.curve(), course.band
    size, turns = np.abs(course.error), course.turns
    outside = np.flatnonzero(size > band)
    last = int(outside[-1]) if len(outside) else -1
    low, high = float(course.times[last]), float(course.times[min(last + 1, len(size) - 1)])
    left = last >= 0
    # A peak between grid points may still leave the band when the points do not.
    late = turns[(turns >= last) & (np.maximum(size[turns], size[turns + 1]) > PEAK_AT_GRID * band)]
    for index in late[::-1]:
        peak = course.turning_point(index)
        if abs(level(peak)[0]) > band:
            low, high, left = peak, float(course.times[index + 1]), True
            break
    if not left:
        return 0.0
    side = math.copysign(1.0, level(low)[0])

    def beyond(time_s: float) -> tuple[float, float]:
        value, rate = level(time_s)
        return side * value - band, side * rate

    return bracketed_root(beyond, low, high)
