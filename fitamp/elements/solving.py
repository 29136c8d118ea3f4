"""Fitting the circuit's vector to one or many sweeps, with Rz kept at 0 or more."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray, frozen_float
from fitamp.elements.circuit import Circuit
from fitamp.elements.residual import Measured, loop_equation, stacked
from fitamp.fitting.leastsq import Optimum, covariance_of, minimise
from fitamp.sweep import NoiseLevels

__all__ = ["CircuitSolution", "SweepResiduals", "least_resistor_ohm", "residuals_at", "solve", "solve_free"]

# Relative, on chi-square and vector: six digits beyond what noise leaves of either.
TOLERANCE = 1e-12
# Sweeps that contradict one another go down a slow valley; what is not settled by then is as good as it gets.
MAX_STEPS = 300


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepResiduals:
    """Residuals of one sweep, complex, in standard deviations per component, shape (n,), and the noise behind them."""

    residuals: ComplexArray
    noise: NoiseLevels

    @property
    def chi_square(self) -> float:
        """Sum of their squares."""
        return float((np.abs(self.residuals) ** 2).sum())

    @property
    def reduced_chi_square(self) -> float:
        """Chi-square for each number; the few that the shared elements take up count for nothing here."""
        return self.chi_square / (2 * len(self.residuals))


@dataclass(frozen=True, slots=True, kw_only=True)
class CircuitSolution:
    """A circuit fitted to sweeps.

    optimum : its covariance is that of all parameters free, also where Rz ended on its bound
    unbounded : the vector without regard to the bound of Rz, where it ended on it; else None
    """

    circuit: Circuit
    sweeps: tuple[Measured, ...]
    optimum: Optimum
    unbounded: FloatArray | None = None

    @property
    def values(self) -> FloatArray:
        """The vector at the optimum, shape (p,)."""
        return self.optimum.values

    @property
    def covariance(self) -> FloatArray:
        """Covariance of the vector, shape (p, p)."""
        return self.optimum.covariance

    @property
    def points(self) -> int:
        """Number of points of all sweeps together."""
        return sum(len(one.sweep) for one in self.sweeps)

    def rows_of(self, which: int) -> slice:
        """Rows of one sweep in residuals and Jacobian."""
        sizes = [2 * len(one.sweep) for one in self.sweeps]
        return slice(sum(sizes[:which]), sum(sizes[: which + 1]))

    def residuals_of(self, which: int) -> SweepResiduals:
        """Residuals of one sweep, with its own noise even where it counts for less."""
        return residuals_at(self.circuit, self.values, self.sweeps[which])


def residuals_at(circuit: Circuit, values: FloatArray, one: Measured) -> SweepResiduals:
    """Residuals of one sweep at a vector, with its own noise even where it counts for less."""
    gain, slopes = circuit.gain_and_derivatives(values, one.sweep.freq_hz, one.condition)
    if one.factor is not None:
        gain = gain * one.factor
    return SweepResiduals(residuals=loop_equation(gain, slopes, one.sweep.gain, one.noise)[0], noise=one.noise)


def least_resistor_ohm(sweeps: Sequence[Measured]) -> float:
    """The least Rz with which no sweep has a negative resistance in all."""
    return max(0.0, *(-one.condition.rz_added_ohm for one in sweeps))


def solve(
    circuit: Circuit,
    sweeps: Sequence[Measured],
    start: FloatArray,
    *,
    tolerance: float = TOLERANCE,
    max_steps: int = MAX_STEPS,
) -> CircuitSolution:
    """Fit from `start`; an Rz that would end below its bound is held on it."""
    free = solve_free(circuit, sweeps, start, tolerance=tolerance, max_steps=max_steps)
    index = circuit.index("Rz")
    if index is None:
        return free
    bound = circuit.parameters[index].from_si(least_resistor_ohm(sweeps))
    if not free.values[index] < bound:
        return free
    held = solve_free(circuit, sweeps, free.values, hold={index: bound}, tolerance=tolerance, max_steps=max_steps)
    return replace(held, unbounded=free.values)


def solve_free(
    circuit: Circuit,
    sweeps: Sequence[Measured],
    start: FloatArray,
    *,
    hold: Mapping[int, float] | None = None,
    tolerance: float = TOLERANCE,
    max_steps: int = MAX_STEPS,
) -> CircuitSolution:
    """Fit without any bound, with some numbers of the vector held."""
    held = hold or {}
    free = [index for index in range(len(start)) if index not in held]
    template = np.array(start, dtype=float)
    for index, number in held.items():
        template[index] = number
    rows = _Rows(circuit, sweeps)

    def full(partial: FloatArray) -> FloatArray:
        values = template.copy()
        values[free] = partial
        return values

    # An iterate that overflows costs one step, not a warning: the residual is not finite there and MINPACK turns back.
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        optimum = minimise(
            lambda partial: rows.at(full(partial))[0],
            template[free],
            names=[circuit.names[index] for index in free],
            jacobian=lambda partial: rows.at(full(partial))[1][:, free],
            tolerance=tolerance,
            max_steps=max_steps,
        )
    values = full(optimum.values)
    if held:
        optimum = Optimum(
            names=circuit.names,
            values=frozen_float(values),
            covariance=frozen_float(covariance_of(rows.at(values)[1])),
            chi_square=optimum.chi_square,
            residuals=optimum.residuals,
            converged=optimum.converged,
        )
    return CircuitSolution(circuit=circuit, sweeps=tuple(sweeps), optimum=optimum)


class _Rows:
    """Residuals and derivatives, which come together, at the vector that was asked for last."""

    def __init__(self, circuit: Circuit, sweeps: Sequence[Measured]) -> None:
        self._circuit, self._sweeps = circuit, sweeps
        self._values: FloatArray | None = None
        self._found: tuple[FloatArray, FloatArray]

    def at(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        if self._values is None or not np.array_equal(values, self._values):
            self._found = stacked(self._circuit, values, self._sweeps)
            self._values = values.copy()
        return self._found
