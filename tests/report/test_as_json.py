"""JSON of fits and comparisons: fixed keys, null and never NaN, ASCII, whatever the sweep."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from typing import Any

import pytest
from awkward_parts import AWKWARD, HOSTILE_NAME, awkward

from fitamp.comparison import Comparison
from fitamp.estimate import Known
from fitamp.report.as_json import comparison_as_dict, dumps, fit_as_dict, sweep_as_dict

ESTIMATE = {"value", "stderr", "ci95"}
# The schemas fitamp/fit/1 and fitamp/compare/1: scripts rely on these keys. More may be there.
SWEEP = {"file", "points", "points_used", "f_min_hz", "f_max_hz", "sign", "left_out"}
MODEL = {"name", "poles", "zeros", "adequate", "reduced_chi_square", "misfit_hz"}
NOISE = {"error_channel", "return_channel", "relative", "source"}
PARAMETERS = {"dc_gain", "gain_bandwidth_hz", "pole1_hz", "pole2_hz", "zero_time_s", "delay_s"}
MARGINS = {"crossover_hz", "phase_margin_deg", "gain_margin_db"}
FIT = {
    "schema",
    "sweep",
    "model",
    "noise",
    "parameters",
    "zero",
    "poles",
    "zeros",
    "margins",
    "warnings",
    "range_steps",
}
COMPARE = FIT | {"comparison", "verdict", "advice"}
ROW = {
    "quantity",
    "designed",
    "designed_as_measured",
    "measured",
    "stderr",
    "deviation",
    "sigma",
    "low",
    "high",
    "inside",
}
KNOWN = {"measured", "lower-bound", "upper-bound", "undetermined"}
NULLING = {"as-designed", "too-little", "too-much", "wrong-side", "at-infinity", "undecided"}


def read_back(record: dict[str, Any]) -> dict[str, Any]:
    """The record after a strict reader: a NaN or infinity would be refused."""

    def refuse(constant: str) -> None:
        raise AssertionError(f"{constant} in JSON")

    text = dumps(record)
    assert text.isascii()
    read: dict[str, Any] = json.loads(text, parse_constant=refuse)
    json.dumps(read, allow_nan=False)
    return read


def check_estimate(estimate: dict[str, Any], *, with_known: bool = True) -> None:
    """An estimate's keys, and that value, error and interval agree."""
    assert set(estimate) >= ESTIMATE | ({"known"} if with_known else set())
    low, high = estimate["ci95"]
    value = estimate["value"]
    if with_known:
        assert estimate["known"] in KNOWN
        if estimate["known"] != "measured":
            assert value is None
            assert estimate["stderr"] is None
    if value is not None and low is not None and high is not None:
        assert low <= value <= high
    if low is not None and high is not None:
        assert low <= high


def check_fit(record: dict[str, Any]) -> None:
    """Everything that the schema of a fit promises."""
    assert set(record) >= FIT
    assert set(record["sweep"]) >= SWEEP
    assert record["sweep"]["points"] == record["sweep"]["points_used"] + len(record["sweep"]["left_out"])
    for point in record["sweep"]["left_out"]:
        assert set(point) >= {"f_hz", "reason"}
    assert set(record["model"]) >= MODEL
    assert record["model"]["name"] in {"two-pole-one-zero", "vector-fit"}
    assert isinstance(record["model"]["adequate"], bool)
    assert record["model"]["poles"] == len(record["poles"])
    assert record["model"]["zeros"] == len(record["zeros"])
    assert set(record["noise"]) >= NOISE
    assert set(record["parameters"]) >= PARAMETERS
    assert set(record["margins"]) >= MARGINS
    for estimate in (*record["parameters"].values(), *record["margins"].values()):
        check_estimate(estimate)
    assert record["zero"]["half_plane"] in {"left", "right", "infinity", "undecided"}
    assert set(record["zero"]) >= {"half_plane", "frequency_hz", "ci95_hz"}
    assert len(record["zero"]["ci95_hz"]) == 2
    for root in (*record["poles"], *record["zeros"]):
        assert set(root) >= {"re_hz", "im_hz"}
    for warning in record["warnings"]:
        assert set(warning) >= {"code", "message"}


def check_comparison(record: dict[str, Any]) -> None:
    """Everything that the schema of a comparison promises beyond the fit's."""
    assert set(record) >= COMPARE
    for row in record["comparison"]:
        assert set(row) >= ROW
        assert row["inside"] in {True, False, None}
    assert record["verdict"]["nulling"] in NULLING
    assert record["verdict"]["reason"]
    for estimate in (
        record["verdict"]["zero_time_s"],
        record["verdict"]["gm2_rz"],
        record["advice"]["rz_change_ohm"],
    ):
        check_estimate(estimate, with_known=False)


@pytest.mark.parametrize("name", AWKWARD)
def test_every_key_is_there_however_awkward_the_sweep(name: str) -> None:
    comparison = awkward(name)
    fit = read_back(fit_as_dict(comparison.fit))
    assert fit["schema"] == "fitamp/fit/1"
    check_fit(fit)
    record = read_back(comparison_as_dict(comparison))
    assert record["schema"] == "fitamp/compare/1"
    check_fit(record)
    check_comparison(record)
    assert {key: value for key, value in record.items() if key in FIT - {"schema", "warnings"}} == {
        key: value for key, value in fit.items() if key not in {"schema", "warnings"}
    }
    # A comparison knows more to warn of, and nothing less.
    assert all(warning in record["warnings"] for warning in fit["warnings"])


def test_every_key_is_there_for_the_examples(compared_examples: dict[str, Comparison]) -> None:
    for comparison in compared_examples.values():
        record = read_back(comparison_as_dict(comparison))
        check_fit(record)
        check_comparison(record)


def test_what_is_not_known_is_null() -> None:
    below = read_back(comparison_as_dict(awkward("pole 1 below band")))
    assert below["parameters"]["pole1_hz"]["known"] == "upper-bound"
    assert below["parameters"]["pole1_hz"]["ci95"][0] is None
    assert below["parameters"]["dc_gain"]["known"] == "lower-bound"
    assert below["margins"]["gain_margin_db"]["value"] is None
    assert "pole1-below-band" in {warning["code"] for warning in below["warnings"]}
    uncrossed = read_back(comparison_as_dict(awkward("no crossover")))
    assert uncrossed["margins"]["crossover_hz"]["value"] is None
    assert uncrossed["margins"]["phase_margin_deg"]["value"] is None
    roots = read_back(comparison_as_dict(awkward("by roots")))
    assert roots["parasitic"] is None
    assert roots["advice"]["rz_change_ohm"]["value"] is None
    assert roots["verdict"]["gm2_rz"]["value"] is None


def test_poles_are_signed_roots_and_positive_distances() -> None:
    record = read_back(fit_as_dict(awkward("no resistor").fit))
    first, second = sorted(math.hypot(pole["re_hz"], pole["im_hz"]) for pole in record["poles"])[:2]
    assert all(pole["re_hz"] < 0 for pole in record["poles"])
    assert record["parameters"]["pole1_hz"]["value"] == pytest.approx(first)
    assert record["parameters"]["pole2_hz"]["value"] == pytest.approx(second)
    # Right half plane: a positive root, a negative time.
    assert record["zero"]["half_plane"] == "right"
    assert record["zeros"][0]["re_hz"] > 0
    assert record["parameters"]["zero_time_s"]["value"] < 0
    assert record["zero"]["frequency_hz"] == pytest.approx(record["zeros"][0]["re_hz"])


def test_an_infinite_window_or_number_becomes_null() -> None:
    comparison = awkward("no resistor")
    window = replace(comparison.verdict.window, high_s=math.inf)
    rows = tuple(replace(row, high=math.inf, sigma=math.nan) for row in comparison.rows)
    record = read_back(
        comparison_as_dict(replace(comparison, rows=rows, verdict=replace(comparison.verdict, window=window)))
    )
    assert record["verdict"]["window_s"][1] is None
    assert all(row["high"] is None and row["sigma"] is None for row in record["comparison"])


def test_a_nan_that_slipped_in_is_refused() -> None:
    with pytest.raises(ValueError, match="not JSON compliant"):
        dumps({"value": math.nan})


def test_a_hostile_file_name_survives_the_round_trip_as_ascii() -> None:
    comparison = awkward("hostile name")
    assert read_back(sweep_as_dict(comparison.fit.sweep))["sweep"]["file"] == HOSTILE_NAME
    record = read_back(comparison_as_dict(comparison))
    assert record["sweep"]["file"] == record["design"]["file"] == HOSTILE_NAME


def test_known_words_are_those_of_the_schema() -> None:
    assert {known.value for known in Known} == KNOWN


def test_stretches_of_a_misfit_are_pairs_of_frequencies(compared_examples: dict[str, Comparison]) -> None:
    fit = compared_examples["a"].fit
    assert fit_as_dict(fit)["model"]["misfit_hz"] == []
    misfitting = replace(fit, adequacy=replace(fit.adequacy, where_hz=((12e6, 60e6),)))
    assert fit_as_dict(misfitting)["model"]["misfit_hz"] == [[12e6, 60e6]]
