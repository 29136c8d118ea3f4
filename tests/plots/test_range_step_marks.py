"""A step of a receiver's range is a line through the panels with its size beside it."""

from __future__ import annotations

from dataclasses import replace

import pytest
from drawn_parts import comparison_of, covered, drawn, drawn_lines, shown_points, x_of
from matplotlib.text import Text

from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit
from fitamp.fitting.result import FittedStep
from fitamp.plots import loop_figure
from fitamp.plots.loop_steps import step_words


def step(f_hz: float, db: float, deg: float = 0.0) -> FittedStep:
    """A step with errors of 0.002 dB and 0.01°."""
    return FittedStep(
        f_hz=f_hz,
        size_db=Estimate.gaussian(db, 0.002, quantile=1.96),
        turn_deg=Estimate.gaussian(deg, 0.01, quantile=1.96),
    )


def stepped(*steps: FittedStep) -> LoopFit:
    return replace(comparison_of(1300).fit, range_steps=steps)


@pytest.mark.parametrize(
    ("db", "deg", "words"),
    [
        (0.1738, 0.0, "range step at 3.07 MHz: +0.174 dB"),
        (-0.3521, 1.146, "range step at 3.07 MHz: −0.352 dB, +1.15°"),
        (0.1, -0.019, "range step at 3.07 MHz: +0.100 dB"),
        (0.0, -2.0, "range step at 3.07 MHz: +0.000 dB, −2.00°"),
    ],
)
def test_words_say_where_and_how_large_and_a_turn_only_where_there_is_one(db: float, deg: float, words: str) -> None:
    assert step_words(step(3.073e6, db, deg)) == words


def test_each_step_is_a_line_in_the_panels_of_data_and_residuals() -> None:
    figure = loop_figure(stepped(step(3e5, -0.35, 1.15), step(8e6, 0.26)))
    lines = drawn_lines(figure, "range step")
    assert sorted(x_of(line)[0] for line in lines) == [3e5, 3e5, 3e5, 8e6, 8e6, 8e6]
    marked = [number for number, axes in enumerate(figure.axes) if any(line.axes is axes for line in lines)]
    assert marked == [0, 2, 3]


@pytest.mark.parametrize("places", [(3e5, 8e6), (1e3, 2e3), (5e7, 9e7)])
def test_words_stand_in_the_panel_clear_of_the_data_and_of_each_other(places: tuple[float, float]) -> None:
    figure = loop_figure(stepped(*(step(place, 0.2, 1.0) for place in places)))
    figure.draw_without_rendering()
    words = [text for text in drawn(figure, "range step words") if isinstance(text, Text)]
    assert len(words) == 2
    magnitude = figure.axes[3]
    curves = [line for line in magnitude.lines if line.get_gid() in {"measured", "fitted", "crossover"}]
    for text in words:
        box = text.get_window_extent()
        assert magnitude.bbox.x0 <= box.x0
        assert box.x1 <= magnitude.bbox.x1
        assert sum(covered(text, shown_points(line)) for line in curves) == 0
    assert not words[0].get_window_extent().overlaps(words[1].get_window_extent())


def test_without_a_step_nothing_is_marked() -> None:
    assert drawn(loop_figure(stepped()), "range step") == []
