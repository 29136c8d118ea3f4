"""Results as plain dictionaries for JSON: fixed keys, null for what is not known, never NaN."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import Any

from fitamp.comparison import Comparison
from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit, Root
from fitamp.report.conditions import caution_records, repeat_records
from fitamp.sweep import NoiseLevels, Sweep

__all__ = [
    "comparison_as_dict",
    "dumps",
    "estimate_record",
    "finite",
    "fit_as_dict",
    "sweep_as_dict",
    "sweep_record",
]


def dumps(record: Mapping[str, Any]) -> str:
    """One JSON object as ASCII text; ValueError for a NaN or infinity that slipped in."""
    # Escaped, a µ survives every code page, and no file name can steer a terminal or fail to be encoded.
    return json.dumps(record, indent=2, ensure_ascii=True, allow_nan=False)


def sweep_as_dict(sweep: Sweep) -> dict[str, Any]:
    """What was read (schema fitamp/read/1)."""
    return {"schema": "fitamp/read/1", "sweep": sweep_record(sweep)}


def fit_as_dict(fit: LoopFit) -> dict[str, Any]:
    """A fit (schema fitamp/fit/1)."""
    return {
        "schema": "fitamp/fit/1",
        "sweep": sweep_record(fit.sweep),
        "model": {
            "name": fit.model_name,
            "poles": len(fit.named_poles),
            "zeros": len(fit.named_zeros),
            "resonances": len(fit.resonant_poles) // 2,
            "doublets": len(fit.doublet_poles),
            "adequate": fit.adequacy.adequate,
            "reduced_chi_square": finite(fit.adequacy.reduced_chi_square),
            "residuals": fit.adequacy.sentence,
            "misfit_hz": [list(stretch) for stretch in fit.adequacy.where_hz or ()],
        },
        "noise": noise_record(fit.noise),
        "parameters": {name: estimate_record(estimate) for name, estimate in fit.parameters.items()},
        "zero": {
            "half_plane": fit.zero.half_plane.value,
            "frequency_hz": finite(fit.zero.frequency_hz),
            "ci95_hz": [finite(end) for end in fit.zero.ci95_hz],
        },
        "poles": [_root(name, root) for name, root in fit.named_poles],
        "zeros": [_root(name, root) for name, root in fit.named_zeros],
        "range_steps": [
            {"f_hz": step.f_hz, "size_db": estimate_record(step.size_db), "turn_deg": estimate_record(step.turn_deg)}
            for step in fit.range_steps
        ],
        "margins": {name: estimate_record(estimate) for name, estimate in fit.margins.items()},
        "warnings": [
            *caution_records(fit.sweep),
            *({"code": warning.code.value, "message": warning.message} for warning in fit.warnings),
        ],
    }


def comparison_as_dict(comparison: Comparison) -> dict[str, Any]:
    """A comparison (schema fitamp/compare/1): all of the fit, and more."""
    record = fit_as_dict(comparison.fit)
    record["schema"] = "fitamp/compare/1"
    verdict, parasitic, design = comparison.verdict, comparison.parasitic, comparison.design
    record["design"] = {
        "file": design.file,
        "name": design.name,
        "half_plane": design.half_plane.value,
        "assumed_spreads": list(design.assumed_spreads),
        "sha256": design.sha256,
    }
    record["comparison"] = [
        {
            "quantity": row.quantity,
            "designed": finite(row.designed),
            "designed_as_measured": finite(row.designed_as_measured),
            "measured": finite(row.measured.value),
            "stderr": finite(row.measured.stderr),
            "ci95": [finite(end) for end in row.measured.ci95],
            "deviation": finite(row.deviation),
            "sigma": finite(row.sigma),
            "low": finite(row.low),
            "high": finite(row.high),
            "inside": row.inside,
        }
        for row in comparison.rows
    ]
    record["verdict"] = {
        "nulling": verdict.nulling.value,
        "reason": verdict.reason,
        "route": verdict.route.value,
        "zero_time_s": estimate_record(verdict.zero_time_s),
        "gm2_rz": estimate_record(verdict.gm2_rz),
        "window_s": [finite(verdict.window.low_s), finite(verdict.window.high_s)],
    }
    record["advice"] = {
        "rz_change_ohm": estimate_record(comparison.advice.rz_change_ohm),
        "sentence": comparison.advice.sentence,
    }
    notes = [{"code": note.code.value, "message": note.message} for note in comparison.notes]
    record["warnings"] = notes + record["warnings"]
    record["broken_limits"] = list(comparison.broken_limits)
    record["parasitic"] = None
    if parasitic is not None:
        record["parasitic"] = {
            "load_total_f": estimate_record(parasitic.load_total_f),
            "load_f": estimate_record(parasitic.load_f),
            "first_stage_f": estimate_record(parasitic.first_stage_f),
            "sentence": parasitic.sentence,
        }
    return record


def sweep_record(sweep: Sweep) -> dict[str, Any]:
    """A sweep: where it comes from, and what was decided of it."""
    return {
        "file": sweep.origin.file,
        "sha256": sweep.origin.sha256,
        "form": sweep.origin.form,
        "trace": sweep.origin.trace,
        "notes": list(sweep.origin.notes),
        "repeats": repeat_records(sweep),
        "points": len(sweep) + len(sweep.left_out),
        "points_used": len(sweep),
        "f_min_hz": sweep.f_min_hz,
        "f_max_hz": sweep.f_max_hz,
        "sign": sweep.sign.value,
        "noise": None if sweep.noise is None else noise_record(sweep.noise),
        "left_out": [{"f_hz": point.f_hz, "reason": point.reason} for point in sweep.left_out],
        "decisions": [
            {"topic": decision.topic, "choice": decision.choice, "reason": decision.reason}
            for decision in sweep.decisions
        ],
    }


def noise_record(noise: NoiseLevels) -> dict[str, Any]:
    return {
        "error_channel": noise.error_channel,
        "return_channel": noise.return_channel,
        "relative": noise.relative,
        "ratio": noise.ratio,
        "source": noise.source,
    }


def estimate_record(estimate: Estimate) -> dict[str, Any]:
    """One estimated number."""
    return {
        "value": finite(estimate.value),
        "stderr": finite(estimate.stderr),
        "ci95": [finite(end) for end in estimate.ci95],
        "known": estimate.known.value,
    }


def _root(name: str, root: Root) -> dict[str, Any]:
    errors = (None, None) if root.covariance is None else [math.sqrt(float(root.covariance[i, i])) for i in range(2)]
    return {
        "name": name,
        "re_hz": root.value_hz.real,
        "im_hz": root.value_hz.imag,
        "re_stderr_hz": errors[0],
        "im_stderr_hz": errors[1],
    }


def finite(value: float | None) -> float | None:
    """The number, or None for one that is not finite, which JSON does not have."""
    return None if value is None or not math.isfinite(value) else float(value)
