"""Sweeps to choose from: frequencies, names, lists, what is usual, refusals."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose
from planned_parts import NOMINAL, OWN_SPREADS, added

from fitamp.design import Design, HalfPlane, Roots
from fitamp.errors import UsageError
from fitamp.planning import PlannedSweep, affordable_sweeps, usual_band_hz, usual_loads_f
from fitamp.planning.sweeps import averaged
from fitamp.sweep import NoiseLevels


def test_frequencies_rise_in_equal_steps_of_their_logarithm() -> None:
    freq_hz = PlannedSweep(f_min_hz=1e3, f_max_hz=1e6, points=7).freq_hz
    assert_allclose(freq_hz, [1e3, 3.1622777e3, 1e4, 3.1622777e4, 1e5, 3.1622777e5, 1e6], rtol=1e-7)


@pytest.mark.parametrize(
    ("sweep", "words"),
    [
        (added(), "nothing added"),
        (added(5.0), "+5 pF"),
        (added(0.0, -400.0), "−400 Ω"),
        (added(2.2, 1500.0), "+2.2 pF with +1.5 kΩ"),
    ],
)
def test_what_is_added_in_words(sweep: PlannedSweep, words: str) -> None:
    assert sweep.added == words
    assert sweep.band == "10 Hz to 100 MHz"


def test_the_list_is_every_load_with_every_resistance_in_every_band() -> None:
    sweeps = affordable_sweeps(
        OWN_SPREADS,
        loads_f=[0.0, 5e-12, 5e-12],
        resistances_ohm=[0.0, -400.0],
        bands_hz=[(10.0, 1e8), (1e3, 2e8)],
        points=50,
        averages=3,
    )
    assert len(sweeps) == len(set(sweeps)) == 8
    assert {(one.points, one.averages) for one in sweeps} == {(50, 3)}
    assert [one.added for one in sweeps[:4]] == ["nothing added", "+5 pF", "−400 Ω", "+5 pF with −400 Ω"]


def test_usual_loads_move_pole_2_and_the_usual_band_shows_it() -> None:
    # 4 pF and a probe's 2 pF at the output; poles by the polynomial at 1.08 kHz and 39.9 MHz.
    assert usual_loads_f(OWN_SPREADS) == (0.0, 5e-12, 10e-12, 20e-12)
    assert usual_band_hz(OWN_SPREADS) == (100.0, 200e6)
    assert [one.added for one in affordable_sweeps(OWN_SPREADS)] == ["nothing added", "+5 pF", "+10 pF", "+20 pF"]
    roots = Roots(dc_gain=12000, pole1_hz=1.1e3, pole2_hz=60e6, zero_hz=131e6, half_plane=HalfPlane.LEFT)
    assert usual_loads_f(Design.from_roots(roots)) == (0.0,)


def test_averages_lower_all_noise_by_their_root() -> None:
    noise = averaged(NoiseLevels(error_channel=4e-5, return_channel=2e-5, relative=1e-3, ratio=6e-6), 4)
    levels = (noise.error_channel, noise.return_channel, noise.relative, noise.ratio)
    assert levels == pytest.approx((2e-5, 1e-5, 5e-4, 3e-6))


@pytest.mark.parametrize(
    ("band_hz", "points", "averages", "message"),
    [
        ((0.0, 1e8), 281, 1, "a band must rise from above 0 Hz, but is 0 Hz to 100"),
        ((2e8, 1e8), 281, 1, r"a band must rise from above 0 Hz, but is 200\.0 MHz to 100\.0 MHz"),
        ((10.0, float("inf")), 281, 1, "a band must rise"),
        ((10.0, 1e8), 5, 1, "a sweep has 6 to 100000 points, but 5 are asked for"),
        ((10.0, 1e8), 281, 0, "a sweep is averaged once or more, but 0 is asked for"),
    ],
)
def test_a_sweep_that_cannot_be_taken_is_refused(
    band_hz: tuple[float, float], points: int, averages: int, message: str
) -> None:
    with pytest.raises(UsageError, match=message):
        PlannedSweep(f_min_hz=band_hz[0], f_max_hz=band_hz[1], points=points, averages=averages)


def test_too_many_sweeps_or_none_are_refused() -> None:
    with pytest.raises(UsageError, match="there are 0 sweeps to choose from"):
        affordable_sweeps(OWN_SPREADS, loads_f=[])
    with pytest.raises(UsageError, match=r"there are 300 sweeps to choose from, every load .* expected 1 to 200"):
        affordable_sweeps(OWN_SPREADS, loads_f=np.linspace(0, 1e-11, 100).tolist(), resistances_ohm=[0.0, 1.0, 2.0])
    with pytest.raises(UsageError, match="the added load must be 0 F or more"):
        affordable_sweeps(OWN_SPREADS, loads_f=[-1e-12])


def test_the_nominal_part_is_that_of_the_words() -> None:
    # Guards the numbers in the test of the usual band.
    poles = sorted(abs(pole) for pole in NOMINAL.with_changes(CL=6e-12).transfer().poles_hz)
    assert poles[:2] == pytest.approx([1.08e3, 39.9e6], rel=0.01)
