"""Two records are put together on the same frequencies only."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fitamp.errors import SweepError
from fitamp.loopgain.pairs import paired
from fitamp.sweep import LeftOut, Origin, Sweep

FREQ_HZ = np.array([10.0, 20.0, 30.0])
FIRST = Sweep(freq_hz=FREQ_HZ, gain=np.array([1, 2, 3]), origin=Origin(file="a.csv"))
SECOND = replace(FIRST, gain=np.array([4, 5, 6]), origin=Origin(file="b.csv"))


def test_rounding_of_a_frequency_does_not_part_two_records() -> None:
    first, second, left_out = paired(FIRST, replace(SECOND, freq_hz=FREQ_HZ * (1 + 1e-6)))
    assert first is FIRST
    assert second.gain.tolist() == [4, 5, 6]
    assert left_out == ()


def test_point_that_one_record_left_out_is_left_out_of_both() -> None:
    gap = LeftOut(f_hz=20.0, gain=None, reason="no reading")
    second = replace(SECOND, freq_hz=FREQ_HZ[[0, 2]], gain=np.array([4, 6]), left_out=(gap,))
    first, second, left_out = paired(FIRST, second)
    assert first.freq_hz.tolist() == second.freq_hz.tolist() == [10.0, 30.0]
    assert first.gain.tolist() == [1, 3]
    assert left_out == (gap,)


def test_other_frequencies_are_refused_with_the_first_that_is_strange() -> None:
    with pytest.raises(SweepError, match=r"a\.csv, point 2: 20.00000 Hz is not in b\.csv; both records must be on"):
        paired(FIRST, replace(SECOND, freq_hz=np.array([10.0, 21.0, 30.0])))
    with pytest.raises(SweepError, match=r"b\.csv, point 3: 30.00000 Hz is not in a\.csv"):
        paired(replace(FIRST, freq_hz=FREQ_HZ[:2], gain=FIRST.gain[:2]), SECOND)
