"""Stability margins of a loop gain; with them, from `fitamp.closed_loop`, what the closed loop does.

Results are polished to rounding, so that they can be differentiated numerically with respect to whatever T was
computed from.
"""

from __future__ import annotations

import cmath
import math
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.closed_loop import StepResponse, bracketed_root, closed_loop_poles_hz, closed_loop_step
from fitamp.roots import EPSILON, polynomial_roots
from fitamp.transfer import TWO_PI, Transfer

__all__ = ["Margins", "StepResponse", "closed_loop_poles_hz", "closed_loop_step", "log_gain", "margins"]

# Phase grid: fine enough that a real root turns the phase by 2 degrees at most from point to point.
PHASE_POINTS_PER_DECADE = 40
# A solution of |T| = 1 or arg T = −180° must hold to this, in nepers or radians, to be one.
SOLVED = 1e-8
# |T| just touching 1 is a double root in f², which rounding may split into a pair this near the real axis.
TOUCHING = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True)
class Margins:
    """Stability margins of a loop gain; None where there is no such crossing.

    crossover_hz : highest frequency where |T| = 1
    phase_margin_deg : 180° + arg T there, with the phase counted continuously from DC. Up to 180°; a loop whose phase
        is beyond −360° gets less than −180° and is not called safe.
    gain_margin_db : −20 log10 |T| at the phase crossover; below 0 dB when the gain there is above 1
    phase_crossover_hz : where the phase, counted continuously, is −180°. Of several, the first above the gain
        crossover while the phase margin is positive, else the last below it.
    """

    crossover_hz: float | None
    phase_margin_deg: float | None
    gain_margin_db: float | None
    phase_crossover_hz: float | None


def margins(response: Transfer) -> Margins:
    """Return crossover, phase margin and gain margin of a loop gain.

    A negative DC gain counts as −180°.
    """
    crossover = _gain_crossover(response)
    phase_margin = None
    if crossover is not None:
        phase_margin = 180 + math.degrees(log_gain(response, crossover)[0].imag)
        phase_margin -= 360 * math.ceil(max(phase_margin - 180, 0) / 360)
    phase_crossover = _phase_crossover(response, crossover, safe=phase_margin is None or phase_margin > 0)
    gain_margin = None
    if phase_crossover is not None:
        gain_margin = -20 / math.log(10) * log_gain(response, phase_crossover)[0].real
    return Margins(
        crossover_hz=crossover,
        phase_margin_deg=phase_margin,
        gain_margin_db=gain_margin,
        phase_crossover_hz=phase_crossover,
    )


def log_gain(response: Transfer, freq_hz: float) -> tuple[complex, complex]:
    """ln T and its derivative with respect to ln f; the imaginary part is the phase, continuous from DC.

    Each factor 1 − jf/root starts at 1 and never meets the negative real axis (unless the root is on the imaginary
    axis), so the sum of the principal arguments is the continuous phase.
    """
    value = complex(math.log(abs(response.dc_gain)), -math.pi if response.dc_gain < 0 else 0.0)
    turn = 1j * TWO_PI * response.delay_s * freq_hz
    value, slope = value - turn, -turn
    for sign, roots in ((1, response.zeros_hz), (-1, response.poles_hz)):
        for root in roots:
            ratio = 1j * freq_hz / root
            if ratio == 1:
                return complex(-sign * math.inf, value.imag), complex(math.nan, math.nan)
            value += sign * cmath.log(1 - ratio)
            slope -= sign * ratio / (1 - ratio)
    return value, slope


def _gain_crossover(response: Transfer) -> float | None:
    """Highest frequency of |T|² = 1, which is a polynomial in f²."""
    tops = response.dc_gain**2 * _squared(response.zeros_hz)
    bottoms = _squared(response.poles_hz)
    difference = np.zeros(max(len(tops), len(bottoms)))
    difference[: len(tops)] += tops
    difference[: len(bottoms)] -= bottoms
    for root in reversed(polynomial_roots(difference)):
        if root.real > 0 and abs(root.imag) < TOUCHING * root.real:
            found = _polish_crossover(response, 0.5 * math.log(root.real))
            if found is not None:
                return found
    return None


def _polish_crossover(response: Transfer, log_f: float) -> float | None:
    """Newton's method on ln |T| over ln f."""
    for _ in range(8):
        value, slope = log_gain(response, math.exp(log_f))
        if slope.real == 0 or abs(value.real) < EPSILON:
            break
        step = value.real / slope.real
        if not abs(step) < 0.1:
            break
        log_f -= step
        if abs(step) < EPSILON * abs(log_f):
            break
    freq_hz = math.exp(log_f)
    return freq_hz if abs(log_gain(response, freq_hz)[0].real) < SOLVED else None


def _squared(roots_hz: tuple[complex, ...]) -> FloatArray:
    """∏|1 − jf/root|² in ascending powers of f², multiplied out without complex numbers."""
    product = np.ones(1)
    for root in roots_hz:
        size = abs(root) ** -2
        if root.imag == 0:
            product = np.convolve(product, [1.0, size])
        elif root.imag > 0:
            product = np.convolve(product, [1.0, 2 * size * size * (root.real**2 - root.imag**2), size * size])
    return np.asarray(product, dtype=float)


def _phase_crossover(response: Transfer, crossover: float | None, *, safe: bool) -> float | None:
    """Choose among the frequencies where the continuous phase is −180°."""

    def excess(log_f: float) -> tuple[float, float]:
        value, slope = log_gain(response, math.exp(log_f))
        return value.imag + math.pi, slope.imag

    grid = _phase_grid(response)
    if len(grid) == 0:
        return None
    phase = np.full(len(grid), 0.0 if response.dc_gain < 0 else math.pi) - TWO_PI * response.delay_s * grid
    for sign, roots in ((1, response.zeros_hz), (-1, response.poles_hz)):
        for root in roots:
            phase += sign * np.angle(1 - 1j * grid / root)
    found = []
    for index in np.flatnonzero(phase[:-1] * phase[1:] < 0):
        log_f = bracketed_root(excess, math.log(grid[index]), math.log(grid[index + 1]))
        if abs(excess(log_f)[0]) < SOLVED:
            found.append(math.exp(log_f))
    if not found:
        return None
    if crossover is None:  # |T| never meets 1: the crossing that comes nearest to it
        return min(found, key=lambda freq_hz: abs(log_gain(response, freq_hz)[0].real))
    above = [freq_hz for freq_hz in found if freq_hz > crossover]
    below = [freq_hz for freq_hz in found if freq_hz <= crossover]
    if safe:
        return above[0] if above else below[-1]
    return below[-1] if below else above[0]


def _phase_grid(response: Transfer) -> FloatArray:
    """Frequencies that show every crossing of −180°: logarithmic, and dense where a resonance turns the phase.

    They end three decades beyond the last root, where the phase has its final value but for 0.1°.
    """
    roots = np.array(response.poles_hz + response.zeros_hz)
    scales = list(np.abs(roots))
    low, high = 1e-2 * min(scales, default=math.inf), 1e3 * max(scales, default=0.0)
    if response.delay_s:
        # Beyond this frequency the delay alone outweighs every phase lead the roots can give.
        high = max(high, (2 + len(scales)) / response.delay_s)
        low = min(low, 1e-2 / response.delay_s)
    if not low < high:
        return np.zeros(0)
    decades = math.log10(high / low)
    grid = np.geomspace(low, high, int(decades * PHASE_POINTS_PER_DECADE) + 2)
    resonant = roots[roots.imag > 0] if len(roots) else roots
    near = [resonant.imag + offset * resonant.real for offset in (-3.0, -1.0, -0.3, 0.0, 0.3, 1.0, 3.0)]
    extra = np.concatenate(near) if len(resonant) else np.zeros(0)
    return np.unique(np.concatenate([grid, extra[extra > 0]]))
