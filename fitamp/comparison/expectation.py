"""What a design says beforehand: the far pole, the delay, the chip's other roots, and the design seen as measured.

A third pole and a delay pass for a right-half-plane zero, so a verdict takes them from the design, with the design's
own uncertainty, and not as absent.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace
from functools import partial
from typing import Any

from fitamp.amplifier import Elements, coefficients
from fitamp.comparison.mirror import mirror_moved, widened_by_mirror
from fitamp.design import Design, Roots
from fitamp.errors import FitError
from fitamp.fitting import DelayPrior, FarPoleCurve, FarPolePrior, LoopFit, Pole2Prior, fit_sweep
from fitamp.sweep import NoiseLevels, Origin, Sweep
from fitamp.transfer import Transfer

__all__ = ["Expectation", "designed_as_measured", "expectation", "fit_with_design"]

# The far pole's elements that a fit to the same sweep does not settle, in the order of their weight.
FAR_POLE_ELEMENTS = ("gm2", "C1", "CL", "Cc", "R1", "R2")
# An element under test has no prior; for the far pole, where it matters little, a factor of e stands for that.
NO_PRIOR_SPREAD = 1.0
# However small the stated spreads: element equations are not better than this share of C/gm2.
FAR_POLE_FLOOR = 0.01
# One standard deviation of ln pole 2 before the sweep is seen: a factor of two.
POLE2_LN_SD = math.log(2)


@dataclass(frozen=True, slots=True, kw_only=True)
class Expectation:
    """Priors and known factor that go into the fit of a sweep of this design."""

    far_pole: FarPolePrior | FarPoleCurve
    delay: DelayPrior
    pole2: Pole2Prior
    known: Transfer | None

    def as_arguments(self) -> dict[str, Any]:
        """Keyword arguments of `fit_sweep`."""
        return {"far_pole": self.far_pole, "delay": self.delay, "pole2": self.pole2, "known": self.known}


def expectation(design: Design) -> Expectation:
    """What the design expects of its parts.

    The far pole follows the zero that is found, so that a part without its resistor is not judged with the far pole of
    one that has it.
    """
    if design.elements is None:
        return _from_roots(design)
    elements = replace(design.elements, CL=design.elements.CL + design.bench.load_f)
    mirror_spread_s = 0.0
    if elements.mirror_pole_hz is not None:
        # Pole at f and zero at 2f: a lag of 1/(2π 2f) to first order, uncertain as the pole is.
        mirror_spread_s = design.spreads.get("mirror_pole_hz", 0.0) / (4 * math.pi * elements.mirror_pole_hz)
    return Expectation(
        far_pole=FarPoleCurve(
            at=partial(_far_pole_line, elements, design),
            zero_time_s=design.zero_time_s,
            settled_s=0.2 * design.small_zero_time_s,
        ),
        delay=_delay_prior(design, mirror_spread_s),
        pole2=_pole2_prior(replace(elements, mirror_pole_hz=None, delay_s=0.0).transfer()),
        known=_known_factor(elements),
    )


def _delay_prior(design: Design, further_sd_s: float) -> DelayPrior:
    """The bench's delay as stated; free where it is not: unknown is not zero."""
    bench = design.bench
    if bench.delay_s is None:
        return DelayPrior(sd_s=math.inf)
    return DelayPrior(mean_s=bench.delay_s, sd_s=math.hypot(bench.delay_spread_s, further_sd_s))


def _pole2_prior(core: Transfer) -> Pole2Prior:
    """The design's a2/a1, known to a factor: neither spreads nor a forgotten probe move pole 2 much farther."""
    denominator = core.polynomials()[1]
    return Pole2Prior(time_s=float(denominator[2] / denominator[1]), ln_sd=POLE2_LN_SD)


def _from_roots(design: Design) -> Expectation:
    roots = design.roots
    assert isinstance(roots, Roots)
    far_pole = FarPolePrior(sd_s=math.inf)
    if roots.pole3_hz is not None:
        time_s = 1 / (2 * math.pi * roots.pole3_hz)
        far_pole = FarPolePrior(
            intercept_s=time_s, sd_s=time_s * max(roots.spreads.get("pole3_hz", 0.0), FAR_POLE_FLOOR)
        )
    return Expectation(
        far_pole=far_pole,
        delay=_delay_prior(design, 0.0),
        pole2=_pole2_prior(roots.transfer()),
        # The loop's own delay is the chip's, and so part of its margins; the bench's is not.
        known=Transfer(dc_gain=1.0, poles_hz=(), delay_s=roots.delay_s) if roots.delay_s else None,
    )


def far_pole_time(elements: Elements, zero_time_s: float) -> float:
    """a3/a2 of the exact circuit whose Rz gives this zero time; about Rz·C1·CL·Cc/(C1·CL + Cc·(C1 + CL))."""
    _, denominator = coefficients(**_arguments(elements), Rz=resistor_for(elements, zero_time_s))
    return float(denominator[3] / denominator[2])


def resistor_for(elements: Elements, zero_time_s: float) -> float:
    """Nulling resistor that gives a zero time: Rz = (τz + Cgd/gm2)/Cc + 1/gm2."""
    return (zero_time_s + elements.Cgd / elements.gm2) / elements.Cc + 1 / elements.gm2


def _arguments(elements: Elements) -> dict[str, float]:
    wanted = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Cgd", "beta")
    return {field.name: getattr(elements, field.name) for field in fields(elements) if field.name in wanted}


def _far_pole_line(elements: Elements, design: Design, zero_time_s: float) -> FarPolePrior:
    """Tangent to τ3(τz) at `zero_time_s`, with the spread that the elements' own spreads give."""
    # A resistor cannot be negative: left of that point the line starts from Rz = 0.
    at = max(zero_time_s, -(elements.Cc + elements.Cgd) / elements.gm2)
    step = 0.01 * elements.Cc / elements.gm2
    here = far_pole_time(elements, at)
    slope = (far_pole_time(elements, at + step) - here) / step
    variance = (FAR_POLE_FLOOR * slope * elements.Cc / elements.gm2) ** 2
    for name in FAR_POLE_ELEMENTS:
        spread = NO_PRIOR_SPREAD if name in design.under_test else design.spreads[name]
        value = getattr(elements, name)
        moved = far_pole_time(replace(elements, **{name: value * 1.001}), at)
        variance += ((moved - here) / 0.001 * spread) ** 2
    return FarPolePrior(intercept_s=here - slope * at, slope=slope, sd_s=math.sqrt(variance))


def _known_factor(elements: Elements) -> Transfer | None:
    """The chip's roots that the two-pole model does not hold: mirror pair, a far zero through Cgd, the loop's delay."""
    core = replace(elements, mirror_pole_hz=None, delay_s=0.0).transfer()
    poles: tuple[complex, ...] = ()
    zeros = tuple(sorted(core.zeros_hz, key=abs)[1:])
    if elements.mirror_pole_hz is not None:
        poles, zeros = (-elements.mirror_pole_hz,), (*zeros, -2 * elements.mirror_pole_hz)
    if not poles and not zeros and not elements.delay_s:
        return None
    return Transfer(dc_gain=1.0, poles_hz=poles, zeros_hz=zeros, delay_s=elements.delay_s)


def fit_with_design(
    sweep: Sweep, design: Design, *, noise: NoiseLevels | None = None, keep_all: bool = False
) -> LoopFit:
    """Fit a sweep with the design's far pole, delay and known factor as priors.

    Errors hold what an uncertain mirror pole adds. `keep_all` keeps glitches and mains lines.

    Raises
    ------
    FitError
        As `fit_sweep`.
    """
    fit = fit_sweep(sweep, noise=noise, keep_all=keep_all, **expectation(design).as_arguments())
    moved = mirror_moved(design)
    if moved is None:
        return fit
    return widened_by_mirror(fit, [expectation(other).known for other in moved])


def designed_as_measured(design: Design, fit: LoopFit) -> LoopFit | None:
    """The designed response through the same band, weights, priors and model as the sweep; None where that fails."""
    freq_hz = fit.sweep.freq_hz
    gain = design.on_bench().evaluate(freq_hz)
    sweep = Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file=f"{design.file} (designed)", form="computed"))
    try:
        return fit_sweep(sweep, noise=fit.noise, keep_all=True, **expectation(design).as_arguments())
    except FitError:
        return None
