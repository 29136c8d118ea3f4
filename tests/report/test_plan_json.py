"""Plans as JSON: keys are a promise."""

from __future__ import annotations

import json

import pytest
from planned import all_plans, plan_of, plan_with_wishes

from fitamp.planning import Plan
from fitamp.report.as_json import dumps
from fitamp.report.plan_json import plan_as_dict


def test_keys_are_a_promise() -> None:
    record = plan_as_dict(plan_of())
    assert record["schema"] == "fitamp/plan/1"
    assert set(record) == {
        "schema", "design", "sweeps_taken", "part", "noise", "choice", "summary", "sentences", "notes", "sweeps",
        "stages", "further", "wanted", "parts_drawn",
    }  # fmt: skip
    stage = record["stages"][-1]
    assert set(stage) == {"sweeps", "added", "elements", "bench", "quantities", "verdict"}
    assert list(stage["elements"]) == ["gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz"]
    assert list(stage["quantities"]) == [
        "zero_time_s", "gm2_rz", "pole2_hz", "gain_bandwidth_hz", "crossover_hz", "phase_margin_deg",
        "load_parasitic_f", "rz_change_ohm",
    ]  # fmt: skip
    assert set(stage["elements"]["gm2"]) == {
        "unit", "value", "sd", "relative_sd", "before_sd", "informed", "over_parts_sd", "worst_sd",
        "by_loads", "by_resistances",
    }  # fmt: skip
    assert set(stage["verdict"]) == {
        "region", "decidable", "edge_sigma", "half_plane_sigma", "undecided_share", "limits"
    }  # fmt: skip
    assert set(record["sweeps"][0]) == {
        "load_added_f", "rz_added_ohm", "f_min_hz", "f_max_hz", "points", "averages"
    }  # fmt: skip
    assert record["choice"]["criterion"] == "determinant"
    assert record["choice"]["every_set_looked_at"] is True
    assert len(record["choice"]["candidates"]) == 9


@pytest.mark.parametrize("plan", all_plans())
def test_every_plan_is_a_json_object(plan: Plan) -> None:
    record = json.loads(dumps(plan_as_dict(plan)))
    assert len(record["stages"]) == len(plan.sweeps) + 1
    assert record["stages"][0]["added"] is None
    assert (record["further"] is None) == (plan.further is None)


def test_numbers_are_those_of_the_plan_and_null_where_unknown() -> None:
    plan = plan_of()
    record = plan_as_dict(plan)
    assert record["stages"][0]["elements"]["Rz"]["sd"] is None
    assert record["stages"][-1]["elements"]["gm2"]["sd"] == plan.last.of("gm2").sd
    assert record["stages"][-1]["elements"]["gm2"]["over_parts_sd"] == plan.last.of("gm2").over_parts
    assert record["stages"][-1]["verdict"]["decidable"] is True


def test_wishes_are_listed_with_whether_they_are_met() -> None:
    record = plan_as_dict(plan_with_wishes())
    found = {one["name"]: (one["met"], one["within_reach"]) for one in record["wanted"]}
    assert found == {"gm2": (True, True), "Cc": (False, True), "load_parasitic_f": (False, False)}
    assert record["stages"][-1]["elements"]["gm2"]["worst_sd"] is None
