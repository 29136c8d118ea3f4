"""Invented parts whose elements were estimated, of the kinds that strain a picture or a table. Made once each."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cache

import numpy as np

from fitamp.amplifier import Elements
from fitamp.design import Bench, Design, Limit
from fitamp.elements import Condition, ElementEstimate, estimate_elements
from fitamp.findings import ElementFindings, findings_of
from fitamp.noise import simulate_bench
from fitamp.sweep import NoiseLevels, Origin, Sweep

__all__ = ["AWKWARD_PARTS", "HOSTILE_NAME", "awkward_findings"]

NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
ELEMENTS = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
FREQ_HZ = np.geomspace(10.0, 200e6, 81)
# Markup of a terminal library and of mathematics, an escape sequence, a line end, a right-to-left override.
HOSTILE_NAME = "[red]$x_1$[/red]\x1b[31m\n\u202e:smile:.csv"
LIMITS = {"phase_margin_deg": Limit(low=60, high=85), "pole2_hz": Limit(low=60e6), "gain_margin_db": Limit(low=10)}
STEPS = (Condition(), Condition(load_added_f=10e-12), Condition(rz_added_ohm=500.0))


def _swept(file: str, part: Elements, condition: Condition = STEPS[0]) -> Sweep:
    """A sweep of a part with something added; the noise is always the same."""
    seen = part.with_changes(CL=part.CL + condition.load_added_f, Rz=part.Rz + condition.rz_added_ohm)
    gain = simulate_bench(seen.transfer().evaluate(FREQ_HZ), NOISE, np.random.default_rng(5))
    return Sweep(freq_hz=FREQ_HZ, gain=gain, origin=Origin(file=file, form="computed"))


def _estimated(
    part: Elements, design: Design, conditions: Sequence[Condition] = STEPS[:1], *, files: str = "step{}.csv"
) -> ElementEstimate:
    sweeps = [_swept(files.format(number), part, condition) for number, condition in enumerate(conditions)]
    return estimate_elements(sweeps, design, conditions=list(conditions))


def _single() -> ElementEstimate:
    return _estimated(ELEMENTS.with_changes(gm2=1.45e-3), Design.from_elements(ELEMENTS, limits=LIMITS))


def _shorted() -> ElementEstimate:
    # No resistor on silicon, a bridge that feeds through, a mirror, and a delay of which nothing is known.
    designed = ELEMENTS.with_changes(Cgd=5e-15, mirror_pole_hz=900e6)
    return _estimated(designed.with_changes(Rz=0.0), Design.from_elements(designed, bench=Bench(load_f=0.5e-12)))


def _far_off() -> ElementEstimate:
    part = ELEMENTS.with_changes(CL=40e-12, Rz=5000.0, gm2=0.5e-3)
    return _estimated(part, Design.from_elements(ELEMENTS, limits=LIMITS, bench=Bench(delay_s=0.0)), STEPS)


def _another_part() -> ElementEstimate:
    design = Design.from_elements(ELEMENTS, bench=Bench(delay_s=0.0))
    conditions = (*STEPS, Condition(load_added_f=5e-12))
    sweeps = [_swept(f"step{number}.csv", ELEMENTS, condition) for number, condition in enumerate(conditions)]
    sweeps[3] = _swept("step3.csv", ELEMENTS.with_changes(gm2=1.1e-3, Cc=2.1e-12), conditions[3])
    return estimate_elements(sweeps, design, conditions=conditions)


def _no_crossover() -> ElementEstimate:
    weak = ELEMENTS.with_changes(beta=5e-5)
    return _estimated(weak, Design.from_elements(weak, bench=Bench(delay_s=0.0)))


def _no_resistor_designed() -> ElementEstimate:
    without = ELEMENTS.with_changes(Rz=0.0)
    return _estimated(ELEMENTS.with_changes(Rz=60.0), Design.from_elements(without, bench=Bench(delay_s=0.0)))


def _inadequate() -> ElementEstimate:
    # A mirror pole inside the band that the design knows nothing of.
    return _estimated(
        ELEMENTS.with_changes(mirror_pole_hz=15e6), Design.from_elements(ELEMENTS, bench=Bench(delay_s=0.0)), STEPS[:2]
    )


def _hostile_name() -> ElementEstimate:
    design = Design.from_elements(ELEMENTS, file=HOSTILE_NAME, name=HOSTILE_NAME, bench=Bench(delay_s=0.0))
    return _estimated(ELEMENTS, design, STEPS[:2], files=f"{{}}{HOSTILE_NAME}")


_MAKERS: dict[str, Callable[[], ElementEstimate]] = {
    "single": _single,
    "shorted": _shorted,
    "far off": _far_off,
    "another part": _another_part,
    "no crossover": _no_crossover,
    "no resistor designed": _no_resistor_designed,
    "inadequate": _inadequate,
    "hostile name": _hostile_name,
}
AWKWARD_PARTS = tuple(_MAKERS)


@cache
def awkward_findings(name: str) -> ElementFindings:
    """The findings called `name`, made once."""
    return findings_of(_MAKERS[name](), wanted_deg=60.0 if name != "single" else None, samples=8)
