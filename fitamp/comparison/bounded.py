"""Estimates of what follows from a circuit's vector, where a resistor cannot be negative.

Chi-square counts from its least value with Rz at 0 or more. Away from that bound an interval reaches from −q to +q
standard errors; near it, to where chi-square has risen by q², with all else refitted, and so less far on a side on
which Rz would have to be negative.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.solving import CircuitSolution, least_resistor_ohm
from fitamp.estimate import Estimate
from fitamp.fitting.intervals import gradient

__all__ = ["bounded_estimate"]

# Of a variance that is nothing but the rounding of a difference.
ROUNDING = 1e-10


def bounded_estimate(
    function: Callable[[FloatArray], float], solution: CircuitSolution, *, quantile: float
) -> Estimate:
    """Value of a function at the optimum, with the ends of its 95 % interval under Rz ≥ 0.

    Parameters
    ----------
    function
        Of the vector, shape (p,); smooth also where Rz passes 0.
    quantile
        q, by which a 95 % interval is wider than a standard error.

    Returns
    -------
    Estimate
        Where the bound shortens the interval, `stderr` is its length over 2q.

    Notes
    -----
    Each end is the function at the vector at which, to first order, it is least or largest among those whose
    chi-square is within q² of the optimum (profile likelihood; with the bound, the ordering by likelihood ratio of
    G. J. Feldman and R. D. Cousins, Phys. Rev. D 57, 1998). Elements enter as logarithms, so that the interval of
    their product is one in the logarithm.
    """
    covariance, values = solution.covariance, solution.values
    slopes = gradient(lambda vector: (function(vector),), values)[0]
    stderr = float(np.sqrt(max(slopes @ covariance @ slopes, 0.0)))
    if not stderr:
        return Estimate.gaussian(function(values), 0.0, quantile=quantile)
    centre = values if solution.unbounded is None else solution.unbounded
    face = _Face.of(solution, centre)
    reach = np.sqrt(quantile**2 + (face.depth if face is not None else 0.0))
    ends, is_shortened = [], False
    for side in (-1.0, 1.0):
        end = centre + side * reach * (covariance @ slopes) / stderr
        if face is not None and end[face.index] < face.bound:
            end = face.end(slopes, side, quantile)
            is_shortened = True
        ends.append(function(end))
    low, high = min(ends), max(ends)
    return Estimate(
        value=function(values), stderr=(high - low) / (2 * quantile) if is_shortened else stderr, ci95=(low, high)
    )


class _Face:
    """Where Rz is at its bound, and chi-square within it."""

    def __init__(self, solution: CircuitSolution, centre: FloatArray, index: int) -> None:
        self.index = index
        self.bound = solution.circuit.parameters[index].from_si(least_resistor_ohm(solution.sweeps))
        covariance = solution.covariance
        column, variance = covariance[:, index], float(covariance[index, index])
        self.distance = (self.bound - float(centre[index])) ** 2 / variance
        # Chi-square at its least with a resistor, over the least without regard to the bound.
        self.depth = self.distance if centre[index] < self.bound else 0.0
        self.touching = solution.values
        if solution.unbounded is None:
            self.touching = centre + column * (self.bound - float(centre[index])) / variance
        self.covariance = covariance - np.outer(column, column) / variance
        self.whole = covariance

    @classmethod
    def of(cls, solution: CircuitSolution, centre: FloatArray) -> _Face | None:
        """The face of a solution; None where Rz is held as designed."""
        index = solution.circuit.index("Rz")
        return None if index is None else cls(solution, centre, index)

    def end(self, slopes: FloatArray, side: float, quantile: float) -> FloatArray:
        """The vector on the face at which a function with these slopes is least or largest."""
        variance = float(slopes @ self.covariance @ slopes)
        if variance <= ROUNDING * float(slopes @ self.whole @ slopes):
            return np.asarray(self.touching)
        left = np.sqrt(max(quantile**2 + self.depth - self.distance, 0.0))
        end = self.touching + side * left * (self.covariance @ slopes) / np.sqrt(variance)
        end[self.index] = self.bound  # and not its neighbour by rounding
        return np.asarray(end)
