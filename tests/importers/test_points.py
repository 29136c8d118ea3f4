"""Order, repeated frequencies and 0 Hz, apart from any file form."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest

from fitamp.errors import SweepError
from fitamp.importers.points import Points, finish
from fitamp.sweep import Origin, Sweep


def finished(freq_hz: Sequence[float], *, may_fall: bool = True) -> Sweep:
    f = np.array(freq_hz, dtype=float)
    points = Points(lines=tuple(range(2, 2 + len(f))), freq_hz=f, gain=f + 1j)
    return finish(points, origin=Origin(file="a.csv"), decisions=(), may_fall=may_fall)


def test_rising_order_is_kept() -> None:
    sweep = finished([1, 2, 4])
    assert sweep.gain.tolist() == [1 + 1j, 2 + 1j, 4 + 1j]
    assert sweep.decisions == ()


def test_falling_order_is_reversed_together_with_the_gain() -> None:
    sweep = finished([4, 2, 1, 0])
    assert sweep.freq_hz.tolist() == [1, 2, 4]
    assert sweep.gain.tolist() == [1 + 1j, 2 + 1j, 4 + 1j]
    assert [(point.f_hz, point.gain) for point in sweep.left_out] == [(0.0, 1j)]
    assert [decision.topic for decision in sweep.decisions] == ["order", "point at 0 Hz"]


@pytest.mark.parametrize(
    ("freq_hz", "message"),
    [
        ([1, 2, -4], "a.csv, line 4: frequency -4 Hz is negative"),
        ([1, 2, 4, 2], "a.csv, line 5: frequency 2 Hz is there already on line 3"),
        ([4, 2, 2, 1], "a.csv, line 4: frequency 2 Hz is there already on line 3"),
        ([0, 0, 1], "a.csv, line 3: frequency 0 Hz is there already on line 2"),
        ([1, 4, 2, 8], "a.csv, line 4: frequency must rise or fall throughout, but 2 Hz stands next to 4 Hz of line 3"),
        ([8, 2, 4, 1], "a.csv, line 3: frequency must rise or fall throughout, but 2 Hz stands next to 4 Hz of line 4"),
        ([0], "a.csv: no point above 0 Hz"),
    ],
)
def test_disorder_is_refused_with_its_line(freq_hz: list[float], message: str) -> None:
    with pytest.raises(SweepError, match=message):
        finished(freq_hz)


def test_falling_order_is_refused_where_the_form_forbids_it() -> None:
    with pytest.raises(SweepError, match=r"a\.csv, line 3: frequency must rise or fall throughout"):
        finished([2, 1], may_fall=False)
