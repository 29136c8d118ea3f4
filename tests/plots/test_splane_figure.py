"""The s-plane picture: roots where they are, regions as far as they reach, infinity at both edges."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import comparison_of, drawn, drawn_lines, fit_of_pair, words_in, x_of, y_of
from matplotlib.patches import Polygon, Rectangle

from fitamp.comparison import Nulling
from fitamp.plots import splane_figure


def _bars(rz_ohm: float, name: str) -> list[tuple[float, float]]:
    comparison = comparison_of(rz_ohm)
    bars = drawn(splane_figure(comparison.fit, comparison), f"region {name}")
    return [(bar.get_x(), bar.get_x() + bar.get_width()) for bar in bars if isinstance(bar, Rectangle)]


def test_roots_stand_at_their_places() -> None:
    comparison = comparison_of(0)
    figure = splane_figure(comparison.fit, comparison)
    poles = comparison.fit.response.poles_hz
    assert x_of(drawn_lines(figure, "measured pole 1")[0])[0] == pytest.approx(poles[0].real)
    assert x_of(drawn_lines(figure, "measured pole 2")[0])[0] == pytest.approx(poles[1].real)
    assert x_of(drawn_lines(figure, "measured zero")[0])[0] == pytest.approx(comparison.fit.response.zeros_hz[0].real)
    designed = comparison.design.on_bench()
    assert x_of(drawn_lines(figure, "designed pole 2")[0])[0] == pytest.approx(designed.poles_hz[1].real)
    assert x_of(drawn_lines(figure, "designed zero")[0])[0] == pytest.approx(designed.zeros_hz[0].real)


def test_designed_lane_lies_above_the_measured_one() -> None:
    comparison = comparison_of(0)
    figure = splane_figure(comparison.fit, comparison)
    assert y_of(drawn_lines(figure, "designed zero")[0])[0] > y_of(drawn_lines(figure, "measured zero")[0])[0]


def test_region_of_the_zero_is_its_interval_of_zero_times() -> None:
    low, high = comparison_of(0).fit.parameters.zero_time_s.ci95
    assert low is not None
    assert high is not None
    (bar,) = _bars(0, "zero")
    assert bar == pytest.approx((-1 / (2 * np.pi * low), -1 / (2 * np.pi * high)))


def test_region_through_infinity_reaches_both_edges() -> None:
    comparison = comparison_of(625)  # gm2·Rz = 1 sends the zero to infinity (common practice)
    low, high = comparison.verdict.zero_time_s.ci95
    assert low is not None
    assert high is not None
    assert low < 0 < high
    figure = splane_figure(comparison.fit, comparison)
    edge = figure.axes[0].get_xlim()[1]
    left, right = sorted(_bars(625, "zero"))
    assert left == pytest.approx((-edge, -1 / (2 * np.pi * high)))
    assert right == pytest.approx((-1 / (2 * np.pi * low), edge))
    assert sorted(str(line.get_marker()) for line in drawn_lines(figure, "to infinity")) == ["<", ">"]


def test_the_way_to_the_other_half_plane_goes_through_infinity() -> None:
    comparison = comparison_of(0)
    words = words_in(splane_figure(comparison.fit, comparison))
    assert {"to ∞", "from ∞"} <= set(words)
    stays = comparison_of(3000)
    assert not {"to ∞", "from ∞"} & set(words_in(splane_figure(stays.fit, stays)))


def test_an_open_verdict_moves_no_zero_through_infinity() -> None:
    comparison = comparison_of(0)
    verdict = replace(comparison.verdict, nulling=Nulling.UNDECIDED)
    undecided = replace(comparison, verdict=verdict)
    assert not {"to ∞", "from ∞"} & set(words_in(splane_figure(undecided.fit, undecided)))


def test_values_and_deviation_are_written() -> None:
    comparison = comparison_of(0)
    words = words_in(splane_figure(comparison.fit, comparison))
    (pole2,) = [text for text in words if text.startswith("pole 2:") and "±" in text]
    # 55.70 MHz without the resistor against 60.76 MHz with it, by the exact circuit: −8.3 %.
    found = re.search(r"^pole 2: ([0-9.]+) ± [0-9.]+ MHz \(−([0-9.]+) %\)$", pole2)
    assert found is not None
    assert float(found[1]) == pytest.approx(55.70, abs=0.1)
    assert float(found[2]) == pytest.approx(8.3, abs=0.2)
    assert any(text.startswith("zero (right): 141") for text in words)


def test_labels_of_a_lane_do_not_overlap() -> None:
    for rz_ohm in (0.0, 625.0, 1300.0, 3000.0):
        comparison = comparison_of(rz_ohm)
        figure = splane_figure(comparison.fit, comparison)
        boxes = [
            text.get_window_extent() for text in figure.axes[0].texts if text.get_text().startswith(("pole", "zero"))
        ]
        for index, box in enumerate(boxes):
            assert not any(box.overlaps(other) for other in boxes[:index])
            assert figure.axes[0].bbox.x0 - 1 <= box.x0
            assert box.x1 <= figure.axes[0].bbox.x1 + 1


def test_a_pair_is_drawn_in_the_plane_with_its_ellipse() -> None:
    fit = fit_of_pair()
    figure = splane_figure(fit)
    (pair,) = drawn_lines(figure, "measured pole pair")
    upper = fit.poles[0].value_hz if fit.poles[0].value_hz.imag > 0 else fit.poles[1].value_hz
    np.testing.assert_allclose(x_of(pair), [upper.real] * 2)
    np.testing.assert_allclose(y_of(pair), [upper.imag, -upper.imag])
    ellipse = next(patch for patch in drawn(figure, "region pole pair") if isinstance(patch, Polygon))
    root = next(root for root in fit.poles if root.value_hz.imag > 0)
    assert root.covariance is not None
    # Every point of a 95 % ellipse is at the same Mahalanobis distance, 5.991 (chi-square, two degrees of freedom).
    outline = np.asarray(ellipse.get_xy()) - [upper.real, upper.imag]
    distance = np.einsum("ki,ij,kj->k", outline, np.linalg.inv(root.covariance), outline)
    np.testing.assert_allclose(distance, 5.991, rtol=1e-3)


def test_half_planes_are_named() -> None:
    words = words_in(splane_figure(comparison_of(0).fit))
    assert "◀ left half plane: a zero here adds lead" in words
    assert "right half plane: a zero here adds lag ▶" in words
