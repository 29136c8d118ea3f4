"""Words find the nearest place where nothing is drawn."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.text import Text

from fitamp.plots.free_spot import Clutter, words_at
from fitamp.plots.style import drawing_style, new_figure, place_axes, text_width_in


def _axes() -> Axes:
    with drawing_style():
        axes = place_axes(new_figure(4.0), left=1.0, bottom=1.0, width=6.0, height=2.0)
    axes.set_xlim(0, 6)  # so that data are inches
    axes.set_ylim(0, 2)
    return axes


def test_words_keep_off_a_line_and_near_their_place() -> None:
    clutter = Clutter(_axes())
    clutter.add_line([0, 6], [1, 1])
    box = words_at(clutter, "phase margin", (3.0, 1.0))
    assert box[3] < 1 or box[1] > 1
    assert min(abs(box[1] - 1), abs(box[3] - 1)) < 0.2
    assert box[0] < 3 < box[2]


def test_words_take_the_size_that_they_are_drawn_with() -> None:
    axes = _axes()
    box = words_at(Clutter(axes), "two\nlines of words", (3.0, 1.0))
    (text,) = [artist for artist in axes.texts if isinstance(artist, Text)]
    drawn = text.get_window_extent().transformed(axes.transData.inverted())
    np.testing.assert_allclose([drawn.x0, drawn.x1], [box[0], box[2]], atol=0.02)
    assert drawn.y0 > box[1] - 0.03
    assert drawn.y1 < box[3] + 0.03
    assert box[2] - box[0] == text_width_in("lines of words")


def test_second_words_keep_off_the_first() -> None:
    clutter = Clutter(_axes())
    first, second = (words_at(clutter, "measured", (3.0, 1.0)) for _ in range(2))
    apart = first[2] < second[0] or second[2] < first[0] or first[3] < second[1] or second[3] < first[1]
    assert apart


def test_a_line_that_matters_less_is_crossed_where_the_way_round_is_long() -> None:
    for width_in, crosses in ((0.2, False), (2.0, True)):
        clutter = Clutter(_axes())
        for y in np.arange(1 - width_in / 2, 1 + width_in / 2, 0.02):
            clutter.add_line([0, 6], [y, y])
        clutter.hard, clutter.soft = [], [(np.concatenate(clutter.hard), 0.6)]
        box = words_at(clutter, "phase margin", (3.0, 1.0))
        assert (box[1] < 1 + width_in / 2 and 1 - width_in / 2 < box[3]) is crosses


def test_far_words_get_a_leader_to_their_place() -> None:
    axes = _axes()
    clutter = Clutter(axes)
    for y in np.arange(0.3, 2, 0.02):
        clutter.add_line([0, 6], [y, y])
    words_at(clutter, "zero", (3.0, 1.8))
    (leader,) = [line for line in axes.lines if line.get_gid() == "leader"]
    assert np.asarray(leader.get_ydata(orig=True))[0] == 0.9  # share of the height: 1.8 of 2 inches


def test_no_room_at_all_still_gives_a_place_inside() -> None:
    clutter = Clutter(_axes())
    for y in np.arange(0, 2, 0.02):
        clutter.add_line([0, 6], [y, y])
    box = words_at(clutter, "zero", (3.0, 1.0))
    assert box[0] >= 0
    assert box[1] >= 0
    assert box[2] <= 6
    assert box[3] <= 2
