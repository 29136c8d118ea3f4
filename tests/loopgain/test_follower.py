"""A closed-loop response back to its loop gain, with a caution."""

from __future__ import annotations

import numpy as np
import pytest
from loop_records import GAIN, record

from fitamp.errors import SweepError, UsageError
from fitamp.loopgain import follower_to_loop
from fitamp.sweep import Concern


@pytest.mark.parametrize("beta", [1.0, 0.1])
def test_loop_gain_comes_back(beta: float) -> None:
    # A = (1/β)·T/(1 + T): H. S. Black's formula.
    sweep = follower_to_loop(record(GAIN / (1 + GAIN) / beta, "a.csv"), beta)
    # Ten thousand times the rounding of a double at DC.
    np.testing.assert_allclose(sweep.gain, GAIN, rtol=1e-11)
    (caution,) = [d for d in sweep.decisions if d.concern is Concern.CAUTION]
    assert caution.choice == "a relative error of A is up to 1e+04 times as large in T"
    assert "biased" in caution.reason


def test_feedback_gain_and_ideal_gain_are_refused() -> None:
    sweep = record(GAIN / (1 + GAIN), "a.csv")
    with pytest.raises(UsageError, match="a feedback gain of 0 is none"):
        follower_to_loop(sweep, 0.0)
    ideal = GAIN / (1 + GAIN)
    ideal[2] = 1
    with pytest.raises(SweepError, match=r"a\.csv, point 3 .*exactly its ideal gain"):
        follower_to_loop(record(ideal, "a.csv"))
