"""Invented dies: elements off their design, and a resistor that puts the zero where it shall be."""

from __future__ import annotations

import math
from enum import StrEnum
from pathlib import Path

import numpy as np

import fitamp
from fitamp import Nulling
from fitamp.design import Bench, Limit
from fitamp.elements import Circuit, information

DESIGN_FILE = Path(__file__).resolve().parents[2] / "data_examples" / "line_buffer.toml"
FREQ_HZ = np.geomspace(10.0, 100e6, 281)
NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
SPREAD = 0.06
ELEMENTS = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
RESISTORS = (1.0, 0.0, 0.3, None, 2.2)  # times the die's Rz; None: 1/gm2
ZERO_LIMITS_HZ = (90e6, 200e6)
SMALL = 0.10  # of Cc/gm2 as designed: a zero time up to this counts as none
REACH = 6.0  # of standard errors from a limit, at most, where the zero shall lie near one


class Lot(StrEnum):
    """How the resistor of a die is chosen."""

    RESISTORS = "resistor intact, missing, 30 %, 1/gm2, 2.2 times, in turn"
    LIMITS = f"zero within {REACH:g} standard errors of a limit"


def nominal() -> fitamp.Elements:
    """The designed elements."""
    elements = fitamp.read_design(DESIGN_FILE).elements
    assert elements is not None
    return elements


NOMINAL = nominal()


def regions() -> dict[Nulling, tuple[float, float]]:
    """Ends of the regions of zero times in s, from the design's numbers alone and not by the package's own rules."""
    small_s = SMALL * NOMINAL.Cc / NOMINAL.gm2
    near_s, far_s = (1 / (2 * math.pi * limit_hz) for limit_hz in ZERO_LIMITS_HZ)
    return {
        Nulling.AS_DESIGNED: (far_s, near_s),
        Nulling.TOO_LITTLE: (small_s, far_s),
        Nulling.TOO_MUCH: (near_s, math.inf),
        Nulling.WRONG_SIDE: (-math.inf, -small_s),
        Nulling.AT_INFINITY: (-small_s, small_s),
    }


def edges_s() -> list[float]:
    """Zero times at which one region ends and the next begins, rising."""
    return sorted({edge for pair in regions().values() for edge in pair if math.isfinite(edge)})


def design(delay_s: float, delay_sd_s: float) -> fitamp.Design:
    """What the dies are held against: 6 % spreads, limits on the zero, and this delay of the bench."""
    return fitamp.Design.from_elements(
        NOMINAL,
        spreads=dict.fromkeys(ELEMENTS, SPREAD),
        limits={"zero_hz": Limit(low=ZERO_LIMITS_HZ[0], high=ZERO_LIMITS_HZ[1])},
        bench=Bench(delay_s=delay_s, delay_spread_s=delay_sd_s),
    )


def made(lot: Lot, index: int, rng: np.random.Generator, *, delay_s: float, delay_sd_s: float) -> fitamp.Elements:
    """Die number `index` of a lot, the bench's delay in it."""
    factors = 1 + SPREAD * rng.standard_normal(len(ELEMENTS))
    die = NOMINAL.with_changes(
        **{name: getattr(NOMINAL, name) * factor for name, factor in zip(ELEMENTS, factors, strict=True)}
    )
    die = die.with_changes(delay_s=max(delay_s + delay_sd_s * rng.standard_normal(), 0.0))
    if lot is Lot.RESISTORS:
        times = RESISTORS[index % len(RESISTORS)]
        return die.with_changes(Rz=1 / die.gm2 if times is None else times * die.Rz)
    # The limits in turn, and either side of each.
    edges = edges_s()
    edge_s, side = edges[index % len(edges)], 1 if index // len(edges) % 2 else -1
    distance = side * rng.uniform(0.0, REACH)
    at_limit = _with_zero(die, edge_s)
    return _with_zero(die, edge_s + distance * expected_stderr_s(at_limit, design(delay_s, delay_sd_s)))


def _with_zero(die: fitamp.Elements, zero_time_s: float) -> fitamp.Elements:
    return die.with_changes(Rz=zero_time_s / die.Cc + 1 / die.gm2)


def expected_stderr_s(die: fitamp.Elements, designed: fitamp.Design) -> float:
    """Standard error in s that sweep and design leave of a die's zero time, at the best, by their information."""
    circuit = Circuit.from_design(designed)
    known = {name: getattr(die, name) for name in ELEMENTS} | {"bench_delay_s": die.delay_s}
    values = circuit.vector(**known)
    covariance = np.linalg.inv(information(circuit, values, FREQ_HZ, NOISE) + circuit.prior_information())
    # Of Cc·(Rz − 1/gm2), by ln Cc, ln gm2 and Rz over its scale.
    slopes = np.zeros(len(values))
    slopes[circuit.names.index("Cc")] = die.zero_time_s
    slopes[circuit.names.index("gm2")] = die.Cc / die.gm2
    resistor = circuit.names.index("Rz")
    slopes[resistor] = die.Cc * circuit.parameters[resistor].scale
    return float(np.sqrt(slopes @ covariance @ slopes))
