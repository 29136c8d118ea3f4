"""What may be added and what has to change: loads that keep a phase margin, the resistor that restores the zero."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from fitamp.amplifier import Elements
from fitamp.arrays import FloatArray
from fitamp.elements.circuit import BENCH_LOAD, Circuit
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
from fitamp.elements.result import ElementEstimate
from fitamp.errors import UsageError
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.fitting.intervals import gradient
from fitamp.margins import margins

__all__ = ["LoadRange", "RestoringResistor", "load_range", "restoring_resistor"]

# Loads are looked through over this range about the part's own, so many a decade.
SEARCH_DECADES = 3.0
POINTS_PER_DECADE = 10


@dataclass(frozen=True, slots=True, kw_only=True)
class LoadRange:
    """Whole loads at the output that keep a phase margin, in one stretch.

    phase_margin_deg : the margin wanted
    load_f : the part's own load on the bench
    keeps : whether the part as it is keeps the margin; the stretch then holds its load, and else is the nearest one
    low_f, high_f : ends of the stretch, chip and bench included; None where it goes on for a thousandfold, or where no
        load keeps the margin (`keeps` is then False and both are None)
    room_f : load that may be added to the part on the bench, high_f − load_f; below 0 where there is too much already
    """

    phase_margin_deg: float
    load_f: float
    keeps: bool
    low_f: Estimate | None
    high_f: Estimate | None
    room_f: Estimate | None


@dataclass(frozen=True, slots=True, kw_only=True)
class RestoringResistor:
    """The nulling resistor that puts the zero of this part at the designed place.

    zero_time_s : designed zero time
    rz_ohm : resistor in all; below 0 where no resistor does it; change_ohm : less the part's own
    """

    zero_time_s: float
    rz_ohm: Estimate
    change_ohm: Estimate


def load_range(estimate: ElementEstimate, *, phase_margin_deg: float) -> LoadRange:
    """Find the loads that keep a phase margin.

    Raises
    ------
    UsageError
        When the margin is not between −180° and 180°.
    """
    if not -180 < phase_margin_deg < 180:
        raise UsageError(f"a phase margin lies between -180 and 180 degrees, but {phase_margin_deg:g} is wanted")
    part = estimate.circuit.loaded(estimate.vector)
    ln_own = math.log(part.CL)
    reach = SEARCH_DECADES * math.log(10)
    # An odd number, so that the part's own load is one of them.
    half = int(SEARCH_DECADES * POINTS_PER_DECADE)
    grid = ln_own + np.linspace(-reach, reach, 2 * half + 1)
    excess = np.array([_excess(part, float(ln_load), phase_margin_deg) for ln_load in grid])
    good = excess >= 0
    if not good.any():
        return LoadRange(
            phase_margin_deg=phase_margin_deg, load_f=part.CL, keeps=False, low_f=None, high_f=None, room_f=None
        )
    nearest = min(np.flatnonzero(good), key=lambda index: abs(index - half))
    first = last = int(nearest)
    while first > 0 and good[first - 1]:
        first -= 1
    while last < len(grid) - 1 and good[last + 1]:
        last += 1
    low = None if first == 0 else _end(estimate, part, grid[first - 1 : first + 1], phase_margin_deg)
    high = None if last == len(grid) - 1 else _end(estimate, part, grid[last : last + 2], phase_margin_deg)
    return LoadRange(
        phase_margin_deg=phase_margin_deg,
        load_f=part.CL,
        keeps=bool(good[half]),
        low_f=None if low is None else _lognormal(estimate, *low),
        high_f=None if high is None else _lognormal(estimate, *high),
        room_f=None if high is None else _room(estimate, part, *high),
    )


def restoring_resistor(estimate: ElementEstimate) -> RestoringResistor:
    """Find the resistor that restores the designed zero, from the part's own Cc, gm2 and Cgd.

    τz = Cc·(Rz − 1/gm2) − Cgd/gm2 = designed τz, solved for Rz. The simple advice of a comparison changes Rz by the
    missing zero time over the designed Cc; here Cc is the part's.
    """
    circuit = estimate.circuit
    wanted_s = estimate.design.zero_time_s

    def resistors(values: FloatArray) -> tuple[float, float]:
        found = circuit.physical(values)
        needed = (wanted_s + found["Cgd"] / found["gm2"]) / found["Cc"] + 1 / found["gm2"]
        return needed, needed - found["Rz"]

    slopes = gradient(resistors, estimate.vector)
    stderrs = np.sqrt(np.einsum("ki,ij,kj->k", slopes, estimate.covariance, slopes))
    needed, change = (
        Estimate.gaussian(value, float(stderr), quantile=estimate.quantile)
        for value, stderr in zip(resistors(estimate.vector), stderrs, strict=True)
    )
    return RestoringResistor(zero_time_s=wanted_s, rz_ohm=needed, change_ohm=change)


def _excess(part: Elements, ln_load: float, wanted_deg: float) -> float:
    """Phase margin beyond the wanted one; a loop gain that never reaches 1 has any."""
    found = margins(replace(part, CL=math.exp(ln_load)).transfer()).phase_margin_deg
    return 180.0 - wanted_deg if found is None else found - wanted_deg


def _end(
    estimate: ElementEstimate, part: Elements, between: FloatArray, wanted_deg: float
) -> tuple[float, FloatArray] | None:
    """Load in F at which the margin is met, and the derivatives of its logarithm by the vector."""
    from scipy.optimize import brentq

    ln_load = float(brentq(lambda x: _excess(part, x, wanted_deg), float(between[0]), float(between[1]), xtol=1e-13))
    there = replace(part, CL=math.exp(ln_load))
    value, slopes = quantities_and_slopes(there)[Quantity.PHASE_MARGIN]
    if value is None:
        return None
    others = by_vector(estimate.circuit, estimate.vector, slopes, without=("CL", BENCH_LOAD))
    return there.CL, -others / (slopes["CL"] * there.CL)


def _lognormal(estimate: ElementEstimate, load_f: float, by_values: FloatArray) -> Estimate:
    sd = math.sqrt(max(float(by_values @ estimate.covariance @ by_values), 0.0))
    return Estimate.lognormal(load_f, sd, quantile=estimate.quantile) if math.isfinite(sd) else NOT_KNOWN


def _room(estimate: ElementEstimate, part: Elements, load_f: float, by_values: FloatArray) -> Estimate:
    slopes = load_f * by_values - _slopes_of_load(estimate.circuit, estimate.vector)
    sd_f = math.sqrt(max(float(slopes @ estimate.covariance @ slopes), 0.0))
    return Estimate.gaussian(load_f - part.CL, sd_f, quantile=estimate.quantile)


def _slopes_of_load(circuit: Circuit, values: FloatArray) -> FloatArray:
    """Derivatives of the part's own load on the bench by the vector."""
    return by_vector(circuit, values, {"CL": 1.0})
