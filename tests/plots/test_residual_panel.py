"""The residuals' panel points at the stretches of the band that the title names."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import comparison_in_trouble, comparison_of, drawn
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle
from matplotlib.text import Text

from fitamp.fitting import LoopFit
from fitamp.plots import loop_figure


def misfitting(*where_hz: tuple[float, float]) -> LoopFit:
    """A fit whose residuals are said to be too large in these stretches."""
    fit = comparison_in_trouble().fit
    return replace(fit, adequacy=replace(fit.adequacy, where_hz=where_hz))


def spans_of(figure: Figure) -> list[tuple[float, float]]:
    spans = [span for span in drawn(figure, "misfit") if isinstance(span, Rectangle)]
    return [(span.get_x(), span.get_x() + span.get_width()) for span in spans]


@pytest.mark.parametrize("stretch", [(12e6, 60e6), (10.0, 1e3), (1e6, 1e8)])
def test_a_stretch_is_tinted_from_end_to_end(stretch: tuple[float, float]) -> None:
    fit = misfitting(stretch)
    figure = loop_figure(fit)
    (span,) = spans_of(figure)
    assert span == pytest.approx(stretch, rel=0.1)
    assert " ".join(figure.axes[0].get_title(loc="left").split()).count("mostly between") == 1


def test_one_point_is_still_seen() -> None:
    figure = loop_figure(misfitting((3e6, 3e6)))
    ((start, end),) = spans_of(figure)
    low, high = figure.axes[0].get_xlim()
    width_px = figure.axes[0].bbox.width * np.log(end / start) / np.log(high / low)
    assert width_px > 5
    assert "mostly around 3.0 MHz" in " ".join(figure.axes[0].get_title(loc="left").split())


@pytest.mark.parametrize("where_hz", [((12e6, 60e6),), ((10.0, 12.0),), ((9e7, 1e8),), ((1e3, 1.2e3), (2e6, 3e6))])
def test_words_stand_between_title_and_panel_within_its_width(where_hz: tuple[tuple[float, float], ...]) -> None:
    figure = loop_figure(misfitting(*where_hz))
    figure.draw_without_rendering()
    axes = figure.axes[0]
    words = [text for text in drawn(figure, "misfit words") if isinstance(text, Text)]
    assert len(words) == len(where_hz)
    title = next(
        text for text in axes.findobj(Text) if isinstance(text, Text) and text.get_text().startswith("residuals: ")
    )
    for text in words:
        box = text.get_window_extent()
        assert "here" in text.get_text()
        assert axes.bbox.y1 <= box.y0
        assert box.y1 <= title.get_window_extent().y0
        assert axes.bbox.x0 - 1 <= box.x0
        assert box.x1 <= axes.bbox.x1 + 1
    # Nor does the title reach into the panel above.
    assert title.get_window_extent().y1 <= figure.axes[1].bbox.y0


@pytest.mark.parametrize("fit", [comparison_of(1300).fit, misfitting()], ids=["adequate", "throughout"])
def test_without_a_stretch_nothing_is_tinted(fit: LoopFit) -> None:
    figure = loop_figure(fit)
    assert spans_of(figure) == []
    assert drawn(figure, "misfit words") == []


def test_a_huge_residual_is_told_in_plain_digits() -> None:
    fit = misfitting((12e6, 60e6))
    rows = fit.solution.optimum.residuals * 1e4 / np.abs(fit.residuals()).max()
    solution = replace(fit.solution, optimum=replace(fit.solution.optimum, residuals=rows))
    title = loop_figure(replace(fit, solution=solution)).axes[0].get_title(loc="left")
    assert "largest magnitude 10000 σ" in " ".join(title.split())
