"""The zero time's interval by following chi-square, where the circuit's curvature misleads.

Near n = 1 a delay that is not known and a zero far out act alike: there chi-square lies in a curved valley. The zero
time takes the place of Rz in the vector, Rz = (τz + Cgd/gm2)/Cc + 1/gm2, is held, and all else is refitted.
"""

from __future__ import annotations

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.elements.residual import stacked
from fitamp.elements.search import RACE_TOLERANCE
from fitamp.elements.solving import CircuitSolution
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting.leastsq import minimise

__all__ = ["followed"]

# An end is found when the root of the rise of chi-square is right to this share.
CLOSE = 0.02
MAX_STEPS = 100
MOST_REFITS = 16
# So many times farther out than the curvature says, an end is open.
FARTHEST = 8.0
GROWTH = 2.0


def followed(estimate: Estimate, solution: CircuitSolution, *, quantile: float) -> Estimate:
    """A zero time's estimate by curvature with the ends that chi-square itself has.

    An end at which Rz would be negative stays as it is.

    solution : with Rz free, and not on its bound
    """
    value, stderr = estimate.value, estimate.stderr
    if value is None or not stderr:
        return estimate
    held = _HeldZero(solution)
    low, high = (
        held.end(value, side * stderr, quantile, at_bound_s=own)
        for side, own in zip((-1, 1), estimate.ci95, strict=True)
    )
    if low is None and high is None:
        return NOT_KNOWN
    if low is None or high is None:
        known = Known.LOWER_BOUND if high is None else Known.UPPER_BOUND
        return Estimate(value=None, stderr=None, ci95=(low, high), known=known)
    return Estimate(value=value, stderr=(high - low) / (2 * quantile), ci95=(low, high))


class _HeldZero:
    """Refits of a circuit with its zero time held."""

    def __init__(self, solution: CircuitSolution) -> None:
        self._solution = solution
        self._circuit = solution.circuit
        index = self._circuit.index("Rz")
        assert index is not None
        self._resistor = index
        self._others = [i for i in range(len(solution.values)) if i != index]
        self._scale = self._circuit.parameters[index].scale

    def end(self, value_s: float, step_s: float, quantile: float, *, at_bound_s: float | None) -> float | None:
        """Where chi-square has risen by quantile², on the side of `step_s`; None where it does not within reach.

        at_bound_s : the end where Rz would be negative there

        The root of the rise of a parabola is a straight line: by regula falsi on it.
        """
        inner, inner_root, outer, outer_root = 0.0, 0.0, np.inf, np.inf
        start = self._solution.values[self._others]
        offset = quantile
        for _ in range(MOST_REFITS):
            root, values = self._root_of_rise(value_s + offset * step_s, start)
            if self._vector(values, value_s + offset * step_s)[0][self._resistor] < 0:
                return at_bound_s
            if abs(root - quantile) < CLOSE * quantile:
                return value_s + offset * step_s
            if root < quantile:
                inner, inner_root, start = offset, root, values
            else:
                outer, outer_root = offset, root
            if np.isinf(outer):
                if offset > FARTHEST * quantile:
                    return None
                offset = min(offset * GROWTH, 1.05 * offset * quantile / max(root, 0.1))
            elif np.isinf(outer_root):
                offset = (inner + outer) / 2
            else:
                share = (quantile - inner_root) / (outer_root - inner_root)
                offset = inner + (outer - inner) * float(np.clip(share, 0.05, 0.95))
        return value_s + (outer if np.isfinite(outer) else inner) * step_s

    def _root_of_rise(self, zero_time_s: float, start: FloatArray) -> tuple[float, FloatArray]:
        def residual(others: FloatArray) -> FloatArray:
            return stacked(self._circuit, self._vector(others, zero_time_s)[0], self._solution.sweeps)[0]

        def jacobian(others: FloatArray) -> FloatArray:
            vector, slopes = self._vector(others, zero_time_s)
            rows = stacked(self._circuit, vector, self._solution.sweeps)[1]
            return np.asarray(rows[:, self._others] + np.outer(rows[:, self._resistor], slopes))

        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            optimum = minimise(
                residual,
                start,
                names=[self._circuit.names[i] for i in self._others],
                jacobian=jacobian,
                tolerance=RACE_TOLERANCE,
                max_steps=MAX_STEPS,
            )
        rise = optimum.chi_square - self._solution.optimum.chi_square
        return (float(np.sqrt(max(rise, 0.0))) if np.isfinite(rise) else np.inf), np.asarray(optimum.values)

    def _vector(self, others: FloatArray, zero_time_s: float) -> tuple[FloatArray, FloatArray]:
        """The whole vector, and the derivatives of its Rz by the others."""
        vector = np.array(self._solution.values)
        vector[self._others] = others
        found = self._circuit.physical(vector)
        gm2, Cc, Cgd = found["gm2"], found["Cc"], found["Cgd"]
        vector[self._resistor] = ((zero_time_s + Cgd / gm2) / Cc + 1 / gm2) / self._scale
        # By the logarithms of these; Rz depends on no other.
        by_name = {
            "Cc": -(zero_time_s + Cgd / gm2) / Cc,
            "gm2": -Cgd / gm2 / Cc - 1 / gm2,
            "Cgd": Cgd / gm2 / Cc,
        }
        names = [self._circuit.names[i] for i in self._others]
        return vector, np.array([by_name.get(name, 0.0) for name in names]) / self._scale
