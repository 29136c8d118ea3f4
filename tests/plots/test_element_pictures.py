"""Pictures of estimated elements: what they show is what was estimated, and no words lie on data or on other words."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache
from itertools import pairwise

import numpy as np
import pytest
from drawn_parts import covered, drawn, drawn_lines, shown_points, words_in, x_of, y_of
from estimated_parts import AWKWARD_PARTS, awkward_findings
from matplotlib.axis import Axis, Tick
from matplotlib.colors import to_hex
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.text import Text

from fitamp.findings import ElementFindings
from fitamp.plots.elements import blame_figure, element_figures, lines_figure, values_figure, whatif_figure
from fitamp.plots.style import COLOURS
from fitamp.report.elements_words import is_told, moved_sentence

FREE_PX = 3.0


@lru_cache
def _awkward(name: str) -> dict[str, Figure]:
    """All pictures of a part, laid out."""
    figures = element_figures(awkward_findings(name))
    for figure in figures.values():
        figure.draw_without_rendering()
    return figures


def _drawn(figure: Figure | None) -> Figure:
    assert figure is not None
    figure.draw_without_rendering()
    return figure


def _axes_of(figure: Figure) -> list[Axis]:
    return [axis for axes in figure.axes for axis in (axes.xaxis, axes.yaxis)]


def _shown_labels(axis: Axis) -> list[Text]:
    low, high = sorted(axis.get_view_interval())
    labels = zip(axis.get_ticklocs(), axis.get_ticklabels(), strict=False)
    return [label for place, label in labels if low <= place <= high and label.get_visible() and label.get_text()]


def _words(figure: Figure) -> list[Text]:
    """All visible words, tick labels outside of the axes' range not among them."""
    ticks = {id(text) for tick in figure.findobj(Tick) for text in tick.findobj(Text)}
    words = [text for text in figure.findobj(Text) if isinstance(text, Text) and id(text) not in ticks]
    words += [label for axis in _axes_of(figure) for label in _shown_labels(axis)]
    return [text for text in words if text.get_visible() and text.get_text().strip()]


# All pictures


@pytest.mark.parametrize("name", AWKWARD_PARTS)
def test_no_words_are_cut_off_or_lie_on_other_words(name: str) -> None:
    for picture, figure in _awkward(name).items():
        width, height = figure.get_size_inches() * figure.dpi
        boxes = [(text, text.get_window_extent()) for text in _words(figure)]
        for index, (text, box) in enumerate(boxes):
            assert box.x0 >= FREE_PX, (picture, text.get_text())
            assert box.y0 >= FREE_PX, (picture, text.get_text())
            assert box.x1 <= width - FREE_PX, (picture, text.get_text())
            assert box.y1 <= height - FREE_PX, (picture, text.get_text())
            for other, other_box in boxes[:index]:
                assert not box.overlaps(other_box), (picture, text.get_text(), other.get_text())


def test_verdict_message_and_advice_stand_above_every_picture(stepped_example: ElementFindings) -> None:
    for figure in element_figures(stepped_example).values():
        together = " ".join(words_in(figure))
        assert "TOO-LITTLE" in together
        assert "LIMIT BROKEN: pole 2" in together
        assert stepped_example.advice.sentence in together


def test_what_is_not_to_be_trusted_is_framed_above_every_picture() -> None:
    for figure in _awkward("inadequate").values():
        assert {"UNDECIDED", "A SWEEP STANDS APART", "CIRCUIT DOES NOT FIT"} <= set(words_in(figure))
    for figure in _awkward("single").values():
        assert not any("CIRCUIT" in words for words in words_in(figure))


def test_names_from_files_are_drawn_inert() -> None:
    for figure in _awkward("hostile name").values():
        words = words_in(figure)
        assert all(character.isprintable() for text in words for character in text.replace("\n", ""))
        assert any("$x_1$" in text for text in words)


# Elements


def _marker(figure: Figure, name: str) -> Line2D:
    """The dot of an element."""
    return next(line for line in drawn_lines(figure, f"estimate {name}") if line.get_marker() in {"o", "D"})


def test_every_element_stands_at_its_deviation(stepped_example: ElementFindings) -> None:
    figure = values_figure(stepped_example)
    for one in (*stepped_example.estimate.elements, *stepped_example.estimate.bench):
        marker = _marker(figure, one.name)
        assert x_of(marker)[0] == pytest.approx(one.deviation)
        # A prior handed back is hollow, whatever its colour.
        assert (marker.get_marker() == "o") is is_told(one)
        assert (str(marker.get_markerfacecolor()) == "white") is not is_told(one)
    assert to_hex(_marker(figure, "gm2").get_color()).upper() == COLOURS["bad"]
    assert to_hex(_marker(figure, "gm1").get_color()).upper() == COLOURS["fitted"]
    assert to_hex(_marker(figure, "bench_load_f").get_color()).upper() == COLOURS["open"]


def test_the_bar_behind_is_the_designs_own_95_percent(stepped_example: ElementFindings) -> None:
    figure = values_figure(stepped_example)
    (gm2,) = drawn(figure, "prior gm2")
    assert isinstance(gm2, Rectangle)
    # 8 % in the design file.
    assert gm2.get_x() + gm2.get_width() == pytest.approx(1.96 * 0.08)
    (delay,) = drawn(figure, "prior bench_delay_s")
    assert isinstance(delay, Rectangle)
    assert delay.get_width() == pytest.approx(2 * 1.96 * 0.02 / 0.4)
    assert drawn(figure, "prior Rz") == []  # under test


def test_shares_stand_beside_and_the_message_above(stepped_example: ElementFindings) -> None:
    figure = values_figure(stepped_example)
    (share,) = drawn(figure, "share bench_load_f")
    assert isinstance(share, Text)
    assert share.get_text().endswith("MOSTLY DESIGN")
    message = moved_sentence(stepped_example)
    assert f"{message[0].upper()}{message[1:]}." in words_in(figure)
    notes = [text.get_text() for text in drawn(figure, "note") if isinstance(text, Text)]
    assert len(notes) == 2
    assert notes[0].startswith("Parasitic load 6.8")


def test_an_element_far_off_is_an_arrow_at_the_edge() -> None:
    figure = _awkward("far off")["elements"]
    (arrow,) = drawn_lines(figure, "beyond CL")
    assert arrow.get_marker() == ">"
    assert x_of(arrow)[0] == figure.axes[0].get_xlim()[1]
    assert drawn(figure, "estimate CL") == []


# Blame


def test_bars_lead_from_designed_to_estimated(stepped_example: ElementFindings) -> None:
    figure = _drawn(blame_figure(stepped_example))
    assert len(figure.axes) == 3
    for axes, quantity in zip(figure.axes, ("zero_time_s", "pole2_hz", "phase_margin_deg"), strict=True):
        one = next(one for one in stepped_example.blame.quantities if one.quantity.value == quantity)
        bars = [patch for patch in axes.patches if str(patch.get_gid()).startswith("share ")]
        at = one.designed
        for bar in bars:
            assert isinstance(bar, Rectangle)
            assert bar.get_x() == pytest.approx(at)
            at += bar.get_width()
        # What is too small to be seen is not drawn.
        assert at == pytest.approx(one.estimated, abs=0.01 * abs(one.estimated - one.designed))
        designed, estimated = (
            next(line for line in axes.lines if line.get_gid() == name) for name in ("designed", "estimated")
        )
        assert (x_of(designed)[0], x_of(estimated)[0]) == (one.designed, one.estimated)


def test_a_share_of_what_the_design_handed_back_is_hatched(stepped_example: ElementFindings) -> None:
    figure = _drawn(blame_figure(stepped_example))
    hatches = {
        name: {bar.get_hatch() for bar in drawn(figure, f"share {name}") if isinstance(bar, Rectangle)}
        for name in ("gm2", "CL", "bench_load_f")
    }
    assert hatches == {"gm2": {None}, "CL": {None}, "bench_load_f": {"////"}}


def test_limits_lie_behind_the_bars(stepped_example: ElementFindings) -> None:
    figure = _drawn(blame_figure(stepped_example))
    (limits,) = [patch for patch in figure.axes[1].patches if patch.get_gid() == "limits"]
    assert isinstance(limits, Rectangle)
    assert limits.get_x() == pytest.approx(30e6)  # the least pole 2 that the design file allows


# Lines


def test_lines_have_points_band_and_the_joint_fit_beside(stepped_example: ElementFindings) -> None:
    figure = _drawn(lines_figure(stepped_example))
    above, below = figure.axes[1], figure.axes[0]
    line = stepped_example.lines[0]
    points = next(one for one in above.lines if one.get_gid() == "points" and one.get_marker() == "o")
    np.testing.assert_allclose(x_of(points), line.x)
    np.testing.assert_allclose(y_of(points), line.y)
    (joint,) = [one for one in above.lines if one.get_gid() == "joint"]
    np.testing.assert_allclose(y_of(joint), line.joint.at(x_of(joint)))
    (meeting,) = [one for one in above.lines if one.get_gid() == "meeting"]
    # Drawn on to 0: 4.84 pF of chip and pad and 2.03 pF of probe, and C1 and Cc in series, about 0.2 pF.
    assert x_of(meeting)[0] == pytest.approx(-7.07e-12, rel=0.01)
    away = next(one for one in below.lines if one.get_gid() == "points" and one.get_marker() == "o")
    np.testing.assert_allclose(y_of(away), line.y - line.line.at(line.x))
    words = words_in(figure)
    assert any(text.startswith("slope Cc = 1.85") for text in words)
    assert any("so much load is there" in text for text in words)


def test_without_steps_there_are_no_lines() -> None:
    assert lines_figure(awkward_findings("single")) is None
    assert "lines" not in _awkward("single")
    assert len(_awkward("hostile name")["lines"].axes) == 2


@pytest.mark.parametrize("name", ["hostile name", "far off", "another part"])
def test_words_of_lines_keep_clear_of_line_and_points(name: str) -> None:
    figure = _awkward(name)["lines"]
    for axes in figure.axes:
        words = [text for text in axes.texts if text.get_gid() == "words"]
        for line in (one for one in axes.lines if one.get_gid() in {"line", "drawn on", "points", "meeting"}):
            assert all(covered(text, shown_points(line)) == 0 for text in words)


# What if


def test_curves_are_the_predictions_and_places_lie_on_them(stepped_example: ElementFindings) -> None:
    figure = _drawn(whatif_figure(stepped_example))
    assert len(figure.axes) == 6
    over = stepped_example.over_load
    assert over is not None
    margin = figure.axes[2]
    (curve,) = [line for line in margin.lines if line.get_gid() == "estimated"]
    np.testing.assert_array_equal(y_of(curve), over.phase_margin_deg.value)
    (here,) = [line for line in margin.lines if line.get_gid() == "here"]
    assert x_of(here)[0] == over.estimated_at
    found = stepped_example.estimate.derived.phase_margin_deg.value
    assert y_of(here)[0] == pytest.approx(found)
    (designed,) = [line for line in margin.lines if line.get_gid() == "as designed"]
    # 4 pF of chip and the probe's 2 pF.
    assert x_of(designed)[0] == pytest.approx(6e-12)
    assert str(designed.get_markerfacecolor()) == "white"


def test_the_stretch_that_keeps_the_margin_is_shown_with_its_end(stepped_example: ElementFindings) -> None:
    figure = _drawn(whatif_figure(stepped_example))
    loads, resistors = stepped_example.loads, stepped_example.resistors
    assert loads is not None
    assert loads.high_f is not None
    assert resistors is not None
    left, right = figure.axes[2], figure.axes[5]
    (kept,) = [patch for patch in left.patches if patch.get_gid() == "kept"]
    assert isinstance(kept, Rectangle)
    assert kept.get_x() + kept.get_width() == pytest.approx(loads.high_f.value)
    (kept,) = [patch for patch in right.patches if patch.get_gid() == "kept"]
    assert isinstance(kept, Rectangle)
    assert kept.get_x() == pytest.approx(resistors.low_ohm)
    (wanted,) = [line for line in left.lines if line.get_gid() == "wanted"]
    assert y_of(wanted)[0] == 65
    words = words_in(figure)
    assert "kept up to\n8.42 pF" in words
    assert "designed zero\nback at 1.40 kΩ: 71.3°" in words


def test_a_zero_in_its_place_needs_no_restoring() -> None:
    assert not any("designed zero\nback" in words for words in words_in(_awkward("single")["what-if"]))


def test_without_curves_or_crossover_nothing_is_invented() -> None:
    findings = awkward_findings("no crossover")
    figure = _awkward("no crossover")["what-if"]
    assert words_in(figure).count("no crossover") == 2
    assert whatif_figure(replace(findings, over_load=None)) is None


@pytest.mark.parametrize("name", AWKWARD_PARTS)
def test_words_of_the_margin_keep_clear_of_curves(name: str) -> None:
    figure = _awkward(name)["what-if"]
    for axes in (figure.axes[2], figure.axes[5]):
        words = [text for text in axes.texts if text.get_gid() == "words"]
        for line in (one for one in axes.lines if one.get_gid() in {"estimated", "designed", "wanted"}):
            # Without a crossover there is no curve.
            points = shown_points(line) if np.isfinite(y_of(line)).all() else np.empty((0, 2))
            assert all(covered(text, points) == 0 for text in words), name


def test_tick_labels_are_apart() -> None:
    for name in AWKWARD_PARTS:
        for figure in _awkward(name).values():
            for axis in _axes_of(figure):
                boxes = [text.get_window_extent() for text in _shown_labels(axis)]
                assert not any(first.overlaps(second) for first, second in pairwise(boxes))
