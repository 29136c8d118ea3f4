"""Several sweeps in one table."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.importers.several import by_label, by_restart


def runs(freq_hz: list[float]) -> list[list[int]]:
    return [rows.tolist() for rows in by_restart(np.array(freq_hz, dtype=float))]


@pytest.mark.parametrize(
    ("freq_hz", "expected"),
    [
        ([1, 2, 4, 1, 2, 4], [[0, 1, 2], [3, 4, 5]]),
        ([4, 2, 1, 4, 2, 1, 4, 2, 1], [[0, 1, 2], [3, 4, 5], [6, 7, 8]]),
        ([1, 2, 4, 4, 2, 1], [[0, 1, 2], [3, 4, 5]]),
        ([1, 2, 4, 1.001, 2, 3.999], [[0, 1, 2], [3, 4, 5]]),
        ([1, 2, 4, 1, 3, 3.5, 4], [[0, 1, 2], [3, 4, 5, 6]]),
    ],
)
def test_frequency_that_starts_anew_over_the_same_band_makes_sweeps(
    freq_hz: list[float], expected: list[list[int]]
) -> None:
    assert runs(freq_hz) == expected


@pytest.mark.parametrize(
    "freq_hz",
    [[1, 2, 4, 8, 16, 32], [1], [1, 2, 2, 4], [1, 2, 4, 2, 1], [1, 2, 4, 8, 2, 4], [1, 2, 4, 4, 8, 16], [1, 2, 1, 2]],
)
def test_anything_else_stays_one_table(freq_hz: list[float]) -> None:
    assert runs(freq_hz) == [list(range(len(freq_hz)))]


def test_thousands_of_sweeps_are_none() -> None:
    assert len(by_restart(np.tile([1.0, 2.0, 4.0], 1000))) == 1000
    assert len(by_restart(np.tile([1.0, 2.0, 4.0], 1001))) == 1
    labels = [str(k) for k in range(1001)] * 3
    assert by_label(labels) == []
    assert len(by_label([label for label in labels if label != "7"])) == 1000


def test_labels_number_sweeps_also_row_by_row() -> None:
    assert [(name, rows.tolist()) for name, rows in by_label(list("ababab"))] == [
        ("'a'", [0, 2, 4]),
        ("'b'", [1, 3, 5]),
    ]


@pytest.mark.parametrize("labels", ["aaaaaa", "abcdef", "aaaab", ""])
def test_labels_that_number_something_else_are_passed_over(labels: str) -> None:
    assert by_label(list(labels)) == []
