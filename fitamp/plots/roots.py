"""Poles and zeros as marks to draw: place in the s-plane over 2π (Hz), 95 % region, and words.

A zero is taken from its zero time, z = −1/(2π τz). An interval of τz around 0 becomes two regions that reach to
infinity on both sides: they are one region, and infinity lies inside it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.comparison import Comparison, Route
from fitamp.comparison.rows import designed_values
from fitamp.design import Design
from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit, ZeroPlace
from fitamp.fitting.result import Root, text_of
from fitamp.units import si, si_with_error

__all__ = ["Mark", "designed_marks", "deviation_words", "measured_marks", "zero_regions_hz"]

AT_INFINITY = "at infinity"

Regions = tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """One root, or one conjugate pair, to draw.

    value_hz : signed root (of a pair the one with positive imaginary part); None where there is only a region, or where
        the root is at infinity
    regions_hz : 95 % regions on the real axis, from and to, signed, possibly infinite; empty for an exact root
    covariance : of (re, im), shape (2, 2), where measured; in use for pairs
    side : "left" or "right" for a zero whose half plane is known, else ""
    words : the value, as text
    """

    name: str
    is_zero: bool
    value_hz: complex | None
    regions_hz: Regions = ()
    covariance: FloatArray | None = None
    side: str = ""
    words: str = ""

    @property
    def is_pair(self) -> bool:
        """Whether the mark stands for a conjugate pair."""
        return self.value_hz is not None and self.value_hz.imag != 0

    @property
    def is_at_infinity(self) -> bool:
        """Whether this is an exact zero at infinity."""
        return self.words == AT_INFINITY

    @property
    def reaches_infinity(self) -> bool:
        """Whether the region reaches to infinity, or the root lies there."""
        return self.is_at_infinity or any(math.isinf(end) for region in self.regions_hz for end in region)

    @property
    def label(self) -> str:
        """Name and, for a zero, half plane: "zero (left)"."""
        return f"{self.name} ({self.side})" if self.side else self.name

    @property
    def sentence(self) -> str:
        """Label and value, where there is one: "zero (left): 131 MHz"."""
        return f"{self.label}: {self.words}" if self.words else self.label


def zero_regions_hz(zero_time_s: Estimate) -> Regions:
    """95 % regions of the zero on the real axis (Hz), most negative first; empty where nothing is known."""
    low, high = zero_time_s.ci95
    if low is None and high is None:
        return ()
    low = -math.inf if low is None else low
    high = math.inf if high is None else high
    if low < 0 < high:
        return ((-math.inf, _zero_hz(high)), (_zero_hz(low), math.inf))
    # At τz = 0 exactly the zero is at infinity, on the side the rest of the interval lies on.
    near, far = sorted((abs(low), abs(high)), reverse=True)
    side = -1 if high > 0 else 1
    ends = sorted((side / (2 * math.pi * near), side / (2 * math.pi * far) if far else side * math.inf))
    return ((ends[0], ends[1]),)


def _zero_hz(zero_time_s: float) -> float:
    return -1 / (2 * math.pi * zero_time_s)


def measured_marks(fit: LoopFit, comparison: Comparison | None = None) -> tuple[Mark, ...]:
    """The fitted poles, numbered from the origin outwards, then the zero, by the circuit where the verdict rests on it.

    Pole 1 and 2 are there also where only a bound is known. Other roots that lie beyond the sweep without an error of
    their own are what the model needs for its shape, not what the sweep shows: they are left out.
    """
    poles: list[Mark] = []
    estimates = (("pole1_hz", fit.parameters.pole1_hz), ("pole2_hz", fit.parameters.pole2_hz))
    for index, root in enumerate(fit.poles):
        is_seen = _is_seen(root, index, fit)
        if root.value_hz.imag and is_seen:
            poles += [_pair(root)] if root.value_hz.imag > 0 else []
        elif index < len(estimates):
            quantity, estimate = estimates[index]
            poles.append(_pole(f"pole {index + 1}", estimate, text_of(quantity, estimate)))
        elif is_seen:
            poles.append(_far_pole(f"pole {index + 1}", root, fit))
    if comparison is not None and comparison.verdict.route is Route.CIRCUIT:
        return (*poles, _measured_zero(comparison.verdict.zero_time_s, is_undecided=False))
    is_undecided = fit.zero.half_plane is ZeroPlace.UNDECIDED
    return (*poles, _measured_zero(fit.parameters.zero_time_s, is_undecided=is_undecided))


def _is_seen(root: Root, index: int, fit: LoopFit) -> bool:
    """Whether the sweep shows this root: within the band, or beyond it with an error that keeps it from infinity."""
    if abs(root.value_hz) <= fit.sweep.f_max_hz:
        return True
    if root.covariance is None or (root.value_hz.imag and index <= 2 and not fit.parameters.pole2_hz.is_measured):
        return False
    return not root.value_hz.imag or fit.quantile**2 * float(np.trace(root.covariance)) < abs(root.value_hz) ** 2


def designed_marks(design: Design) -> tuple[Mark, ...]:
    """The designed poles with the bench's load, nearest the origin first, then the zero; all exact."""
    mirror_hz = design.elements.mirror_pole_hz if design.elements is not None else None
    poles = [pole for pole in design.on_bench().poles_hz if mirror_hz is None or pole != -mirror_hz]
    marks = []
    for index, pole in enumerate(poles):
        if pole.imag > 0:
            marks.append(_pair(Root(value_hz=pole, covariance=None)))
        elif pole.imag == 0:
            marks.append(Mark(name=f"pole {index + 1}", is_zero=False, value_hz=pole, words=si(abs(pole), "Hz")))
    zero_time_s = designed_values(design)["zero_time_s"]
    if not zero_time_s:
        return (*marks, Mark(name="zero", is_zero=True, value_hz=None, words=AT_INFINITY))
    zero_hz = _zero_hz(zero_time_s)
    side = "left" if zero_hz < 0 else "right"
    zero = Mark(name="zero", is_zero=True, value_hz=complex(zero_hz), side=side, words=si(abs(zero_hz), "Hz"))
    return (*marks, zero)


def deviation_words(comparison: Comparison | None, mark: Mark) -> str:
    """Relative deviation of a pole from the design, as " (−8.3 %)", or nothing."""
    quantity = {"pole 1": "pole1_hz", "pole 2": "pole2_hz"}.get(mark.name)
    if comparison is None or quantity is None:
        return ""
    deviation = comparison.row(quantity).deviation
    return "" if deviation is None else f" ({100 * deviation:+.1f} %)".replace("-", "−")


def _pole(name: str, estimate: Estimate, words: str) -> Mark:
    low, high = estimate.ci95
    regions: Regions = ()
    if low is not None or high is not None:
        regions = ((-math.inf if high is None else -high, 0.0 if low is None else -low),)
    value = None if estimate.value is None else complex(-estimate.value)
    return Mark(name=name, is_zero=False, value_hz=value, regions_hz=regions, words=words)


def _far_pole(name: str, root: Root, fit: LoopFit) -> Mark:
    """A third pole. Its time 1/(2π|pole|) is nearly normal; where that may be 0, the pole may be at infinity."""
    if root.covariance is None:
        words = f"about {si(abs(root.value_hz), 'Hz', digits=2)}"
        return Mark(name=name, is_zero=False, value_hz=root.value_hz, words=words)
    near, far = _far_pole_ends_hz(root, fit)
    words = f"above {si(near, 'Hz', digits=3)}"
    if math.isfinite(far):
        words = si_with_error(abs(root.value_hz), float(np.sqrt(root.covariance[0, 0])), "Hz")
    if 0 < fit.solution.model.far_pole.sd_s < math.inf:
        words += ", with the design's prior"
    return Mark(name=name, is_zero=False, value_hz=root.value_hz, regions_hz=((-far, -near),), words=words)


def _far_pole_ends_hz(root: Root, fit: LoopFit) -> tuple[float, float]:
    """Nearest and farthest distance within 95 %; the farthest is infinite where the interval of the time includes 0."""
    assert root.covariance is not None
    distance = abs(root.value_hz)
    share = fit.quantile * float(np.sqrt(root.covariance[0, 0])) / distance
    lowest_s = fit.parameters.far_pole_s.ci95[0]
    is_open = share >= 1 or (lowest_s is not None and lowest_s <= 0)
    return distance / (1 + share), math.inf if is_open else distance / (1 - share)


def _pair(root: Root) -> Mark:
    errors: tuple[float | None, float | None] = (None, None)
    if root.covariance is not None:
        errors = (float(np.sqrt(root.covariance[0, 0])), float(np.sqrt(root.covariance[1, 1])))
    real, imag = (
        si_with_error(part, error, "Hz")
        for part, error in zip((root.value_hz.real, root.value_hz.imag), errors, strict=True)
    )
    return Mark(
        name="pole pair",
        is_zero=False,
        value_hz=root.value_hz,
        covariance=root.covariance,
        words=f"{real} ± j·({imag})",
    )


def _measured_zero(zero_time: Estimate, *, is_undecided: bool) -> Mark:
    regions = zero_regions_hz(zero_time)
    through_infinity = len(regions) == 2
    value = complex(_zero_hz(zero_time.value)) if zero_time.value else None
    side = ""
    if regions and not through_infinity:
        side = "left" if regions[0][0] < 0 else "right"
    if side and is_undecided:
        side = f"{side}, if nothing else lags"
    if through_infinity:
        words = f"beyond {si(-regions[0][1], 'Hz', digits=3)} left or {si(regions[1][0], 'Hz', digits=3)} right"
    elif value is not None and zero_time.value is not None and zero_time.stderr is not None:
        words = si_with_error(abs(value), abs(value) * zero_time.stderr / abs(zero_time.value), "Hz")
    elif regions:
        words = _between(regions[0])
    else:
        words = "not determined"
    return Mark(name="zero", is_zero=True, value_hz=value, regions_hz=regions, side=side, words=words)


def _between(region: tuple[float, float]) -> str:
    near, far = sorted(abs(end) for end in region)
    if math.isinf(far):
        return f"beyond {si(near, 'Hz', digits=3)}"
    return f"{si(near, 'Hz', digits=3)} to {si(far, 'Hz', digits=3)}" if near else f"within {si(far, 'Hz', digits=3)}"
