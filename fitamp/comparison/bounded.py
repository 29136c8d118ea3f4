"""Estimates of what follows from a circuit's vector, where a resistor cannot be negative.

Chi-square counts from its least value with Rz at 0 or more. Away from that bound an interval reaches from −q to +q
standard errors; near it, to where chi-square has risen by q², with all else refitted, and so less far on a side on
which Rz would have to be negative.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.search import RACE_TOLERANCE
from fitamp.elements.solving import CircuitSolution, least_resistor_ohm, solve_free
from fitamp.estimate import Estimate
from fitamp.fitting.intervals import gradient

__all__ = ["bounded_estimates"]

Function = Callable[[FloatArray], float]


def bounded_estimates(
    functions: tuple[Function, ...], solution: CircuitSolution, *, quantile: float
) -> tuple[Estimate, ...]:
    """Values of functions at the optimum, with the ends of their 95 % intervals under Rz ≥ 0.

    Parameters
    ----------
    functions
        Each of the vector, shape (p,); smooth also where Rz passes 0.
    quantile
        q, by which a 95 % interval is wider than a standard error.

    Returns
    -------
    tuple of Estimate
        Where the bound shortens an interval, `stderr` is its length over 2q.

    Notes
    -----
    Profile likelihood (with the bound, the ordering by likelihood ratio of G. J. Feldman and R. D. Cousins, Phys. Rev.
    D 57, 1998) to first order about the optima with and without the bound. Not by the function at the far end of a
    straight line: what is known a hundred times better than the elements stays so along a curved valley only.
    """
    index = solution.circuit.index("Rz")
    room = None if index is None else _Room(solution, index, quantile)
    return tuple(_estimate(function, solution, room, quantile) for function in functions)


class _Room:
    """How far Rz is above its bound, and the vector with Rz on it, where that is near."""

    def __init__(self, solution: CircuitSolution, index: int, quantile: float) -> None:
        free = solution.values if solution.unbounded is None else solution.unbounded
        bound = solution.circuit.parameters[index].from_si(least_resistor_ohm(solution.sweeps))
        column, variance = solution.covariance[:, index], float(solution.covariance[index, index])
        self.column = column
        self.above = float(free[index]) - bound
        self.distance = self.above**2 / variance
        # Chi-square at its least with Rz at 0 or more, over its least without regard to that.
        self.depth = self.distance if self.above < 0 else 0.0
        self.covariance_on_bound = solution.covariance - np.outer(column, column) / variance
        self.on_bound: FloatArray | None = None
        if solution.unbounded is not None:
            self.on_bound = solution.values
        elif self.distance < quantile**2:
            start = free - column * self.above / variance
            held = solve_free(solution.circuit, solution.sweeps, start, hold={index: bound}, tolerance=RACE_TOLERANCE)
            self.on_bound = held.values


def _estimate(function: Function, solution: CircuitSolution, room: _Room | None, quantile: float) -> Estimate:
    slopes = _slopes(function, solution.values)
    stderr = _sd(slopes, solution.covariance)
    value = function(solution.values)
    if room is None or room.on_bound is None or not stderr:
        return Estimate.gaussian(value, stderr, quantile=quantile)
    centre = value if solution.unbounded is None else function(solution.unbounded)
    reach = np.sqrt(quantile**2 + room.depth)
    reach_on_bound = np.sqrt(max(quantile**2 + room.depth - room.distance, 0.0))
    sd_on_bound = _sd(_slopes(function, room.on_bound), room.covariance_on_bound)
    ends, is_shortened = [], False
    for side in (-1, 1):
        if room.above + side * reach * float(room.column @ slopes) / stderr >= 0:
            ends.append(centre + side * reach * stderr)
        else:
            ends.append(function(room.on_bound) + side * reach_on_bound * sd_on_bound)
            is_shortened = True
    low, high = float(ends[0]), float(ends[1])
    return Estimate(value=value, stderr=(high - low) / (2 * quantile) if is_shortened else stderr, ci95=(low, high))


def _slopes(function: Function, values: FloatArray) -> FloatArray:
    return np.asarray(gradient(lambda vector: (function(vector),), values)[0])


def _sd(slopes: FloatArray, covariance: FloatArray) -> float:
    return math.sqrt(max(float(slopes @ covariance @ slopes), 0.0))
