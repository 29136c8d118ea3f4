"""Sweeps that leave much undetermined, compared. Shared by the report's tests; everything is invented."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cache

import numpy as np

from fitamp.amplifier import Elements
from fitamp.arrays import FloatArray
from fitamp.comparison import Comparison, compare
from fitamp.design import Bench, Design, HalfPlane, Limit, Roots
from fitamp.noise import simulate_bench
from fitamp.sweep import LeftOut, NoiseLevels, Origin, Sweep

__all__ = ["AWKWARD", "HOSTILE_NAME", "awkward"]

NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
ELEMENTS = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
# Markup of a terminal library, an escape sequence, a line end, a bell, a right-to-left override, an undecodable byte.
HOSTILE_NAME = "[red]x[/red]\x1b[31m\n\x07\u202e\udcff:smile:.csv"


def _swept(elements: Elements, freq_hz: FloatArray, file: str = "part.csv") -> Sweep:
    gain = simulate_bench(elements.transfer().evaluate(freq_hz), NOISE, np.random.default_rng(61))
    return Sweep(freq_hz=freq_hz, gain=gain, origin=Origin(file=file, form="computed"))


def _whole_band() -> FloatArray:
    return np.geomspace(10, 200e6, 101)


def _pole1_below_band() -> Comparison:
    return compare(_swept(ELEMENTS, np.geomspace(3e6, 200e6, 81)), Design.from_elements(ELEMENTS))


def _pole2_above_band() -> Comparison:
    return compare(_swept(ELEMENTS, np.geomspace(10, 2e6, 81)), Design.from_elements(ELEMENTS))


def _no_crossover() -> Comparison:
    weak = ELEMENTS.with_changes(beta=5e-5)
    return compare(_swept(weak, _whole_band()), Design.from_elements(weak))


def _no_resistor() -> Comparison:
    return compare(_swept(ELEMENTS.with_changes(Rz=0), _whole_band()), Design.from_elements(ELEMENTS))


def _huge_numbers() -> Comparison:
    # Every capacitance a millionfold, every resistance a hundredfold: poles in microhertz and gains of 1e8.
    slow = ELEMENTS.with_changes(R1=1e8, R2=5e6, C1=200e-9, CL=4e-6, Cc=1.8e-6)
    wide = {"gain_bandwidth_hz": Limit(low=1.234567e-9, high=9.87654e12), "dc_gain": Limit(low=1e-3)}
    design = Design.from_elements(slow, limits=wide, bench=Bench(delay_s=1e-12))
    return compare(_swept(slow, np.geomspace(1e-5, 200, 101)), design)


def _inadequate() -> Comparison:
    # A mirror pole in the band that the design knows nothing of.
    part = ELEMENTS.with_changes(mirror_pole_hz=20e6)
    return compare(_swept(part, _whole_band()), Design.from_elements(ELEMENTS))


def _by_roots() -> Comparison:
    roots = Roots(
        dc_gain=12e3, pole1_hz=1.09e3, pole2_hz=40e6, pole3_hz=600e6, zero_hz=None, half_plane=HalfPlane.INFINITY
    )
    return compare(_swept(ELEMENTS, _whole_band()), Design.from_roots(roots, file=HOSTILE_NAME))


def _hostile_name() -> Comparison:
    sweep = _swept(ELEMENTS, _whole_band(), file=HOSTILE_NAME)
    left_out = (LeftOut(f_hz=50.0, gain=1 + 1j, reason=HOSTILE_NAME),)
    sweep = replace(sweep, left_out=left_out).with_decision(HOSTILE_NAME, HOSTILE_NAME, HOSTILE_NAME * 8)
    return compare(sweep, Design.from_elements(ELEMENTS, file=HOSTILE_NAME, name=HOSTILE_NAME))


_MAKERS: dict[str, Callable[[], Comparison]] = {
    "pole 1 below band": _pole1_below_band,
    "pole 2 above band": _pole2_above_band,
    "no crossover": _no_crossover,
    "no resistor": _no_resistor,
    "huge numbers": _huge_numbers,
    "model inadequate": _inadequate,
    "by roots": _by_roots,
    "hostile name": _hostile_name,
}
AWKWARD = tuple(_MAKERS)


@cache
def awkward(name: str) -> Comparison:
    """The comparison called `name`, made once."""
    return _MAKERS[name]()
