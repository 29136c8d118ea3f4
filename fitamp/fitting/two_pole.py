"""The two-pole, one-zero loop gain as a model with analytic derivatives, and the loop-equation residual.

    T(s) = K(s) · g (1 + s τz) e^(−s τd) / (q + s + b s² + b τ3 s³)

with g = T(0)/a1, q = 1/a1, b = a2/a1 of the denominator 1 + a1 s + a2 s² (s = j2πf in rad/s). One smooth set of
parameters serves real and complex pole pairs, a pole 1 below the band (q → 0 leaves an integrator) and a pole 2 above
it (b → 0). K holds what is known beforehand. τ3, the far-pole time a3/a2, and the delay τd are held at known values or
free under a Gaussian prior: they are the two things that pass for a right-half-plane zero.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray, frozen_float
from fitamp.fitting.equation import Grid, LoopEquation
from fitamp.fitting.factors import Factor
from fitamp.fitting.leastsq import MAX_STEPS, TOLERANCE, Optimum, covariance_of, minimise
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = [
    "DelayPrior",
    "FarPoleCurve",
    "FarPolePrior",
    "Pole2Prior",
    "Solution",
    "TwoPole",
    "loop_equation",
    "solution_at",
    "solve",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class FarPolePrior:
    """What is known of the far-pole time: τ3 = intercept + slope·τz ± sd (s; one standard deviation).

    In the circuit τ3 is proportional to Rz, and so a straight line in the zero time. sd_s = 0 holds τ3 on the line's
    intercept (slope must be 0); sd_s = inf leaves it free.
    """

    intercept_s: float = 0.0
    slope: float = 0.0
    sd_s: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class FarPoleCurve:
    """Knowledge of the far-pole time that bends with the zero time: its tangent `at` a zero time.

    A fit starts at `zero_time_s` and lays the tangent anew where it finds the zero, until that moves by `settled_s` or
    less.
    """

    at: Callable[[float], FarPolePrior]
    zero_time_s: float
    settled_s: float


@dataclass(frozen=True, slots=True, kw_only=True)
class DelayPrior:
    """What is known of the path delay: mean ± sd, in seconds; 0 holds it, inf leaves it free."""

    mean_s: float = 0.0
    sd_s: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Pole2Prior:
    """Rough knowledge of pole 2, as a2/a1 in seconds with the standard deviation of its logarithm; None knows nothing.

    A zero and a pole that cancel may lie anywhere; this keeps them from being taken for the circuit's own far away.
    """

    time_s: float
    ln_sd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class TwoPole:
    """The model's fixed side: what is known, what is free, and the time by which τz, τ3 and τd are scaled.

    Parameter vector, in the order of `names`: ln g, ln q, ln b, τz/time_s, then τ3/time_s and τd/time_s where free,
    then the numbers of each further factor.
    """

    time_s: float
    known: Transfer | None = None
    far_pole: FarPolePrior = FarPolePrior()
    delay: DelayPrior = DelayPrior()
    pole2: Pole2Prior | None = None
    factors: tuple[Factor, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the free parameters, in order."""
        extra = (("far_pole",) if self.far_pole.sd_s else ()) + (("delay",) if self.delay.sd_s else ())
        further = tuple(f"factor{i}_{part}" for i, factor in enumerate(self.factors) for part in factor.parts)
        return ("ln_g", "ln_q", "ln_b", "zero", *extra, *further)

    def factor_values(self, values: FloatArray) -> tuple[FloatArray, ...]:
        """The part of the parameter vector that belongs to each further factor."""
        sizes = [len(factor.parts) for factor in self.factors]
        ends = np.cumsum([len(values) - sum(sizes), *sizes])
        return tuple(values[first:end] for first, end in pairwise(ends))

    def physical(self, values: FloatArray) -> tuple[float, float, float, float, float, float]:
        """(g, q, b, τz, τ3, τd) in SI units of a parameter vector."""
        numbers = values.tolist()
        g, q, b = (_exp(logarithm) for logarithm in numbers[:3])
        free_far_pole = bool(self.far_pole.sd_s)
        far_pole_s = numbers[4] * self.time_s if free_far_pole else self.far_pole.intercept_s
        delay_s = numbers[4 + free_far_pole] * self.time_s if self.delay.sd_s else self.delay.mean_s
        return g, q, b, numbers[3] * self.time_s, far_pole_s, delay_s

    def vector(
        self,
        *,
        g: float,
        q: float,
        b: float,
        zero_time_s: float,
        far_pole_s: float | None = None,
        delay_s: float | None = None,
    ) -> FloatArray:
        """Parameter vector of SI values; τ3 and τd, where free and not given, start from their priors."""
        values = [np.log(g), np.log(q), np.log(b), zero_time_s / self.time_s]
        if self.far_pole.sd_s:
            expected = max(self.far_pole.intercept_s + self.far_pole.slope * zero_time_s, 0.0)
            values.append((expected if far_pole_s is None else far_pole_s) / self.time_s)
        if self.delay.sd_s:
            values.append((self.delay.mean_s if delay_s is None else delay_s) / self.time_s)
        return np.array(values)

    def gain(self, values: FloatArray, freq_hz: FloatArray) -> ComplexArray:
        """Loop gain of a parameter vector, shape (n,)."""
        return self.gain_and_log_slopes(values, Grid.over(freq_hz, self.known))[0]

    def gain_and_derivatives(self, values: FloatArray, freq_hz: FloatArray) -> tuple[ComplexArray, ComplexArray]:
        """Loop gain, shape (n,), and its derivatives by the parameters, shape (n, p)."""
        gain, log_slopes = self.gain_and_log_slopes(values, Grid.over(freq_hz, self.known))
        return gain, np.ascontiguousarray((gain * log_slopes).T)

    def gain_and_log_slopes(self, values: FloatArray, grid: Grid) -> tuple[ComplexArray, ComplexArray]:
        """Loop gain, shape (n,), and the derivatives of its logarithm by the parameters, shape (p, n)."""
        g, q, b, zero_time_s, far_pole_s, delay_s = self.physical(values)
        s = grid.s
        beyond = b * grid.s2 + (b * far_pole_s) * grid.s3 if far_pole_s else b * grid.s2
        inverse = 1 / (q + s + beyond)
        lead = 1 + s * zero_time_s
        gain = g * lead * inverse
        if delay_s:
            gain = gain * np.exp(-s * delay_s)
        if grid.known is not None:
            gain = gain * grid.known
        slopes = np.empty((len(values), len(s)), dtype=np.complex128)
        slopes[0] = 1.0
        slopes[1] = -q * inverse
        slopes[2] = -beyond * inverse
        slopes[3] = self.time_s * s / lead
        row = 4
        if self.far_pole.sd_s:
            slopes[row] = (-b * self.time_s) * grid.s3 * inverse
            row += 1
        if self.delay.sd_s:
            slopes[row] = -self.time_s * s
            row += 1
        for factor, own in zip(self.factors, self.factor_values(values), strict=True):
            times, log_slopes = factor.factor_and_derivatives(own, s)
            gain = gain * times
            slopes[row : row + len(own)] = log_slopes.T
            row += len(own)
        return gain, slopes

    def prior_rows(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Residuals of the priors in standard deviations, shape (r,), and their derivatives, shape (r, p)."""
        residuals: list[float] = []
        rows: list[FloatArray] = []
        for name, mean, slope, sd in (
            ("far_pole", self.far_pole.intercept_s, self.far_pole.slope, self.far_pole.sd_s),
            ("delay", self.delay.mean_s, 0.0, self.delay.sd_s),
        ):
            if not 0 < sd < np.inf:
                continue
            index = self.names.index(name)
            row = np.zeros(len(values))
            row[index], row[3] = self.time_s / sd, -slope * self.time_s / sd
            residuals.append(float(row @ values - mean / sd))
            rows.append(row)
        if self.pole2 is not None:
            row = np.zeros(len(values))
            row[2] = 1 / self.pole2.ln_sd
            residuals.append(float((values[2] - np.log(self.pole2.time_s)) / self.pole2.ln_sd))
            rows.append(row)
        return np.array(residuals), np.array(rows).reshape(len(rows), len(values))

    def response(self, values: FloatArray) -> Transfer:
        """The fitted response as gain, poles and zero, without `known` and without the path delay.

        A far pole enters only where its time is positive: noise can push a τ3 near zero below it.
        """
        g, q, b, zero_time_s, far_pole_s, _ = self.physical(values)
        denominator = [1.0, 1 / q, b / q] + ([b * far_pole_s / q] if far_pole_s > 0 else [])
        numerator = [g / q] + ([g / q * zero_time_s] if zero_time_s else [])
        return Transfer.from_polynomials(numerator, denominator)

    def whole_response(self, values: FloatArray) -> Transfer:
        """`response` with the roots of all further factors."""
        whole = self.response(values)
        for factor, own in zip(self.factors, self.factor_values(values), strict=True):
            poles_hz, zeros_hz = factor.roots_hz(own)
            whole = whole.cascade(Transfer(dc_gain=1.0, poles_hz=poles_hz, zeros_hz=zeros_hz))
        return whole


def _exp(logarithm: float) -> float:
    """The exponential, infinite where it overflows."""
    try:
        return math.exp(logarithm)
    except OverflowError:
        return math.inf


@dataclass(frozen=True, slots=True, kw_only=True)
class Solution:
    """A model fitted to a sweep: the optimum, and the noise it was weighted with."""

    model: TwoPole
    optimum: Optimum
    noise: NoiseLevels
    points: int

    @property
    def values(self) -> FloatArray:
        """Parameter vector at the optimum."""
        return self.optimum.values

    @property
    def covariance(self) -> FloatArray:
        """Covariance of the parameter vector."""
        return self.optimum.covariance

    @property
    def residuals(self) -> ComplexArray:
        """Loop-equation residuals in standard deviations per component, shape (n,), without the priors' rows."""
        rows = self.optimum.residuals[: 2 * self.points]
        return np.asarray(rows[0::2] + 1j * rows[1::2])

    @property
    def reduced_chi_square(self) -> float:
        """Chi-square per degree of freedom; near 1 where model and noise are right."""
        return self.optimum.chi_square / max(len(self.optimum.residuals) - len(self.values), 1)


def loop_equation(
    model: TwoPole, values: FloatArray, sweep: Sweep, noise: NoiseLevels
) -> tuple[ComplexArray, ComplexArray]:
    """Residuals (n,) of the loop equation in standard deviations per component, and derivatives (n, p)."""
    equation = LoopEquation(model, sweep, noise)
    rows, slopes = equation.residuals(values), equation.slopes(values)
    real, imag = slice(0, 2 * len(sweep), 2), slice(1, 2 * len(sweep), 2)
    return np.asarray(rows[real] + 1j * rows[imag]), np.asarray(slopes[real] + 1j * slopes[imag])


def solve(
    model: TwoPole,
    sweep: Sweep,
    noise: NoiseLevels,
    start: FloatArray,
    *,
    hold: tuple[int, float] | None = None,
    tolerance: float = TOLERANCE,
    max_steps: int = MAX_STEPS,
    enough: float = 0.0,
) -> Solution:
    """Fit the model by weighted least squares from `start`; `hold` = (index, value) keeps one parameter there.

    `enough` : a chi-square below which nobody needs to know more; a coarse fit ends there, not converged.
    """
    free = [i for i in range(len(start)) if hold is None or i != hold[0]]
    template = np.array(start, dtype=float)
    if hold is not None:
        template[hold[0]] = hold[1]

    def full(partial: FloatArray) -> FloatArray:
        values = template.copy()
        values[free] = partial
        return values

    equation = LoopEquation(model, sweep, noise)
    # An iterate that overflows costs one step, not a warning: the residual is not finite there and MINPACK turns back.
    with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
        optimum = minimise(
            lambda partial: equation.residuals(full(partial)),
            template[free],
            names=[model.names[i] for i in free],
            jacobian=lambda partial: equation.slopes(full(partial))[:, free],
            tolerance=tolerance,
            max_steps=max_steps,
            enough=enough,
        )
    return Solution(
        model=model, optimum=_completed(optimum, model, full(optimum.values), free), noise=noise, points=len(sweep)
    )


def solution_at(model: TwoPole, sweep: Sweep, noise: NoiseLevels, values: FloatArray) -> Solution:
    """These very values as a solution, with the covariance that the curvature there gives."""
    equation = LoopEquation(model, sweep, noise)
    residuals = equation.residuals(values)
    optimum = Optimum(
        names=model.names,
        values=frozen_float(values),
        covariance=frozen_float(covariance_of(equation.slopes(values))),
        chi_square=float(residuals @ residuals),
        residuals=frozen_float(residuals),
        converged=bool(np.isfinite(residuals).all()),
    )
    return Solution(model=model, optimum=optimum, noise=noise, points=len(sweep))


def _completed(optimum: Optimum, model: TwoPole, values: FloatArray, free: list[int]) -> Optimum:
    """The optimum over all parameters, a held one with variance 0."""
    if len(free) == len(values):
        return optimum
    covariance = np.zeros((len(values), len(values)))
    covariance[np.ix_(free, free)] = optimum.covariance
    return Optimum(
        names=model.names,
        values=values,
        covariance=covariance,
        chi_square=optimum.chi_square,
        residuals=optimum.residuals,
        converged=optimum.converged,
    )
