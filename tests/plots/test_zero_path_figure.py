"""The path of the zero over the nulling resistor."""

from __future__ import annotations

import re

import numpy as np
import pytest
from drawn_parts import ELEMENTS, comparison_of, comparison_with_roots, drawn, drawn_lines, words_in, x_of, y_of
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle

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
