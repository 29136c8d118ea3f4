"""Invented designs to plan for."""

from __future__ import annotations

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design import Bench, Design, Limit
from fitamp.elements import Condition
from fitamp.planning import PlannedSweep

__all__ = ["DESIGN", "NOMINAL", "OWN_SPREADS", "added"]

NOMINAL = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
# Every element known to 20 % beforehand, on a bench that adds nothing.
DESIGN = Design.from_elements(
    NOMINAL, spreads=dict.fromkeys(ELEMENT_NAMES, 0.2), under_test=(), bench=Bench(delay_s=0.0)
)
# Rz under test, a probe's load, a delay that is not stated, limits.
OWN_SPREADS = Design.from_elements(
    NOMINAL,
    spreads={"gm1": 0.08, "R1": 0.15, "C1": 0.1, "gm2": 0.08, "R2": 0.15, "CL": 0.05, "Cc": 0.06, "Rz": 0.12},
    limits={"zero_hz": Limit(low=90e6, high=200e6), "phase_margin_deg": Limit(low=65.0, high=95.0)},
    bench=Bench(load_f=2e-12, load_spread=0.05),
)


def added(load_pf: float = 0.0, rz_ohm: float = 0.0, *, top_hz: float = 100e6, averages: int = 1) -> PlannedSweep:
    """A sweep from 10 Hz with this added."""
    condition = Condition(load_added_f=load_pf * 1e-12, rz_added_ohm=rz_ohm)
    return PlannedSweep(condition=condition, f_min_hz=10.0, f_max_hz=top_hz, averages=averages)
