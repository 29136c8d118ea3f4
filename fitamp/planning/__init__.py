"""Which sweeps to take, before they are taken: expected precision by the information matrix. One door: `plan`."""

from fitamp.planning.planner import expected_precision, plan
from fitamp.planning.result import Criterion, Expected, LimitOutlook, Outlook, Plan, Stage, Wanted
from fitamp.planning.sweeps import DEFAULT_NOISE, PlannedSweep, affordable_sweeps, usual_band_hz, usual_loads_f

__all__ = [
    "DEFAULT_NOISE",
    "Criterion",
    "Expected",
    "LimitOutlook",
    "Outlook",
    "Plan",
    "PlannedSweep",
    "Stage",
    "Wanted",
    "affordable_sweeps",
    "expected_precision",
    "plan",
    "usual_band_hz",
    "usual_loads_f",
]
