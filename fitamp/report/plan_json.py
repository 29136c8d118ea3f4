"""A plan as a plain dictionary for JSON (schema fitamp/plan/1): fixed keys, null for what is not known."""

from __future__ import annotations

import math
from typing import Any

from fitamp.planning import Expected, Outlook, Plan, PlannedSweep, Stage
from fitamp.report.plan_words import adding_sentences, limit_sentences, notes, summary, verdict_sentence

__all__ = ["plan_as_dict"]


def plan_as_dict(plan: Plan) -> dict[str, Any]:
    """A plan (schema fitamp/plan/1); all numbers in SI units."""
    design, noise = plan.design, plan.noise
    return {
        "schema": "fitamp/plan/1",
        "design": {
            "file": design.file,
            "name": design.name,
            "assumed_spreads": list(design.assumed_spreads),
            "sha256": design.sha256,
        },
        "sweeps_taken": plan.taken,
        "part": "as the sweeps taken show it" if plan.taken else "at the design's centre",
        "noise": {
            "error_channel": noise.error_channel,
            "return_channel": noise.return_channel,
            "relative": noise.relative,
            "ratio": noise.ratio,
            "source": noise.source,
        },
        "choice": {
            "criterion": plan.criterion.value,
            "every_set_looked_at": plan.is_exhaustive,
            "candidates": [_sweep(sweep) for sweep in plan.candidates],
        },
        "summary": summary(plan),
        "sentences": [*adding_sentences(plan), verdict_sentence(plan), *limit_sentences(plan)],
        "notes": list(notes(plan)),
        "sweeps": [_sweep(sweep) for sweep in plan.sweeps],
        "stages": [_stage(stage) for stage in plan.stages],
        "further": None if plan.further is None else _stage(plan.further),
        "wanted": [
            {
                "name": name,
                "sd": sd,
                "expected_sd": plan.last.of(name).sd,
                "met": name not in plan.missed,
                "within_reach": name not in plan.out_of_reach,
            }
            for name, sd in plan.wanted
        ],
        "parts_drawn": plan.parts_drawn,
    }


def _sweep(sweep: PlannedSweep) -> dict[str, Any]:
    return {
        "load_added_f": sweep.condition.load_added_f,
        "rz_added_ohm": sweep.condition.rz_added_ohm,
        "f_min_hz": sweep.f_min_hz,
        "f_max_hz": sweep.f_max_hz,
        "points": sweep.points,
        "averages": sweep.averages,
    }


def _stage(stage: Stage) -> dict[str, Any]:
    return {
        "sweeps": len(stage.sweeps),
        "added": _sweep(stage.sweeps[-1]) if stage.sweeps else None,
        "elements": {one.name: _expected(one) for one in stage.elements},
        "bench": {one.name: _expected(one) for one in stage.bench},
        "quantities": {one.name: _expected(one) for one in stage.quantities},
        "verdict": _outlook(stage.outlook),
    }


def _expected(one: Expected) -> dict[str, Any]:
    return {
        "unit": one.unit,
        "value": one.value,
        "sd": one.sd,
        "relative_sd": one.relative,
        "before_sd": one.before,
        "informed": one.informed,
        "over_parts_sd": one.over_parts,
        "worst_sd": one.worst,
        "by_loads": one.by_loads,
        "by_resistances": one.by_resistances,
    }


def _outlook(outlook: Outlook) -> dict[str, Any]:
    return {
        "region": outlook.region,
        "decidable": outlook.is_decidable,
        "edge_sigma": _finite(outlook.edge_sigma),
        "half_plane_sigma": _finite(outlook.half_plane_sigma),
        "undecided_share": outlook.undecided_share,
        "limits": [
            {
                "quantity": limit.quantity,
                "low": limit.low,
                "high": limit.high,
                "sigma": _finite(limit.sigma),
                "decidable": limit.is_decidable,
            }
            for limit in outlook.limits
        ],
    }


def _finite(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else value
