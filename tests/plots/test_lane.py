"""The lane of roots along the frequency axis: a root without a value is its region, not an arrow beyond the edge."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from drawn_parts import comparison_of, drawn_lines, words_in, x_of

from fitamp.estimate import Estimate, Known
from fitamp.fitting import LoopFit
from fitamp.plots import loop_figure


def with_pole2(low_hz: float | None, high_hz: float | None, known: Known) -> LoopFit:
    """A fit that knows of pole 2 only between what it lies."""
    fit = comparison_of(1300).fit
    pole2_hz = Estimate(value=None, stderr=None, ci95=(low_hz, high_hz), known=known)
    return replace(fit, parameters=replace(fit.parameters, pole2_hz=pole2_hz))


def test_a_root_between_two_ends_is_its_region_with_words_beside_it() -> None:
    figure = loop_figure(with_pole2(2e6, 5e6, Known.UNDETERMINED))
    assert drawn_lines(figure, "measured pole 2") == []
    assert not [line for line in figure.axes[1].lines if line.get_marker() == ">"]
    regions = [sorted(x_of(line)) for line in drawn_lines(figure, "region")]
    assert any(np.allclose(region, [2e6, 5e6]) for region in regions)
    assert any(words.startswith("pole 2: 2.000 MHz to 5.000 MHz") for words in words_in(figure))
    assert not any(2e6 < x_of(guide)[0] < 5e6 for guide in drawn_lines(figure, "root"))


def test_a_root_above_a_bound_is_an_arrow_at_the_edge() -> None:
    figure = loop_figure(with_pole2(300e6, None, Known.LOWER_BOUND))
    (arrow,) = drawn_lines(figure, "measured pole 2")
    assert arrow.get_marker() == ">"
    assert any("pole 2: above 300.0 MHz" in words for words in words_in(figure))
