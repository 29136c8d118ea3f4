"""The best circuit for a set of sweeps: several starts, noise and fit in turn, and whether a second valley remains."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.circuit import BENCH_DELAY, Circuit
from fitamp.elements.residual import Measured
from fitamp.elements.solving import CircuitSolution, least_resistor_ohm, solve, solve_free
from fitamp.errors import FitError
from fitamp.fitting import LoopFit
from fitamp.fitting.intervals import RISE_95
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels

__all__ = ["Found", "floored", "search"]

# To tell which start ends lowest, chi-square to seven digits is enough, and who is still far off after so many steps
# does not win.
RACE_TOLERANCE = 1e-7
RACE_STEPS = 100
NOISE_ROUNDS = 2
# Starts whose gm2·Rz differ by less end in the same valley.
SAME_START = 0.15
# Two ends are two valleys where an element differs by so many standard deviations.
APART_SIGMA = 3.0
# and by this share at least: what differs by less is one place, reached to within the race's tolerance.
APART_LEAST = 1e-3
# By so much chi-square rises between two valleys at the least.
BARRIER = 1.0
# No circuit of lumped elements is right to better than this share of the loop gain, whatever a simulator exports.
RELATIVE_FLOOR = 1e-6
FLOORED = "floor of a lumped circuit"


@dataclass(frozen=True, slots=True, kw_only=True)
class Found:
    """The best solution, and another one that the sweeps do not exclude, where there is one."""

    best: CircuitSolution
    other: CircuitSolution | None


def search(
    circuit: Circuit, sweeps: Sequence[Measured], fits: Sequence[LoopFit], *, noise_is_given: Sequence[bool]
) -> Found:
    """Fit from all starts, keep the lowest, and renew the noise about it where it is not given.

    Parameters
    ----------
    fits
        Of the same sweeps, two poles and a zero; starting values come from their gain-bandwidth and zero time.

    Raises
    ------
    FitError
        When no start leads anywhere.
    """
    ends = [
        solve(circuit, sweeps, start, tolerance=RACE_TOLERANCE, max_steps=RACE_STEPS)
        for start in _starts(circuit, sweeps, fits)
    ]
    ends = sorted((end for end in ends if np.isfinite(end.optimum.chi_square)), key=lambda end: end.optimum.chi_square)
    if not ends:
        raise FitError(
            f"{sweeps[0].sweep.origin.file}: no start leads to a circuit; check that the sweep and the design belong "
            "together"
        )
    best = _settled(ends[0], noise_is_given)
    others = [end for end in ends[1:] if end.optimum.chi_square < ends[0].optimum.chi_square + 10 * RISE_95]
    for end in others:
        if not is_apart(best, end):
            continue
        # Under the same weights, or the chi-squares could not be compared.
        other = solve(circuit, best.sweeps, end.values)
        if other.optimum.chi_square < best.optimum.chi_square + RISE_95 and is_apart(best, other):
            if has_barrier(best, other):
                return Found(best=best, other=other)
            best = min(best, other, key=lambda solution: solution.optimum.chi_square)
    return Found(best=best, other=None)


def is_apart(one: CircuitSolution, other: CircuitSolution) -> bool:
    """Whether some number differs by more than three standard deviations of the more certain of the two."""
    sd = np.sqrt(np.minimum(np.diag(one.covariance), np.diag(other.covariance)))
    distance = np.abs(one.values - other.values)
    return bool((distance > np.maximum(APART_SIGMA * sd, APART_LEAST)).any())


def has_barrier(one: CircuitSolution, other: CircuitSolution) -> bool:
    """Whether chi-square rises between two ends: the number that differs most is held half-way, the others refitted.

    Else both lie in one long valley, which the errors hold, and not in two.
    """
    sd = np.sqrt(np.minimum(np.diag(one.covariance), np.diag(other.covariance)))
    index = int(np.argmax(np.abs(one.values - other.values) / sd))
    middle = (one.values + other.values) / 2
    held = solve_free(one.circuit, one.sweeps, middle, hold={index: float(middle[index])})
    higher = max(one.optimum.chi_square, other.optimum.chi_square)
    return held.optimum.chi_square > higher + BARRIER


def _starts(circuit: Circuit, sweeps: Sequence[Measured], fits: Sequence[LoopFit]) -> list[FloatArray]:
    """As the two-pole fit suggests, with several resistors; C1 and CL exchanged where no prior tells them apart."""
    nominal = circuit.nominal
    # The sweep to which least was added shows the part as it is.
    first = min(range(len(sweeps)), key=lambda i: _added(circuit, sweeps[i]))
    parameters = fits[first].parameters
    base = circuit.designed
    gain_bandwidth_hz = parameters.gain_bandwidth_hz.value
    index = circuit.index("gm1")
    if index is not None and gain_bandwidth_hz is not None:
        designed_hz = circuit.loaded(base, sweeps[first].condition).transfer().gain_bandwidth_hz
        base[index] += np.log(gain_bandwidth_hz / designed_hz)
    index = circuit.index(BENCH_DELAY)
    if index is not None and parameters.delay_s.value is not None:
        base[index] = circuit.parameters[index].from_si(parameters.delay_s.value)
    starts = _with_resistors(circuit, base, sweeps[first], parameters.zero_time_s.value, least_resistor_ohm(sweeps))
    first_index, load_index = circuit.index("C1"), circuit.index("CL")
    if first_index is not None and load_index is not None and _may_be_exchanged(circuit, first_index, load_index):
        exchanged = starts[0].copy()
        exchanged[[first_index, load_index]] += np.log(nominal.CL / nominal.C1) * np.array([1.0, -1.0])
        starts.append(exchanged)
    return starts


def _with_resistors(
    circuit: Circuit, base: FloatArray, first: Measured, zero_time_s: float | None, least_ohm: float
) -> list[FloatArray]:
    index = circuit.index("Rz")
    if index is None:
        return [base]
    nominal = circuit.nominal
    resistors = [nominal.Rz, 0.0, 1 / nominal.gm2, 2 * nominal.Rz]
    if zero_time_s is not None:
        seen = (zero_time_s + nominal.Cgd / nominal.gm2) / nominal.Cc + 1 / nominal.gm2
        resistors.insert(0, seen - first.condition.rz_added_ohm)
    starts: list[FloatArray] = []
    for resistor_ohm in resistors:
        number = circuit.parameters[index].from_si(max(resistor_ohm, least_ohm))
        if all(abs(number - other[index]) > SAME_START for other in starts):
            start = base.copy()
            start[index] = number
            starts.append(start)
    return starts


def _may_be_exchanged(circuit: Circuit, *indices: int) -> bool:
    return any(circuit.parameters[index].prior_sd is None for index in indices)


def _added(circuit: Circuit, one: Measured) -> float:
    nominal, condition = circuit.nominal, one.condition
    return condition.load_added_f / nominal.CL + abs(condition.rz_added_ohm) * nominal.gm2


def _settled(solution: CircuitSolution, noise_is_given: Sequence[bool]) -> CircuitSolution:
    """Alternate noise and fit, or fit once more where all noise is given."""
    for _ in range(NOISE_ROUNDS):
        sweeps = [
            one if given else _with_noise(solution, one)
            for one, given in zip(solution.sweeps, noise_is_given, strict=True)
        ]
        solution = _refitted(solution, sweeps)
        if all(noise_is_given):
            break
    return solution


def _with_noise(solution: CircuitSolution, one: Measured) -> Measured:
    gain = solution.circuit.gain(solution.values, one.sweep.freq_hz, one.condition)
    return replace(one, noise=floored(estimate_noise(one.sweep, gain if one.factor is None else gain * one.factor)))


def floored(noise: NoiseLevels) -> NoiseLevels:
    """Noise levels with the least relative error that a lumped circuit can have."""
    if noise.relative >= RELATIVE_FLOOR:
        return noise
    return replace(noise, relative=RELATIVE_FLOOR, source=FLOORED)


def _refitted(solution: CircuitSolution, sweeps: Sequence[Measured]) -> CircuitSolution:
    again = solve(solution.circuit, sweeps, solution.values)
    if not again.optimum.converged:
        # Down an endless valley of a number that the sweeps do not see, seven digits have to do.
        again = solve(solution.circuit, sweeps, again.values, tolerance=RACE_TOLERANCE)
    return again
