"""The record of an element estimate: fixed keys, plain numbers, and sums that a script can check."""

from __future__ import annotations

import json
import math
from typing import Any

import numpy as np
import pytest
from estimated_parts import AWKWARD_PARTS, HOSTILE_NAME, awkward_findings

from fitamp.findings import ElementFindings, findings_of
from fitamp.report.as_json import dumps
from fitamp.report.elements_json import elements_as_dict

KEYS = {
    "schema",
    "design",
    "trustworthy",
    "consistent",
    "elements",
    "bench",
    "parasitic",
    "poles",
    "zeros",
    "zero_time_s",
    "gm2_rz",
    "derived",
    "comparison",
    "verdict",
    "advice",
    "broken_limits",
    "sweeps",
    "other_valley",
    "blame",
    "lines",
    "restoring",
    "wanted",
    "predictions",
    "warnings",
}
ELEMENT_KEYS = {
    "unit",
    "designed",
    "value",
    "stderr",
    "ci95",
    "known",
    "informed",
    "deviation",
    "spread",
    "held",
}


def record_of(findings: ElementFindings) -> dict[str, Any]:
    """The record as a script gets it."""
    record: dict[str, Any] = json.loads(dumps(elements_as_dict(findings)))
    return record


@pytest.mark.parametrize("name", AWKWARD_PARTS)
def test_the_keys_are_always_there_and_all_numbers_plain(name: str) -> None:
    record = record_of(awkward_findings(name))
    assert set(record) == KEYS
    assert record["schema"] == "fitamp/elements/1"
    assert {"gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz"} <= set(record["elements"])
    for one in (*record["elements"].values(), *record["bench"].values()):
        assert set(one) == ELEMENT_KEYS
        assert 0 <= one["informed"] <= 1
    for sweep in record["sweeps"]:
        assert set(sweep["condition"]) == {"load_added_f", "rz_added_ohm", "temp_c", "note"}


def test_names_from_files_are_escaped_to_ascii() -> None:
    findings = awkward_findings("hostile name")
    text = dumps(elements_as_dict(findings))
    assert text.isascii()
    assert "\x1b" not in text
    record = json.loads(text)
    assert record["design"]["file"] == HOSTILE_NAME
    assert record["sweeps"][1]["file"] == f"1{HOSTILE_NAME}"


def test_the_example_reproduces_its_true_elements(stepped_example: ElementFindings) -> None:
    record = record_of(stepped_example)
    # As scripts/make_examples.py makes it: factors on the design, and a bench of 2.03 pF and 0.41 ns.
    true = {"gm1": 1.04 * 150e-6, "R1": 0.93e6, "C1": 1.09 * 200e-15, "gm2": 0.84 * 1.6e-3, "R2": 55e3}
    true |= {"CL": 1.01 * 4e-12 + 0.8e-12, "Cc": 1.03 * 1.8e-12, "Rz": 1080.0}
    for name, value in true.items():
        found = record["elements"][name]
        assert abs(found["value"] - value) < 3 * found["stderr"], name
        # So well known that agreement says something.
        assert found["stderr"] < {"R1": 0.03, "R2": 0.03, "CL": 0.03}.get(name, 0.006) * value, name
    for name, value in {"bench_load_f": 2.03e-12, "bench_delay_s": 0.41e-9}.items():
        found = record["bench"][name]
        assert abs(found["value"] - value) < 3 * found["stderr"], name
    load = record["parasitic"]["load_f"]
    # 0.8 pF of pad, 1 % of CL, and a probe of 2.03 pF where 2 pF are stated within 5 %.
    assert load["ci95"][0] < 0.84e-12 < load["ci95"][1]
    assert load["ci95"][0] > 0


def test_contributions_add_up_to_the_change(stepped_example: ElementFindings) -> None:
    record = record_of(stepped_example)
    for quantity in ("zero_time_s", "pole2_hz", "phase_margin_deg"):
        one = record["blame"][quantity]
        whole = one["estimated"] - one["designed"]
        assert sum(part["share"]["value"] for part in one["contributions"]) == pytest.approx(whole, rel=1e-9)
        assert one["change"]["value"] == pytest.approx(whole)
        variance = np.array(one["covariance"]).sum()
        assert math.sqrt(variance) == pytest.approx(one["change"]["stderr"], rel=0.02)


def test_roots_are_those_of_the_loaded_circuit(stepped_example: ElementFindings) -> None:
    record = record_of(stepped_example)
    assert [pole["name"] for pole in record["poles"]] == ["pole 1", "pole 2", "pole 3"]
    for pole, name in zip(record["poles"], ("pole1_hz", "pole2_hz", "pole3_hz"), strict=True):
        assert (pole["re_hz"], pole["im_hz"]) == (pytest.approx(-record["derived"][name]["value"]), 0)
        assert pole["re_stderr_hz"] == record["derived"][name]["stderr"]
    (zero,) = record["zeros"]
    # A left-half-plane zero: −1/(2π τz).
    assert zero["re_hz"] == pytest.approx(-1 / (2 * math.pi * record["zero_time_s"]["value"]))
    assert record["gm2_rz"]["value"] == pytest.approx(
        record["elements"]["gm2"]["value"] * record["elements"]["Rz"]["value"]
    )


def test_mirror_and_feedthrough_have_their_roots() -> None:
    record = record_of(awkward_findings("shorted"))
    names = [root["name"] for root in (*record["poles"], *record["zeros"])]
    assert {"pole 1", "pole 2", "mirror pole", "zero", "mirror zero"} <= set(names)
    mirror_pole, mirror_zero = (
        next(root for root in record[kind] if root["name"].startswith("mirror")) for kind in ("poles", "zeros")
    )
    assert mirror_zero["re_hz"] == pytest.approx(2 * mirror_pole["re_hz"])
    assert next(root for root in record["zeros"] if root["name"] == "zero")["re_hz"] > 0


def test_what_keeps_the_wanted_margin_stands_in_numbers(stepped_example: ElementFindings) -> None:
    record = record_of(stepped_example)
    wanted = record["wanted"]
    assert (wanted["phase_margin_deg"], wanted["keeps"], wanted["load_low_f"]) == (65, True, None)
    assert wanted["load_high_f"]["value"] - wanted["load_f"] == pytest.approx(wanted["room_f"]["value"])
    load, resistor = record["predictions"]["load"], record["predictions"]["resistor"]
    for prediction, at in ((load, "load_f"), (resistor, "rz_ohm")):
        for name in ("crossover_hz", "phase_margin_deg", "overshoot", "settling_s"):
            assert {len(curve) for curve in prediction[name].values()} == {len(prediction[at])}
    at_end = np.interp(wanted["load_high_f"]["value"], load["load_f"], load["phase_margin_deg"]["value"])
    assert at_end == pytest.approx(65, abs=1e-6)


def test_without_curves_and_wish_their_places_are_null(stepped_example: ElementFindings) -> None:
    record = record_of(findings_of(stepped_example.estimate, curves=False))
    assert record["predictions"] == {"load": None, "resistor": None}
    assert record["wanted"]["rz_low_ohm"] is None
    assert record_of(awkward_findings("single"))["wanted"]["phase_margin_deg"] == 60


def test_a_sweep_of_another_part_is_told_from_the_others() -> None:
    record = record_of(awkward_findings("another part"))
    assert record["consistent"] is False
    assert [sweep["left_out_of_estimate"] for sweep in record["sweeps"]] == [False, False, False, True]
    assert record["sweeps"][3]["suspect"] in record["elements"]
    assert record["warnings"][0]["code"] == "part-changed"
    assert record["warnings"][0]["files"] == ["step3.csv"]
    assert record["sweeps"][3]["reduced_chi_square"] > 10 > record["sweeps"][0]["reduced_chi_square"]


def test_lines_have_points_slope_and_the_joint_fit(stepped_example: ElementFindings) -> None:
    pole2, zero = record_of(stepped_example)["lines"]
    assert (pole2["kind"], zero["kind"]) == ("pole2-over-load", "zero-over-resistance")
    assert zero["x"] == [0, 0, 0, -400, 500]
    # The slope of the zero time is Cc, 1.03 of 1.8 pF.
    assert abs(zero["slope"]["value"] - 1.854e-12) < 3 * zero["slope"]["stderr"]
    assert zero["joint"]["slope"] == pytest.approx(1.854e-12, rel=0.003)
    assert len(pole2["y"]) == len(pole2["files"]) == 3
