"""Figures of a neighbour by one Newton step: differences of them are differences of figures found anew."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import astuple, replace

import pytest

from fitamp.margins import closed_loop_step, margins
from fitamp.transfer import Transfer
from fitamp.vicinity import Figures, Vicinity

# All invented: two poles and a zero on either side, a pair near the axis, a mirror's doublet with a delay.
LOOPS = {
    "left": Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6), zeros_hz=(-110e6,)),
    "right": Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6), zeros_hz=(110e6,)),
    "little margin": Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -6e6, -40e6)),
    "pair": Transfer(dc_gain=1e3, poles_hz=(-1e4, complex(-4e6, 2e7), complex(-4e6, -2e7)), zeros_hz=(-3e8,)),
    "delay": Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -58e6, -90e6), zeros_hz=(-180e6,), delay_s=2e-9),
    "no crossover": Transfer(dc_gain=0.5, poles_hz=(-1e4, -1e6)),
}
CHANGES: dict[str, Callable[[Transfer, float], Transfer]] = {
    "gain": lambda loop, step: replace(loop, dc_gain=loop.dc_gain * math.exp(step)),
    "last pole": lambda loop, step: replace(loop, poles_hz=_spread(loop.poles_hz, step)),
    "all roots": lambda loop, step: replace(
        loop,
        poles_hz=tuple(pole * math.exp(step) for pole in loop.poles_hz),
        zeros_hz=tuple(zero * math.exp(-step) for zero in loop.zeros_hz),
    ),
}
STEP = 1e-5


def _spread(poles_hz: tuple[complex, ...], step: float) -> tuple[complex, ...]:
    """The farthest pole, or pair, moved."""
    far = abs(poles_hz[-1])
    return tuple(pole * math.exp(step) if abs(pole) > 0.999 * far else pole for pole in poles_hz)


def found_anew(loop: Transfer) -> Figures:
    seen, step = margins(loop), closed_loop_step(loop)
    return Figures(
        crossover_hz=seen.crossover_hz,
        phase_margin_deg=seen.phase_margin_deg,
        gain_margin_db=seen.gain_margin_db,
        overshoot=step.overshoot,
        settling_s=step.settling_s,
    )


@pytest.mark.parametrize("change", CHANGES)
@pytest.mark.parametrize("name", LOOPS)
def test_differences_are_those_of_figures_found_anew(name: str, change: str) -> None:
    loop, moved = LOOPS[name], CHANGES[change]
    vicinity = Vicinity(response=loop)
    near, anew = (
        [astuple(figures(moved(loop, sign * STEP))) for sign in (1, -1)] for figures in (vicinity.figures, found_anew)
    )
    for found, expected, here in zip(
        zip(*near, strict=True), zip(*anew, strict=True), astuple(found_anew(loop)), strict=True
    ):
        if here is None:
            assert found == expected == (None, None)
        else:
            slope, true_slope = ((pair[0] - pair[1]) / (2 * STEP) for pair in (found, expected))
            assert slope == pytest.approx(true_slope, rel=2e-5, abs=1e-6 * abs(here) + 1e-9)


@pytest.mark.parametrize("name", LOOPS)
def test_the_loop_itself_has_its_own_figures(name: str) -> None:
    loop = LOOPS[name]
    for near, own in zip(astuple(Vicinity(response=loop).figures(loop)), astuple(found_anew(loop)), strict=True):
        assert near == (None if own is None else pytest.approx(own, rel=1e-12, abs=1e-12))


def test_an_unstable_loop_has_margins_and_no_step() -> None:
    loop = Transfer(dc_gain=12600.0, poles_hz=(-1.2e3, -2e6, -4e6))
    figures = Vicinity(response=loop).figures(replace(loop, dc_gain=12601.0))
    assert figures.phase_margin_deg is not None
    assert figures.phase_margin_deg < 0
    assert figures.overshoot is None
    assert figures.settling_s is None
