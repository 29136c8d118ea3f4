"""Resonances in the pictures: at their places, paler than poles and zero, named with quality, nothing squeezed."""

from __future__ import annotations

from dataclasses import replace

import pytest
from drawn_parts import (
    comparison_of,
    comparison_with_resonances,
    drawn_lines,
    fit_of_pair_with_resonance,
    words_in,
    x_of,
    y_of,
)
from matplotlib.figure import Figure

from fitamp.fitting import LoopFit, Root
from fitamp.plots import loop_figure, splane_figure
from fitamp.plots.further import further_marks


def loop_of_resonances() -> Figure:
    comparison = comparison_with_resonances()
    return loop_figure(comparison.fit, comparison)


def splane_of_resonances() -> Figure:
    comparison = comparison_with_resonances()
    return splane_figure(comparison.fit, comparison)


def test_each_resonance_has_poles_zeros_and_words_the_lowest_first() -> None:
    low, high = further_marks(comparison_with_resonances().fit)
    assert (low.words, high.words) == ("400 kHz, Q 10", "30.0 MHz, Q 20")
    assert high.poles.value_hz is not None
    assert high.zeros.value_hz is not None
    # A pole pair with quality Q lies at −f/2Q ± j·f·√(1 − 1/4Q²) (textbook).
    assert high.poles.value_hz == pytest.approx(complex(-30e6 / 40, 30e6 * (1 - 1 / 1600) ** 0.5), rel=2e-3)
    assert abs(high.zeros.value_hz) == pytest.approx(1.02 * 30e6, rel=1e-3)


def test_a_fit_without_resonances_has_no_row_for_them() -> None:
    comparison = comparison_of(1300)
    assert further_marks(comparison.fit) == ()
    for figure in (loop_figure(comparison.fit, comparison), splane_figure(comparison.fit, comparison)):
        assert not any("resonance" in words for words in words_in(figure))


def test_the_lane_has_a_row_of_resonances_below_the_measured_one() -> None:
    figure = loop_of_resonances()
    lane = figure.axes[1]
    assert [label.get_text() for label in lane.get_yticklabels()] == ["resonance", "measured", "designed"]
    poles, zeros = (drawn_lines(figure, f"resonance {name}") for name in ("poles", "zeros"))
    assert [x_of(line)[0] for line in poles] == pytest.approx([400e3, 30e6], rel=1e-3)
    assert [x_of(line)[0] for line in zeros] == pytest.approx([0.97 * 400e3, 1.02 * 30e6], rel=1e-3)
    assert [line.get_marker() for line in (*poles, *zeros)] == ["x", "x", "o", "o"]
    assert {"400 kHz, Q 10", "30.0 MHz, Q 20"} <= set(words_in(figure))
    (zero,) = drawn_lines(figure, "measured zero")
    assert y_of(poles[0])[0] < y_of(zero)[0]


def test_guides_belong_to_poles_and_zero_alone() -> None:
    with_resonances, without = loop_of_resonances(), comparison_of(1300)
    guides = drawn_lines(with_resonances, "root")
    assert len(guides) == len(drawn_lines(loop_figure(without.fit, without), "root"))
    assert not any(0.99 < x_of(guide)[0] / place < 1.01 for guide in guides for place in (400e3, 30e6))


def test_on_the_real_axis_a_resonance_stands_at_its_real_part_and_moves_nothing() -> None:
    figure = splane_of_resonances()
    axes = figure.axes[0]
    poles = drawn_lines(figure, "resonance poles")
    assert [x_of(line)[0] for line in poles] == pytest.approx([-400e3 / 20, -30e6 / 40], rel=5e-3)
    rows = {label.get_text(): y for label, y in zip(axes.get_yticklabels(), axes.get_yticks(), strict=True)}
    assert rows["resonance,\nreal part"] == y_of(poles[0])[0] < rows["measured"] < rows["designed"]
    comparison = comparison_of(1300)
    plain = splane_figure(comparison.fit, comparison).axes[0]
    assert axes.get_xlim()[1] == pytest.approx(plain.get_xlim()[1], rel=0.2)


def test_resonances_are_smaller_and_paler_than_poles_and_zero() -> None:
    for figure in (loop_of_resonances(), splane_of_resonances(), splane_figure(fit_of_pair_with_resonance(30e6))):
        further = drawn_lines(figure, "resonance poles")[0]
        own = drawn_lines(figure, "measured zero")[0]
        assert further.get_markersize() < own.get_markersize()
        assert further.get_alpha() is not None
        assert own.get_alpha() is None


def test_words_of_the_real_axis_do_not_overlap() -> None:
    figure = splane_of_resonances()
    figure.draw_without_rendering()
    boxes = [text.get_window_extent() for text in figure.axes[0].texts if text.get_text()]
    assert len(boxes) >= 10
    for index, box in enumerate(boxes):
        assert not any(box.overlaps(other) for other in boxes[:index])


def test_in_the_plane_a_resonance_is_a_pale_pair_with_words_in_the_legend() -> None:
    figure = splane_figure(fit_of_pair_with_resonance(30e6))
    (poles,) = drawn_lines(figure, "resonance poles")
    assert sorted(y_of(poles)) == pytest.approx([-30e6, 30e6], rel=2e-3)
    assert figure.axes[0].get_ylim()[1] > 30e6
    assert {"resonance", "30.0 MHz, Q 20"} <= set(words_in(figure))


def test_a_linear_plane_is_not_stretched_for_a_resonance_that_is_said_to_lie_beyond_it() -> None:
    fit = fit_of_pair_with_resonance(40e6, zero_hz=-9e6)
    figure = splane_figure(fit)
    assert figure.axes[0].get_yscale() == "linear"
    assert figure.axes[0].get_ylim()[1] < 10e6
    assert "40.0 MHz, Q 20 (beyond the picture)" in words_in(figure)


def with_doublet(fit: LoopFit, zero_hz: float = -1.15e6) -> LoopFit:
    """The fit with a pole at 1 MHz and a zero close by, as of a current mirror."""
    pole, zero = (Root(value_hz=complex(place), covariance=None) for place in (-1e6, zero_hz))
    return replace(fit, doublet_poles=(pole,), doublet_zeros=(zero,))


def test_a_doublet_has_a_row_of_its_own_with_both_places() -> None:
    fit = with_doublet(comparison_of(1300).fit)
    figure = loop_figure(fit)
    assert [label.get_text() for label in figure.axes[1].get_yticklabels()] == ["doublet", "measured"]
    assert x_of(drawn_lines(figure, "doublet poles")[0])[0] == 1e6
    assert x_of(drawn_lines(figure, "doublet zeros")[0])[0] == 1.15e6
    assert "pole 1.00 MHz, zero 1.15 MHz" in words_in(figure)
    (one,) = further_marks(with_doublet(fit, zero_hz=2e6))
    assert one.words == "pole 1.00 MHz, zero 2.00 MHz (right)"


def test_on_the_real_axis_a_doublet_stands_where_it_is() -> None:
    figure = splane_figure(with_doublet(comparison_of(1300).fit))
    assert x_of(drawn_lines(figure, "doublet zeros")[0])[0] == -1.15e6
    assert "doublet" in [label.get_text() for label in figure.axes[0].get_yticklabels()]


def test_doublets_and_resonances_share_a_row() -> None:
    comparison = comparison_with_resonances()
    fit = with_doublet(comparison.fit)
    assert [one.kind for one in further_marks(fit)] == ["resonance", "doublet", "resonance"]
    assert "further" in [label.get_text() for label in loop_figure(fit).axes[1].get_yticklabels()]
    assert "further,\nreal part" in [label.get_text() for label in splane_figure(fit).axes[0].get_yticklabels()]


def test_in_the_plane_a_doublet_lies_on_the_real_axis() -> None:
    figure = splane_figure(with_doublet(fit_of_pair_with_resonance(30e6)))
    (pole,) = drawn_lines(figure, "doublet poles")
    assert list(y_of(pole)) == [0.0]
    assert {"doublet", "further", "pole 1.00 MHz, zero 1.15 MHz"} <= set(words_in(figure))
