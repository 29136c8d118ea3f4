"""Cells that say that there is no reading."""

from __future__ import annotations

import numpy as np
import pytest

from fitamp.importers.readings import is_no_reading, without_reading


@pytest.mark.parametrize(
    "text",
    ["", "  ", "OVL", "ovld", "OL", "O.L", "Overload", "---", "--", "-", "*****", "####", "…"[:0], "NaN", "-NaN", "INF",
     "-inf", "#N/A", "#DIV/0!", "#NV", "n.a.", "None", "ERR", "\N{EM DASH}", "_____", "..."],
)  # fmt: skip
def test_words_for_no_reading(text: str) -> None:
    assert is_no_reading(text)


@pytest.mark.parametrize("text", ["0", "-1", "OK", "abc", "1 OVL", "freq", "-5", "=1+1", "E", "--1", "OVLX"])
def test_all_else_is_a_number_or_an_error(text: str) -> None:
    assert not is_no_reading(text)


def test_numbers_that_instruments_send_for_no_reading() -> None:
    # SCPI-1999, volume 1, section 7.2.1.4, from memory: NaN is 9.91E+37, the infinities are +-9.9E+37.
    values = np.array([9.91e37, 9.9e37, -9.9e37, 1.0, 9.8e37, 0.0])
    assert without_reading(values).tolist() == [True, True, True, False, False, False]
