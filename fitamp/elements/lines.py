"""The classic straight lines through fitted poles and zeros, as a check beside the joint fit of the circuit.

The time of pole 2, a2/a1 of the denominator 1 + a1 s + a2 s² + …, is 1/(2π·pole 2) where pole 3 is far. Over the added
load it is a straight line of slope (C1 + Cc)/(gm2·Cc), and intercept over slope is the whole load there was, with C1
and Cc in series beside it. The zero time is one over the added resistance, of slope Cc and intercept
Cc·(Rz − 1/gm2) − Cgd/gm2.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np
from numpy.typing import ArrayLike

from fitamp.amplifier import Elements, coefficients
from fitamp.arrays import FloatArray, frozen_float
from fitamp.elements.result import ElementEstimate
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.fitting import LoopFit

__all__ = ["Line", "LineFit", "LineKind", "line_fits"]

# An element under test has no spread; here, where it matters little, a factor of e stands for that.
NO_PRIOR_SPREAD = 1.0


class LineKind(StrEnum):
    """Which line."""

    POLE2 = "pole2-over-load"  # time of pole 2 in s over the added load in F
    ZERO = "zero-over-resistance"  # zero time in s over the added resistance in Ω


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A straight line y = intercept + slope·x, in SI units."""

    intercept: float
    slope: float

    def at(self, x: ArrayLike) -> FloatArray:
        """The line at x, in its shape."""
        return np.asarray(self.intercept + self.slope * np.asarray(x, dtype=float), dtype=float)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LineFit:
    """A weighted straight line through the fits of single sweeps.

    files, x, y, y_stderr : the points; x in F or Ω, y in s, shape (n,)
    slope, intercept : in s/F (Ω) and s, or s/Ω (F) and s; covariance : of (intercept, slope), shape (2, 2), widened
        where the points scatter about the line by more than their errors
    chi_square, freedom : of the points about the line, before that
    joint : the same line by the joint fit of the circuit, to compare
    meaning : what the line says. Of pole 2: load beyond the designed and the bench's, in F, where C1 and Cc in series
        count as designed. Of the zero: Cc in F, which is the slope
    """

    kind: LineKind
    files: tuple[str, ...]
    x: FloatArray
    y: FloatArray
    y_stderr: FloatArray
    slope: Estimate
    intercept: Estimate
    covariance: FloatArray
    chi_square: float
    freedom: int
    joint: Line
    meaning: Estimate
    quantile: float

    @property
    def line(self) -> Line:
        """The line itself."""
        assert self.slope.value is not None
        assert self.intercept.value is not None
        return Line(intercept=self.intercept.value, slope=self.slope.value)

    def band(self, x: ArrayLike) -> tuple[FloatArray, FloatArray]:
        """Ends of the line's 95 % band at x, shapes (n,)."""
        at = np.atleast_1d(np.asarray(x, dtype=float))
        rows = np.column_stack([np.ones_like(at), at])
        reach = self.quantile * np.sqrt(np.einsum("ni,ij,nj->n", rows, self.covariance, rows))
        return self.line.at(at) - reach, self.line.at(at) + reach


def line_fits(estimate: ElementEstimate) -> tuple[LineFit, ...]:
    """The lines that the sweeps of an estimate allow: each needs two added loads, or two added resistances.

    The points are fits of two poles and a zero, which share the design's expectation of pole 3 and delay; what is wrong
    in it moves all of them alike and is not in the band.
    """
    kept = [not check.left_out for check in estimate.checks]
    fits = [fit for fit, keep in zip(estimate.fits, kept, strict=True) if keep]
    conditions = [condition for condition, keep in zip(estimate.conditions, kept, strict=True) if keep]
    # Pole 2 depends on the resistor a little: its line is drawn at the one that most sweeps have.
    common_ohm = Counter(condition.rz_added_ohm for condition in conditions).most_common(1)[0][0]
    at_one = [index for index, condition in enumerate(conditions) if condition.rz_added_ohm == common_ohm]
    loads = np.array([conditions[index].load_added_f for index in at_one])
    pole2 = _pole2_line(estimate, [fits[index] for index in at_one], loads, common_ohm)
    zero = _zero_line(estimate, fits, np.array([condition.rz_added_ohm for condition in conditions]))
    return tuple(line for line in (pole2, zero) if line is not None)


def _pole2_line(
    estimate: ElementEstimate, fits: Sequence[LoopFit], loads_f: FloatArray, rz_added_ohm: float
) -> LineFit | None:
    points = [_pole2_time(fit) for fit in fits]
    # a1 grows a little with the load, and gain-bandwidth falls alike: with it, a2 over a1 of the least load is left.
    references = [fit.parameters.gain_bandwidth_hz.value for fit in fits]
    usable = [index for index, point in enumerate(points) if point is not None and references[index] is not None]
    if len({loads_f[index] for index in usable}) < 2:
        return None
    least = min(usable, key=lambda index: loads_f[index])
    ratios = [(references[least] or 1.0) / (references[index] or 1.0) for index in usable]
    times = np.array([points[index] for index in usable], dtype=float) * np.array(ratios)[:, np.newaxis]
    designed, estimated = (
        _exact_pole2_line(estimate.circuit.loaded(values), rz_added_ohm, float(loads_f[least]))
        for values in (estimate.circuit.designed, estimate.vector)
    )
    return _fitted(
        LineKind.POLE2,
        [fits[index] for index in usable],
        loads_f[usable],
        times,
        joint=estimated,
        quantile=estimate.quantile,
        designed_f=designed.intercept / designed.slope,
        designed_sd_f=_designed_sd(estimate),
    )


def _pole2_time(fit: LoopFit) -> tuple[float, float] | None:
    """a2/a1 in s with its standard error, which relative to it is that of pole 2."""
    pole2, zero, split = (getattr(fit.parameters, name) for name in ("pole2_hz", "zero_time_s", "zero_pole2_split_s"))
    if not (pole2.is_measured and zero.is_measured and split.is_measured):
        return None
    time_s = zero.value - split.value
    return time_s, time_s * pole2.stderr / pole2.value


def _exact_pole2_line(loaded: Elements, rz_added_ohm: float, least_f: float) -> Line:
    """a2 over the a1 of the least load, a straight line in the added load, by two of its points."""
    elements = replace(loaded, Rz=max(loaded.Rz + rz_added_ohm, 0.0))
    names = ("gm1", "R1", "C1", "gm2", "R2", "Cc", "Rz", "Cgd")
    arguments = {name: getattr(elements, name) for name in names}
    denominators = [coefficients(**arguments, CL=elements.CL + added_f)[1] for added_f in (0.0, elements.CL, least_f)]
    first_s, second_s = (float(denominators[index][2] / denominators[2][1]) for index in (0, 1))
    return Line(intercept=first_s, slope=(second_s - first_s) / elements.CL)


def _designed_sd(estimate: ElementEstimate) -> float:
    """Standard deviation in F of what the design puts beside the chip's load: the bench's load, C1 and Cc in series."""
    design, nominal = estimate.design, estimate.circuit.nominal
    total_f = nominal.C1 + nominal.Cc
    by_first, by_bridge = (nominal.Cc / total_f) ** 2 * nominal.C1, (nominal.C1 / total_f) ** 2 * nominal.Cc
    spreads = [NO_PRIOR_SPREAD if name in design.under_test else design.spreads[name] for name in ("C1", "Cc")]
    return math.hypot(design.bench.load_f * design.bench.load_spread, by_first * spreads[0], by_bridge * spreads[1])


def _zero_line(estimate: ElementEstimate, fits: Sequence[LoopFit], resistances_ohm: FloatArray) -> LineFit | None:
    times = [fit.parameters.zero_time_s for fit in fits]
    usable = [index for index, time in enumerate(times) if time.is_measured]
    if len({resistances_ohm[index] for index in usable}) < 2:
        return None
    points = np.array([(times[index].value, times[index].stderr) for index in usable], dtype=float)
    found = estimate.circuit.physical(estimate.vector)
    joint = Line(
        intercept=found["Cc"] * (found["Rz"] - 1 / found["gm2"]) - found["Cgd"] / found["gm2"], slope=found["Cc"]
    )
    return _fitted(
        LineKind.ZERO,
        [fits[index] for index in usable],
        resistances_ohm[usable],
        points,
        joint=joint,
        quantile=estimate.quantile,
    )


def _fitted(
    kind: LineKind,
    fits: Sequence[LoopFit],
    x: FloatArray,
    points: FloatArray,
    *,
    joint: Line,
    quantile: float,
    designed_f: float = 0.0,
    designed_sd_f: float = 0.0,
) -> LineFit:
    """Weighted least squares of (intercept, slope); with a freedom left, as uncertain as the points scatter."""
    y, y_stderr = points.T
    # x in units of its spread, so that the two columns are of one size.
    unit = float(np.ptp(x))
    rows = np.column_stack([np.ones_like(x), x / unit]) / y_stderr[:, np.newaxis]
    covariance = np.linalg.inv(rows.T @ rows)
    intercept, slope = covariance @ (rows.T @ (y / y_stderr)) / np.array([1.0, unit])
    covariance = covariance / np.outer([1.0, unit], [1.0, unit])
    chi_square = float((((y - intercept - slope * x) / y_stderr) ** 2).sum())
    freedom = len(x) - 2
    if freedom and chi_square > freedom:
        covariance = covariance * chi_square / freedom
    slope_estimate, intercept_estimate = (
        Estimate.gaussian(float(value), math.sqrt(covariance[index, index]), quantile=quantile)
        for value, index in ((slope, 1), (intercept, 0))
    )
    meaning = slope_estimate
    if kind is LineKind.POLE2:
        by_both = np.array([1 / slope, -intercept / slope**2])
        sd_f = math.hypot(math.sqrt(float(by_both @ covariance @ by_both)), designed_sd_f)
        extra_f = float(intercept / slope) - designed_f
        meaning = Estimate.gaussian(extra_f, sd_f, quantile=quantile) if math.isfinite(sd_f) else NOT_KNOWN
    return LineFit(
        kind=kind,
        files=tuple(fit.sweep.origin.file for fit in fits),
        x=frozen_float(x),
        y=frozen_float(y),
        y_stderr=frozen_float(y_stderr),
        slope=slope_estimate,
        intercept=intercept_estimate,
        covariance=frozen_float(covariance),
        chi_square=chi_square,
        freedom=freedom,
        joint=joint,
        meaning=meaning,
        quantile=quantile,
    )
