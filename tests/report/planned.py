"""Plans to write about. All values are invented."""

from __future__ import annotations

from functools import lru_cache

from fitamp.amplifier import Elements
from fitamp.design import Bench, Design, Limit
from fitamp.planning import Plan, Wanted, affordable_sweeps, plan

__all__ = ["DESIGN", "all_plans", "plan_of", "plan_with_everything", "plan_with_wishes"]

ELEMENTS = Elements(gm1=150e-6, R1=1e6, C1=200e-15, gm2=1.6e-3, R2=50e3, CL=4e-12, Cc=1.8e-12, Rz=1300.0)
SPREADS = {"gm1": 0.08, "R1": 0.15, "C1": 0.1, "gm2": 0.08, "R2": 0.15, "CL": 0.05, "Cc": 0.06}
DESIGN = Design.from_elements(
    ELEMENTS,
    spreads=SPREADS,
    limits={"zero_hz": Limit(low=90e6, high=200e6), "phase_margin_deg": Limit(low=65.0, high=95.0)},
    bench=Bench(load_f=2e-12, load_spread=0.05),
    file="mychip.toml",
)
LOADS_F, RESISTANCES_OHM = (0.0, 5e-12, 20e-12), (0.0, -400.0, 500.0)


@lru_cache
def plan_of(count: int = 3, *, with_resistances: bool = True, parts_drawn: int = 4) -> Plan:
    """The best of loads and resistances."""
    listed = affordable_sweeps(
        DESIGN, loads_f=LOADS_F, resistances_ohm=RESISTANCES_OHM if with_resistances else (0.0,), bands_hz=[(1e3, 2e8)]
    )
    return plan(DESIGN, listed, count=count, parts_drawn=parts_drawn)


@lru_cache
def plan_with_wishes() -> Plan:
    """One wish that is met, one that is not with these sweeps, one that no sweep meets."""
    wanted = [
        Wanted(name="gm2", relative=0.01),
        Wanted(name="Cc", relative=1e-4),
        Wanted(name="load_parasitic_f", absolute=1e-15),
    ]
    listed = affordable_sweeps(DESIGN, loads_f=LOADS_F, resistances_ohm=RESISTANCES_OHM, averages=16)
    return plan(DESIGN, listed, count=2, wanted=wanted, parts_drawn=0)


@lru_cache
def plan_with_everything() -> Plan:
    """Every element that there can be, two bands, a file name that would steer a terminal."""
    elements = ELEMENTS.with_changes(Cgd=20e-15, mirror_pole_hz=400e6)
    design = Design.from_elements(elements, spreads=SPREADS, file="chip\x1b[2J[bold]$x$ " + "long " * 20 + ".toml")
    listed = affordable_sweeps(
        design, loads_f=LOADS_F, resistances_ohm=RESISTANCES_OHM, bands_hz=[(1e3, 2e8), (10.0, 1e9)]
    )
    return plan(design, listed, count=4, parts_drawn=2)


def all_plans() -> tuple[Plan, ...]:
    """Plans of every kind."""
    return (
        plan_of(),
        plan_of(1),
        plan_of(9),
        plan_of(2, with_resistances=False, parts_drawn=0),
        plan_with_wishes(),
        plan_with_everything(),
    )
