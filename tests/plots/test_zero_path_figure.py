"""The path of the zero over the nulling resistor."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import (
    ELEMENTS,
    comparison_of,
    comparison_with_roots,
    covered,
    drawn,
    drawn_lines,
    shown_points,
    words_in,
    x_of,
    y_of,
)
from matplotlib.container import ErrorbarContainer
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.text import Text

from fitamp.comparison import Comparison, Nulling
from fitamp.estimate import Estimate
from fitamp.plots import zero_path_figure


def _figure(rz_ohm: float) -> Figure:
    figure = zero_path_figure(comparison_of(rz_ohm))
    assert figure is not None
    return figure


def test_a_design_by_roots_has_no_path() -> None:
    assert zero_path_figure(comparison_with_roots()) is None


def test_the_path_is_the_straight_line_of_the_textbook() -> None:
    (path,) = drawn_lines(_figure(0), "path")
    # τz = Cc·(Rz − 1/gm2), exact small-signal algebra; a resistor is not negative.
    np.testing.assert_allclose(y_of(path), ELEMENTS.Cc * (x_of(path) - 1 / ELEMENTS.gm2), rtol=1e-12)
    assert x_of(path)[0] == 0


@pytest.mark.parametrize("rz_ohm", [0.0, 3000.0])
def test_the_measured_place_names_the_resistor_that_explains_it(rz_ohm: float) -> None:
    figure = _figure(rz_ohm)
    measured = next(line for line in drawn_lines(figure, "measured") if line.get_marker() == "o")
    assert x_of(measured)[0] == pytest.approx(rz_ohm, abs=20)
    designed = drawn_lines(figure, "designed")[0]
    assert x_of(designed)[0] == pytest.approx(1300)


def test_regions_carry_the_verdicts_names_in_order() -> None:
    figure = _figure(900)
    names = ["wrong-side", "at-infinity", "too-little", "as-designed", "too-much"]
    bands = [drawn(figure, f"region {name}")[0] for name in names]
    bottoms = [band.get_y() for band in bands if isinstance(band, Rectangle)]
    assert bottoms == sorted(bottoms)
    assert set(names) <= set(words_in(figure))
    # 160 MHz and 80 MHz are the limits of the zero.
    as_designed = bands[3]
    assert isinstance(as_designed, Rectangle)
    assert as_designed.get_y() == pytest.approx(1 / (2 * np.pi * 160e6))
    assert as_designed.get_y() + as_designed.get_height() == pytest.approx(1 / (2 * np.pi * 80e6))


def test_advice_is_written_only_where_something_has_to_change() -> None:
    (raised,) = [text for text in words_in(_figure(0)) if "Rz by\n" in text]
    (lowered,) = [text for text in words_in(_figure(3000)) if "Rz by\n" in text]
    # 0 Ω and 3 kΩ against the designed 1.3 kΩ.
    assert re.fullmatch(r"raise Rz by\n1\.(29|30|31) ± [0-9.]+ kΩ", raised)
    assert re.fullmatch(r"lower Rz by\n1\.(69|7|70|71) ± [0-9.]+ kΩ", lowered)
    assert not any("Rz by\n" in text for text in words_in(_figure(1300)))


def test_the_right_hand_scale_has_infinity_between_the_half_planes() -> None:
    figure = _figure(0)
    strip = figure.axes[1]
    ticks = dict(zip((t.get_text() for t in strip.get_yticklabels()), strip.get_yticks(), strict=True))
    assert ticks["at infinity"] == 0
    assert ticks["200 MHz left"] == pytest.approx(1 / (2 * np.pi * 200e6))
    assert ticks["200 MHz right"] == pytest.approx(-1 / (2 * np.pi * 200e6))
    places = sorted(ticks.values())
    inch = (strip.get_ylim()[1] - strip.get_ylim()[0]) / (strip.get_position().height * figure.get_figheight())
    assert min(np.diff(places)) > 0.15 * inch  # 9 points of text are 0.125 inch high


def _undecided(rz_ohm: float, reach_s: float) -> Comparison:
    """A verdict left open by an interval of ± `reach_s`."""
    comparison = comparison_of(rz_ohm)
    value = comparison.verdict.zero_time_s.value
    assert value is not None
    zero_time = Estimate.gaussian(value, reach_s / 1.96, quantile=1.96)
    product = Estimate.gaussian(1 + value * ELEMENTS.gm2 / ELEMENTS.Cc, reach_s / 2e-9, quantile=1.96)
    verdict = replace(comparison.verdict, nulling=Nulling.UNDECIDED, zero_time_s=zero_time, gm2_rz=product)
    return replace(comparison, verdict=verdict)


def test_an_open_verdict_advises_no_change() -> None:
    figure = zero_path_figure(_undecided(0, 2e-9))
    assert figure is not None
    assert drawn(figure, "advice") == []
    assert not any("Rz by\n" in text for text in words_in(figure))
    assert len(drawn(_figure(0), "advice")) == 1


@pytest.mark.parametrize(
    "comparison",
    [*map(comparison_of, (0.0, 625.0, 900.0, 1300.0, 3000.0)), _undecided(625.0, 2e-9), _undecided(1300.0, 1e-9)],
)
def test_words_keep_clear_of_lines_and_of_each_other(comparison: Comparison) -> None:
    figure = zero_path_figure(comparison)
    assert figure is not None
    figure.draw_without_rendering()
    words = [text for text in drawn(figure, "words") if isinstance(text, Text)]
    assert len(words) >= 2
    path = figure.axes[0]
    level = next(line for line in path.lines if line.get_linestyle() == "--")
    (container,) = path.containers
    assert isinstance(container, ErrorbarContainer)
    bars = [segment for bar in container.lines[2] for segment in bar.get_segments()]
    for index, text in enumerate(words):
        assert covered(text, shown_points(drawn_lines(figure, "path")[0])) == 0
        assert covered(text, shown_points(level)) == 0
        for start, end in bars:
            share = np.linspace(0, 1, 300)[:, np.newaxis]
            assert covered(text, path.transData.transform(start + share * (np.asarray(end) - start))) == 0
        assert not any(text.get_window_extent().overlaps(other.get_window_extent()) for other in words[:index])
