"""The zero on the other side of infinity, where a delay that nobody stated makes up for it.

To first order a zero time τz and a delay enter as τz − delay, so that a zero at −τz with a delay less by 2τz looks the
same, and only the magnitude tells them apart, near the zero.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements import Circuit
from fitamp.elements.circuit import BENCH_DELAY
from fitamp.elements.search import is_apart
from fitamp.elements.solving import CircuitSolution, solve
from fitamp.fitting.intervals import RISE_95

__all__ = ["other_side", "zero_time_of"]


def zero_time_of(circuit: Circuit, values: FloatArray) -> float:
    """Zero time in s of a vector; Rz may be below 0."""
    found = circuit.physical(values)
    return found["Cc"] * (found["Rz"] - 1 / found["gm2"]) - found["Cgd"] / found["gm2"]


def other_side(solution: CircuitSolution) -> CircuitSolution | None:
    """The solution with the zero in the other half plane, where the sweep does not exclude it.

    None where the delay is known, where there is no such solution, or where it ends in the same place.
    """
    circuit = solution.circuit
    delay, resistor = circuit.index(BENCH_DELAY), circuit.index("Rz")
    if delay is None or resistor is None or circuit.parameters[delay].prior_sd is not None:
        return None
    zero_time_s = zero_time_of(circuit, solution.values)
    found = circuit.physical(solution.values)
    start = np.array(solution.values)
    mirrored_ohm = (-zero_time_s + found["Cgd"] / found["gm2"]) / found["Cc"] + 1 / found["gm2"]
    start[resistor] = max(circuit.parameters[resistor].from_si(mirrored_ohm), 0.0)
    start[delay] = circuit.parameters[delay].from_si(found[BENCH_DELAY] - 2 * zero_time_s)
    other = solve(circuit, solution.sweeps, start)
    is_as_good = other.optimum.chi_square < solution.optimum.chi_square + RISE_95
    return other if is_as_good and is_apart(solution, other) else None
