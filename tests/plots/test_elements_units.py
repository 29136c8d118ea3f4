"""Axes in one multiple of a unit: plain numbers at the ticks, the multiple in the label."""

from __future__ import annotations

import pytest

from fitamp.plots.elements_units import in_multiples
from fitamp.plots.style import new_figure, place_axes


@pytest.mark.parametrize(
    ("limits", "unit", "label", "tick", "words"),
    [
        ((0.0, 15e-12), "F", "load (pF)", 5e-12, "5"),
        ((-0.4e-9, 1.2e-9), "s", "load (ns)", -0.25e-9, "−0.25"),
        ((0.0, 2600.0), "Ω", "load (kΩ)", 1300.0, "1.3"),
        ((20e6, 45e6), "Hz", "load (MHz)", 30e6, "30"),
        ((0.0, 90.0), "deg", "load (°)", 60.0, "60"),
        ((0.0, 0.04), "%", "load (%)", 0.0, "0"),
    ],
)
def test_the_larger_end_decides_the_multiple(
    limits: tuple[float, float], unit: str, label: str, tick: float, words: str
) -> None:
    axes = place_axes(new_figure(3.0), left=1.0, bottom=1.0, width=4.0, height=1.5)
    axes.set_xlim(*limits)
    in_multiples(axes.xaxis, unit, "load")
    assert axes.get_xlabel() == label
    assert axes.xaxis.get_major_formatter()(tick, 0) == words
