"""The head says the verdict, why, and what to do; nothing in any picture is cut off or lies on other words."""

from __future__ import annotations

from functools import lru_cache
from itertools import pairwise

import pytest
from drawn_parts import comparison_in_trouble, comparison_of, comparison_with_roots, fit_of_pair, words_in
from matplotlib.axis import Axis, Tick
from matplotlib.colors import to_hex
from matplotlib.figure import Figure
from matplotlib.text import Text

from fitamp.plots import comparison_figures, fit_figures
from fitamp.plots.style import COLOURS

FREE_PX = 3.0
PARTS = (0.0, 625.0, 900.0, 1300.0, 3000.0)


@lru_cache
def _pictures() -> tuple[Figure, ...]:
    """One of every kind, laid out."""
    figures = [
        *(figure for rz_ohm in PARTS for figure in comparison_figures(comparison_of(rz_ohm)).values()),
        *comparison_figures(comparison_with_roots()).values(),
        *comparison_figures(comparison_in_trouble()).values(),
        *fit_figures(comparison_in_trouble().fit).values(),
        *fit_figures(fit_of_pair()).values(),
        *fit_figures(comparison_of(0).fit).values(),
    ]
    for figure in figures:
        figure.draw_without_rendering()
    return tuple(figures)


def _visible(texts: list[Text]) -> list[Text]:
    return [text for text in texts if text.get_visible() and text.get_text()]


@pytest.mark.parametrize("rz_ohm", PARTS)
def test_verdict_reason_and_advice_stand_above_every_picture(rz_ohm: float) -> None:
    comparison = comparison_of(rz_ohm)
    for figure in comparison_figures(comparison).values():
        words = words_in(figure)
        assert comparison.verdict.nulling.value.upper() in words
        together = " ".join(words).lower()
        assert comparison.verdict.reason.lower() in together
        assert comparison.advice.sentence.lower() in together


def test_a_fit_is_headed_by_its_file() -> None:
    assert "bench7.csv" in words_in(fit_figures(comparison_of(0).fit)["loop"])


def test_broken_limits_stand_beside_the_verdict() -> None:
    comparison = comparison_in_trouble()
    assert set(comparison.broken_limits) == {"crossover_hz", "phase_margin_deg", "pole2_hz"}
    for figure in comparison_figures(comparison).values():
        (tag,) = [text for text in figure.texts if text.get_text().startswith("LIMITS BROKEN: ")]
        assert set(tag.get_text().removeprefix("LIMITS BROKEN: ").split(", ")) == {
            "pole 2",
            "crossover",
            "phase margin",
        }
        frame = tag.get_bbox_patch()
        assert frame is not None
        assert to_hex(frame.get_edgecolor()).upper() == COLOURS["bad"]
    assert not any("BROKEN" in text for text in words_in(comparison_figures(comparison_of(1300))["loop"]))


def test_a_model_that_does_not_fit_is_said_above_every_picture() -> None:
    comparison = comparison_in_trouble()
    for figure in (*comparison_figures(comparison).values(), *fit_figures(comparison.fit).values()):
        assert "MODEL DOES NOT FIT" in words_in(figure)
    for figure in comparison_figures(comparison_of(1300)).values():
        assert "MODEL DOES NOT FIT" not in words_in(figure)


def test_words_of_the_head_do_not_overlap() -> None:
    for figure in _pictures():
        boxes = [(text, text.get_window_extent()) for text in figure.texts]
        for index, (text, box) in enumerate(boxes):
            for other, other_box in boxes[:index]:
                assert not box.overlaps(other_box), (text.get_text(), other.get_text())


def test_no_words_are_cut_off_by_the_edge_of_a_picture() -> None:
    for figure in _pictures():
        width, height = figure.get_size_inches() * figure.dpi
        ticks = {id(text) for tick in figure.findobj(Tick) for text in tick.findobj(Text)}
        words = [text for text in figure.findobj(Text) if isinstance(text, Text) and id(text) not in ticks]
        words += [label for axis in _axes_of(figure) for label in _shown_labels(axis)]
        for text in _visible(words):
            box = text.get_window_extent()
            assert box.x0 >= FREE_PX, text.get_text()
            assert box.y0 >= FREE_PX, text.get_text()
            assert box.x1 <= width - FREE_PX, text.get_text()
            assert box.y1 <= height - FREE_PX, text.get_text()


def test_tick_labels_do_not_overlap() -> None:
    for figure in _pictures():
        for axis in _axes_of(figure):
            boxes = [text.get_window_extent() for text in _shown_labels(axis)]
            for first, second in pairwise(boxes):
                assert not first.overlaps(second)


def _axes_of(figure: Figure) -> list[Axis]:
    return [axis for axes in figure.axes for axis in (axes.xaxis, axes.yaxis)]


def _shown_labels(axis: Axis) -> list[Text]:
    low, high = sorted(axis.get_view_interval())
    labels = zip(axis.get_ticklocs(), axis.get_ticklabels(), strict=False)
    return _visible([label for place, label in labels if low <= place <= high])
