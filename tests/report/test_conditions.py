"""What is said of repeats and through sweeps, in words and for JSON."""

from __future__ import annotations

import json

import numpy as np

from fitamp.conditioning.through import through_delay
from fitamp.report.conditions import caution_records, conditions, repeat_records, through_as_dict
from fitamp.sweep import Concern, Origin, Sweep

FREQ_HZ = np.geomspace(10.0, 200e6, 60)
SWEEP = (
    Sweep(
        freq_hz=FREQ_HZ,
        gain=np.ones(60, dtype=complex),
        origin=Origin(file="mean", averaged=(Origin(file="a.csv", sha256="aa"), Origin(file="b.csv"))),
    )
    .with_decision("order", "reversed", "it fell")
    .with_decision("repeats", "average of 2", "a.csv, b.csv", concern=Concern.RESULT)
    .with_decision("drift of repeats", "b.csv departs from a.csv", "by 9 standard errors", concern=Concern.CAUTION)
)


def test_each_decision_is_said_to_whom_it_concerns() -> None:
    assert list(conditions(SWEEP)) == ["repeats: average of 2 (a.csv, b.csv)"]
    assert caution_records(SWEEP) == [
        {"code": "drift-of-repeats", "message": "b.csv departs from a.csv: by 9 standard errors"}
    ]


def test_the_repeats_are_listed() -> None:
    assert repeat_records(SWEEP) == [{"file": "a.csv", "sha256": "aa"}, {"file": "b.csv", "sha256": None}]


def test_a_through_sweep_is_plain_json() -> None:
    gain = 0.9 * np.exp(-2j * np.pi * FREQ_HZ * 0.4e-9) * (1 + 1e-4 * np.random.default_rng(1).standard_normal(60))
    gain[30] *= 1.1
    record = json.loads(json.dumps(through_as_dict(through_delay(Sweep(freq_hz=FREQ_HZ, gain=gain)))))
    assert record["pure_delay"] is False
    assert record["departures"][0]["kind"] == "gain"
    assert abs(record["delay_s"] - 0.4e-9) < 5 * record["stderr_s"]
    assert [point["f_hz"] for point in record["left_out"]] == [FREQ_HZ[30]]
