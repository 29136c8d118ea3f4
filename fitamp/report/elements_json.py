"""Element estimates as a plain dictionary for JSON (fitamp/elements/1): fixed keys, null for what is not known."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Any

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.arrays import FloatArray
from fitamp.comparison.result import Row
from fitamp.elements import Band, ElementEstimate, EstimatedElement, LineFit, Prediction, QuantityBlame, SweepCheck
from fitamp.estimate import NOT_KNOWN, Estimate
from fitamp.findings import ElementFindings
from fitamp.fitting import LoopFit
from fitamp.report.as_json import estimate_record, finite, sweep_record
from fitamp.report.conditions import caution_records
from fitamp.sweep import Sweep

__all__ = ["elements_as_dict"]


def elements_as_dict(findings: ElementFindings) -> dict[str, Any]:
    """Elements, what follows from them, and how far to trust them; all with the bench's load, without its delay."""
    estimate, design = findings.estimate, findings.design
    verdict, found = findings.verdict, estimate.parasitics
    return {
        "schema": "fitamp/elements/1",
        "design": {
            "file": design.file,
            "name": design.name,
            "half_plane": design.half_plane.value,
            "under_test": [p.name for p in estimate.circuit.parameters if p.prior_sd is None],
            "assumed_spreads": list(design.assumed_spreads),
            "sha256": design.sha256,
        },
        "trustworthy": estimate.is_trustworthy,
        "consistent": estimate.is_consistent,
        "elements": {one.name: _element(one) for one in estimate.elements},
        "bench": {one.name: _element(one) for one in estimate.bench},
        "parasitic": {
            "load_total_f": estimate_record(found.load_total_f),
            "load_f": estimate_record(found.load_f),
            "first_stage_f": estimate_record(found.first_stage_f),
        },
        "poles": _poles(estimate),
        "zeros": _zeros(estimate),
        "zero_time_s": estimate_record(estimate.derived.zero_time_s),
        "gm2_rz": estimate_record(estimate.derived.gm2_rz),
        "derived": {name: estimate_record(one) for name, one in estimate.derived.items()},
        "comparison": [_row(row) for row in findings.rows],
        "verdict": {
            "nulling": verdict.nulling.value,
            "reason": verdict.reason,
            "zero_time_s": estimate_record(verdict.zero_time_s),
            "gm2_rz": estimate_record(verdict.gm2_rz),
            "window_s": [finite(verdict.window.low_s), finite(verdict.window.high_s)],
        },
        "advice": {
            "rz_change_ohm": estimate_record(findings.advice.rz_change_ohm),
            "sentence": findings.advice.sentence,
        },
        "broken_limits": list(findings.broken_limits),
        "sweeps": [
            _sweep(sweep, check, fit)
            for sweep, check, fit in zip(estimate.sweeps, estimate.checks, estimate.fits, strict=True)
        ],
        "other_valley": _other(estimate.other_valley),
        "blame": {one.quantity.value: _blame(one) for one in findings.blame.quantities},
        "lines": [_line(line) for line in findings.lines],
        "restoring": {
            "zero_time_s": findings.restoring.zero_time_s,
            "rz_ohm": estimate_record(findings.restoring.rz_ohm),
            "change_ohm": estimate_record(findings.restoring.change_ohm),
            "phase_margin_deg": estimate_record(findings.restored_margin_deg),
        },
        "wanted": _wanted(findings),
        "predictions": {
            "load": None if findings.over_load is None else _prediction(findings.over_load, "load_f"),
            "resistor": None if findings.over_resistor is None else _prediction(findings.over_resistor, "rz_ohm"),
        },
        "warnings": _warnings(estimate),
    }


def _element(one: EstimatedElement) -> dict[str, Any]:
    return {
        "unit": one.unit,
        "designed": finite(one.designed),
        **estimate_record(one.estimate),
        "informed": one.informed,
        "deviation": finite(one.deviation),
        "spread": finite(one.spread),
        "held": one.held,
    }


def _poles(estimate: ElementEstimate) -> list[dict[str, Any]]:
    """The poles of the exact circuit; a real one has a standard error, of a pair the distance has."""
    derived = estimate.derived
    distances = (derived.pole1_hz, derived.pole2_hz, derived.pole3_hz)
    elements = estimate.circuit.loaded(estimate.vector)
    mirror_hz = elements.mirror_pole_hz
    core = [pole for pole in elements.transfer().poles_hz if mirror_hz is None or pole != -mirror_hz]
    records = [
        _root(f"pole {number}", pole, distance)
        for number, (pole, distance) in enumerate(zip(sorted(core, key=abs), distances, strict=False), start=1)
    ]
    if mirror_hz is not None:
        records.append(_root("mirror pole", complex(-mirror_hz), estimate.element("mirror_pole_hz").estimate))
    return records


def _zeros(estimate: ElementEstimate) -> list[dict[str, Any]]:
    """The zero of the compensation first; none where it is at infinity."""
    elements = estimate.circuit.loaded(estimate.vector)
    mirror_hz = elements.mirror_pole_hz
    roots = [zero for zero in elements.transfer().zeros_hz if mirror_hz is None or zero != -2 * mirror_hz]
    zero_time = estimate.derived.zero_time_s
    distance = NOT_KNOWN
    if zero_time.value and zero_time.stderr is not None:
        # A frequency near infinity has no error worth the name: its zero time has.
        at_hz = 1 / (2 * math.pi * abs(zero_time.value))
        distance = Estimate(value=at_hz, stderr=at_hz * zero_time.stderr / abs(zero_time.value), ci95=(None, None))
    names = ["zero", *(f"zero {number}" for number in range(2, len(roots) + 1))]
    records = [
        _root(name, zero, distance if name == "zero" else NOT_KNOWN)
        for name, zero in zip(names, sorted(roots, key=abs), strict=False)
    ]
    if mirror_hz is not None:
        records.append(_root("mirror zero", complex(-2 * mirror_hz), NOT_KNOWN))
    return records


def _root(name: str, root: complex, distance: Estimate) -> dict[str, Any]:
    is_real = root.imag == 0
    return {
        "name": name,
        "re_hz": float(root.real),
        "im_hz": float(root.imag),
        "re_stderr_hz": finite(distance.stderr) if is_real else None,
        "im_stderr_hz": 0.0 if is_real and distance.stderr is not None else None,
        "distance_stderr_hz": finite(distance.stderr),
    }


def _row(row: Row) -> dict[str, Any]:
    return {
        "quantity": row.quantity,
        "designed": finite(row.designed),
        "estimated": finite(row.measured.value),
        "stderr": finite(row.measured.stderr),
        "ci95": [finite(end) for end in row.measured.ci95],
        "deviation": finite(row.deviation),
        "sigma": finite(row.sigma),
        "low": finite(row.low),
        "high": finite(row.high),
        "inside": row.inside,
    }


def _sweep(sweep: Sweep, check: SweepCheck, fit: LoopFit) -> dict[str, Any]:
    condition = check.condition
    return sweep_record(sweep) | {
        "condition": {
            "load_added_f": condition.load_added_f,
            "rz_added_ohm": condition.rz_added_ohm,
            "temp_c": condition.temp_c,
            "note": condition.note,
        },
        "adequate": check.adequacy.adequate,
        "reduced_chi_square": finite(check.adequacy.reduced_chi_square),
        "residuals": check.adequacy.sentence,
        "misfit_hz": [list(stretch) for stretch in check.adequacy.where_hz or ()],
        "change_chance": finite(check.change_chance),
        "changed": check.changed,
        "left_out_of_estimate": check.left_out,
        "suspect": check.suspect,
        "suspect_change": None if check.suspect_change is None else estimate_record(check.suspect_change),
        "alone": {name: estimate_record(one) for name, one in fit.parameters.items()},
    }


def _other(elements: Elements | None) -> dict[str, float] | None:
    return None if elements is None else {name: float(getattr(elements, name)) for name in ELEMENT_NAMES}


def _blame(one: QuantityBlame) -> dict[str, Any]:
    return {
        "designed": one.designed,
        "estimated": one.estimated,
        "change": estimate_record(one.change),
        "contributions": [
            {
                "name": part.name,
                "designed": part.designed,
                "estimated": part.estimated,
                "share": estimate_record(part.share),
                "informed": part.informed,
            }
            for part in one.contributions
        ],
        "covariance": one.covariance.tolist(),
    }


def _line(line: LineFit) -> dict[str, Any]:
    return {
        "kind": line.kind.value,
        "files": list(line.files),
        "x": line.x.tolist(),
        "y": line.y.tolist(),
        "y_stderr": line.y_stderr.tolist(),
        "slope": estimate_record(line.slope),
        "intercept": estimate_record(line.intercept),
        "chi_square": finite(line.chi_square),
        "freedom": line.freedom,
        "joint": {"slope": finite(line.joint.slope), "intercept": finite(line.joint.intercept)},
        "meaning_f": estimate_record(line.meaning),
    }


def _wanted(findings: ElementFindings) -> dict[str, Any] | None:
    loads, resistors = findings.loads, findings.resistors
    if loads is None:
        return None
    return {
        "phase_margin_deg": loads.phase_margin_deg,
        "load_f": loads.load_f,
        "keeps": loads.keeps,
        "load_low_f": None if loads.low_f is None else estimate_record(loads.low_f),
        "load_high_f": None if loads.high_f is None else estimate_record(loads.high_f),
        "room_f": None if loads.room_f is None else estimate_record(loads.room_f),
        "rz_low_ohm": None if resistors is None else finite(resistors.low_ohm),
        "rz_high_ohm": None if resistors is None else finite(resistors.high_ohm),
    }


def _prediction(prediction: Prediction, at_name: str) -> dict[str, Any]:
    return {
        at_name: prediction.at.tolist(),
        "estimated_at": prediction.estimated_at,
        "designed_at": prediction.designed_at,
        **{name: _band(band) for name, band in prediction.items()},
    }


def _band(band: Band) -> dict[str, list[float | None]]:
    curves: Iterable[tuple[str, FloatArray]] = (
        ("value", band.value),
        ("low", band.low),
        ("high", band.high),
        ("designed", band.designed),
    )
    return {name: [finite(number) for number in curve.tolist()] for name, curve in curves}


def _warnings(estimate: ElementEstimate) -> list[dict[str, Any]]:
    notes = [{"code": note.code.value, "message": note.message, "files": list(note.files)} for note in estimate.notes]
    cautions = [
        record | {"files": [sweep.origin.file]} for sweep in estimate.sweeps for record in caution_records(sweep)
    ]
    return [*notes, *cautions]
