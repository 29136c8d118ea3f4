"""The picture of a plan: a line an element, priors hollow, sweeps named, labels that keep apart."""

from __future__ import annotations

from functools import lru_cache
from itertools import pairwise

import numpy as np
import pytest
from drawn_parts import ELEMENTS, drawn, drawn_lines, words_in, x_of, y_of
from matplotlib.figure import Figure
from matplotlib.text import Text

from fitamp.design import Bench, Design
from fitamp.planning import Plan, Wanted, affordable_sweeps, plan
from fitamp.plots.plan import plan_figure

NAMES = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
SPREADS = {"gm1": 0.08, "R1": 0.15, "C1": 0.1, "gm2": 0.08, "R2": 0.15, "CL": 0.05, "Cc": 0.06}


@lru_cache
def _plan(count: int = 3, *, rz_ohm: float = 1300.0, wanted: bool = False, bands: bool = False) -> Plan:
    elements = ELEMENTS.with_changes(Rz=rz_ohm)
    design = Design.from_elements(elements, spreads=SPREADS, bench=Bench(load_f=2e-12, load_spread=0.05))
    narrow, wide = (
        affordable_sweeps(
            design, loads_f=(0.0, 5e-12, 20e-12), resistances_ohm=(0.0, 400.0, 500.0), bands_hz=[(low_hz, 2e8)]
        )
        for low_hz in (1e3, 10.0)
    )
    listed = (*narrow[:3], *wide[3:6]) if bands else narrow
    wishes = [Wanted(name="gm2", relative=0.01), Wanted(name="zero_time_s", absolute=1e-12)] if wanted else []
    return plan(design, listed, count=count, wanted=wishes, parts_drawn=0)


def _figure(found: Plan) -> Figure:
    figure = plan_figure(found)
    figure.draw_without_rendering()
    return figure


def test_each_element_has_a_line_of_its_shares() -> None:
    found = _plan()
    figure = _figure(found)
    for name in NAMES:
        (line,) = drawn_lines(figure, f"line {name}")
        shares = [stage.of(name).relative for stage in found.stages]
        known = [(number, share) for number, share in enumerate(shares) if share is not None]
        np.testing.assert_allclose(np.stack([x_of(line), y_of(line)], axis=1), known)
    assert figure.axes[0].get_yscale() == "log"


def test_priors_are_hollow_at_the_left_and_missing_for_what_is_under_test() -> None:
    figure = _figure(_plan())
    for name in NAMES:
        priors = drawn_lines(figure, f"prior {name}")
        if name == "Rz":
            assert priors == []
            continue
        (prior,) = priors
        assert prior.get_markerfacecolor() == "white"
        assert (x_of(prior)[0], y_of(prior)[0]) == (0, pytest.approx(SPREADS[name]))
        assert all(point.get_markerfacecolor() != "white" for point in drawn_lines(figure, f"point {name}"))
    assert "hollow: known by the design's spreads; Rz: nothing, under test" in words_in(figure)


def test_sweeps_are_named_along_the_axis() -> None:
    found = _plan()
    ticks = [tick.get_text() for tick in _figure(found).axes[0].get_xticklabels()]
    assert ticks[:2] == ["design\nalone", "1\nnothing\nadded"]
    assert ticks[2:] == [
        f"{number}\n{sweep.added.replace(' with ', chr(10))}" for number, sweep in enumerate(found.sweeps[1:], start=2)
    ]
    with_bands = [tick.get_text() for tick in _figure(_plan(6, bands=True)).axes[0].get_xticklabels()]
    assert all("Hz\nto " in tick for tick in with_bands[1:])


def test_the_head_is_the_answer_and_the_verdict() -> None:
    head = " ".join(text.get_text() for text in drawn(_figure(_plan()), "head") if isinstance(text, Text))
    assert head.startswith("3 sweeps, nothing added, ")
    assert "Verdict: zero time 1.2150 ±" in head


def test_wishes_are_stars() -> None:
    figure = _figure(_plan(wanted=True))
    (star,) = drawn_lines(figure, "wanted gm2")
    assert (x_of(star)[0], y_of(star)[0]) == (3, pytest.approx(0.01))
    assert any("(★ 1.0 %)" in words for words in words_in(figure))
    assert any(words.endswith("★ wanted") for words in words_in(figure))


@pytest.mark.parametrize(
    "found", [_plan(1), _plan(), _plan(9), _plan(wanted=True), _plan(rz_ohm=0.0), _plan(6, bands=True)]
)
def test_names_keep_apart_and_inside_the_picture(found: Plan) -> None:
    figure = _figure(found)
    names = [text for text in drawn(figure, "name") if isinstance(text, Text)]
    assert len(names) == len(NAMES)
    boxes = sorted((Text.get_window_extent(text) for text in names), key=lambda box: box.y0)
    assert all(lower.y1 <= upper.y0 + 1 for lower, upper in pairwise(boxes))
    width, height = figure.get_size_inches() * figure.dpi
    axes = figure.axes[0]
    shown = [text for gid in ("name", "head", "key") for text in drawn(figure, gid)]
    for text in [*shown, *axes.get_xticklabels(), axes.xaxis.label, axes.yaxis.label]:
        assert isinstance(text, Text)
        box = Text.get_window_extent(text)
        assert 0 <= box.x0 <= box.x1 <= width
        assert 0 <= box.y0 <= box.y1 <= height
    assert sum(axes.get_ylim()[0] < tick < axes.get_ylim()[1] for tick in axes.get_yticks()) >= 2
    ticks = [tick.get_window_extent() for tick in figure.axes[0].get_xticklabels()]
    assert not any(left.overlaps(right) for left, right in pairwise(ticks))


def test_a_resistor_of_zero_is_drawn_as_a_share_of_what_would_matter() -> None:
    found = _plan(rz_ohm=0.0)
    (line,) = drawn_lines(_figure(found), "line Rz")
    sd = found.last.of("Rz").sd
    assert sd is not None
    assert y_of(line)[-1] == pytest.approx(sd * ELEMENTS.gm2)
