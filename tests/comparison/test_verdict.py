"""The verdict on the nulling resistor: its window, its regions, and that every answer can be reached."""

from __future__ import annotations

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from simulated_parts import BENCH, DESIGN, NOMINAL, SPREADS, measured

from fitamp.comparison import Nulling, Verdict, compare
from fitamp.comparison.expectation import fit_with_design
from fitamp.comparison.verdict import judge_nulling, regions_of, window_of
from fitamp.design import Bench, Design, HalfPlane, Limit, Roots
from fitamp.estimate import NOT_KNOWN, Estimate, Known
from fitamp.fitting import LoopFit

TWO_PI = 2 * math.pi
LIMITS = {"zero_hz": Limit(low=90e6, high=200e6)}
LEFT_ROOTS = Roots(dc_gain=1e4, pole1_hz=1e3, pole2_hz=50e6, zero_hz=120e6, half_plane=HalfPlane.LEFT)
SMALL_S = 0.1 * NOMINAL.Cc / NOMINAL.gm2


@pytest.fixture(scope="module")
def healthy() -> LoopFit:
    return fit_with_design(measured(NOMINAL, 31), DESIGN)


def verdict_on(fit: LoopFit, design: Design, zero_time: Estimate) -> Verdict:
    """The verdict of a fit whose zero time is `zero_time`."""
    return judge_nulling(replace(fit, parameters=replace(fit.parameters, zero_time_s=zero_time)), design)


def interval(low: float, high: float) -> Estimate:
    """Measured in the middle of an interval."""
    return Estimate(value=(low + high) / 2, stderr=(high - low) / 3.92, ci95=(low, high))


# Window


def test_limits_on_the_zero_become_zero_times() -> None:
    left = window_of(replace(DESIGN, limits=LIMITS))
    assert left.low_s == pytest.approx(1 / (TWO_PI * 200e6))
    assert left.high_s == pytest.approx(1 / (TWO_PI * 90e6))
    bare = Design.from_elements(NOMINAL.with_changes(Rz=0), spreads=SPREADS, limits=LIMITS)
    right = window_of(bare)
    assert (right.low_s, right.high_s) == (-left.high_s, -left.low_s)
    assert left.source == right.source == "the limits on the zero"


def test_an_open_limit_reaches_to_infinity_on_its_side() -> None:
    # A zero at 100 MHz or farther out: any zero time from none up to that. Nearer than 200 MHz: that and all beyond.
    far = window_of(replace(DESIGN, limits={"zero_hz": Limit(low=100e6)}))
    assert far.low_s == 0.0
    assert far.high_s == pytest.approx(1 / (TWO_PI * 100e6))
    near = window_of(replace(DESIGN, limits={"zero_hz": Limit(high=200e6)}))
    assert near.low_s == pytest.approx(1 / (TWO_PI * 200e6))
    assert near.high_s == math.inf


def test_spreads_give_a_window_of_95_percent_of_parts() -> None:
    # τz = Cc·Rz - Cc/gm2. By hand, each spread alone: Cc 6 % of 1.215 ns is 72.9 ps; Rz 12 % of 2.34 ns is 280.8 ps;
    # gm2 8 % of 1.125 ns is 90 ps. Together 303.75 ps, times 1.96.
    sd_s = math.sqrt(72.9e-12**2 + 280.8e-12**2 + 90e-12**2)
    window = window_of(DESIGN)
    assert window.low_s == pytest.approx(1.215e-9 - 1.96 * sd_s, rel=1e-9)
    assert window.high_s == pytest.approx(1.215e-9 + 1.96 * sd_s, rel=1e-9)
    assert window.source == "the design's own spreads"


def test_the_window_of_the_spreads_holds_95_percent_of_simulated_dies() -> None:
    # To first order in the spreads: with them halved the product Cc·Rz is normal enough for ±1.5 %.
    halved = {name: spread / 2 for name, spread in SPREADS.items()}
    window = window_of(Design.from_elements(NOMINAL, spreads=halved))
    factors = 1 + np.array([halved["Cc"], halved["Rz"], halved["gm2"]]) * np.random.default_rng(8).standard_normal(
        (20_000, 3)
    )
    Cc, Rz, gm2 = NOMINAL.Cc * factors[:, 0], NOMINAL.Rz * factors[:, 1], NOMINAL.gm2 * factors[:, 2]
    zero_time_s = Cc * (Rz - 1 / gm2)
    share = np.mean((zero_time_s > window.low_s) & (zero_time_s < window.high_s))
    assert share == pytest.approx(0.95, abs=0.015)


def test_the_window_ends_where_the_designed_half_plane_does() -> None:
    wide = Design.from_elements(NOMINAL.with_changes(Rz=800), spreads=SPREADS | {"Rz": 0.5})
    assert window_of(wide).low_s == 0.0
    right = Design.from_elements(NOMINAL.with_changes(Rz=400), spreads=SPREADS | {"Rz": 0.9})
    assert window_of(right).high_s == 0.0


def test_roots_without_limits_get_ten_percent() -> None:
    window = window_of(Design.from_roots(LEFT_ROOTS))
    centre = 1 / (TWO_PI * 120e6)
    assert window.low_s == pytest.approx(0.9 * centre)
    assert window.high_s == pytest.approx(1.1 * centre)


def test_a_zero_designed_at_infinity_may_be_small_on_either_side() -> None:
    tight = dict.fromkeys(SPREADS, 0.01)
    window = window_of(Design.from_elements(NOMINAL.with_changes(Rz=1 / NOMINAL.gm2), spreads=tight))
    assert window.low_s == pytest.approx(-SMALL_S)
    assert window.high_s == pytest.approx(SMALL_S)
    assert window.source == "what counts as no zero"


# Regions

frequencies = st.floats(1e6, 1e10)
times = st.floats(-1e-7, 1e-7)
limits = st.one_of(
    st.none(),
    st.builds(lambda low: Limit(low=low), frequencies),
    st.builds(lambda high: Limit(high=high), frequencies),
    st.builds(lambda low, ratio: Limit(low=low, high=low * ratio), frequencies, st.floats(1.01, 100)),
)


@st.composite
def root_designs(draw: st.DrawFn) -> Design:
    """Designs by roots, with and without limits, with any "small"."""
    half_plane = draw(st.sampled_from(HalfPlane))
    zero_hz = None if half_plane is HalfPlane.INFINITY else draw(frequencies)
    limit = None if half_plane is HalfPlane.INFINITY else draw(limits)
    return Design.from_roots(
        replace(LEFT_ROOTS, zero_hz=zero_hz, half_plane=half_plane),
        limits={} if limit is None else {"zero_hz": limit},
        small_zero_ratio=draw(st.floats(1e-3, 0.99)),
    )


@st.composite
def element_designs(draw: st.DrawFn) -> Design:
    """Designs by elements, the half plane stated where the elements leave a choice."""
    nulling = draw(st.one_of(st.just(0.0), st.floats(0.01, 5), st.floats(0.91, 1.09)))
    elements = NOMINAL.with_changes(Rz=nulling / NOMINAL.gm2)
    spreads = dict.fromkeys(SPREADS, draw(st.floats(1e-3, 0.5)))
    design = Design.from_elements(elements, spreads=spreads)
    stated = draw(st.sampled_from(HalfPlane)) if design.half_plane is HalfPlane.INFINITY else design.half_plane
    limit = None if stated is HalfPlane.INFINITY else draw(limits)
    return replace(design, half_plane=stated, limits={} if limit is None else {"zero_hz": limit})


designs = st.one_of(root_designs(), element_designs())
NEARLY_NULLED = Design.from_elements(
    NOMINAL.with_changes(Rz=0.97 / NOMINAL.gm2), spreads=dict.fromkeys(SPREADS, 0.001), half_plane=HalfPlane.LEFT
)


@settings(derandomize=True)
@given(design=designs)
@example(design=NEARLY_NULLED)
def test_regions_tile_the_line(design: Design) -> None:
    tiles = sorted(regions_of(design, window_of(design)), key=lambda tile: tile[1])
    assert tiles[0][1] == -math.inf
    assert tiles[-1][2] == math.inf
    for (_, _, end), (_, start, _) in itertools.pairwise(tiles):
        assert end == start
    assert all(start < end for _, start, end in tiles)
    assert Nulling.AS_DESIGNED in {verdict for verdict, _, _ in tiles}
    assert len({verdict for verdict, _, _ in tiles}) == len(tiles)


@settings(max_examples=60, derandomize=True)
@given(design=designs, ends=st.tuples(times, times))
@example(design=NEARLY_NULLED, ends=(-2e-11, -1e-11))
def test_any_interval_is_in_one_region_or_undecided(
    healthy: LoopFit, design: Design, ends: tuple[float, float]
) -> None:
    low, high = min(ends), max(ends) + 1e-15
    verdict = verdict_on(healthy, design, interval(low, high))
    tiles = regions_of(design, window_of(design))
    holding = [name for name, start, end in tiles if start <= low and high <= end]
    assert [verdict.nulling] == (holding or [Nulling.UNDECIDED])


@settings(max_examples=60, derandomize=True)
@given(
    zero_hz=frequencies,
    limit=limits,
    small=st.floats(0, 0.99),
    ends=st.tuples(times, times),
)
def test_a_mirrored_part_of_a_mirrored_design_gets_the_same_answer(
    healthy: LoopFit, zero_hz: float, limit: Limit | None, small: float, ends: tuple[float, float]
) -> None:
    left, right = (
        Design.from_roots(
            replace(LEFT_ROOTS, zero_hz=zero_hz, half_plane=half_plane),
            limits={} if limit is None else {"zero_hz": limit},
            small_zero_ratio=small,
        )
        for half_plane in (HalfPlane.LEFT, HalfPlane.RIGHT)
    )
    low, high = min(ends), max(ends) + 1e-15
    assert (
        verdict_on(healthy, left, interval(low, high)).nulling
        is verdict_on(healthy, right, interval(-high, -low)).nulling
    )


@settings(derandomize=True)
@given(ends=st.tuples(times, times))
def test_at_infinity_the_mirror_swaps_too_little_and_too_much(healthy: LoopFit, ends: tuple[float, float]) -> None:
    design = Design.from_roots(replace(LEFT_ROOTS, zero_hz=None, half_plane=HalfPlane.INFINITY))
    low, high = min(ends), max(ends) + 1e-15
    swapped = {Nulling.TOO_LITTLE: Nulling.TOO_MUCH, Nulling.TOO_MUCH: Nulling.TOO_LITTLE}
    verdict = verdict_on(healthy, design, interval(low, high)).nulling
    mirrored = verdict_on(healthy, design, interval(-high, -low)).nulling
    assert mirrored is swapped.get(verdict, verdict)


@pytest.mark.parametrize(
    ("ends_ps", "nulling"),
    [
        ((-900, -800), Nulling.WRONG_SIDE),
        ((-120, -113), Nulling.WRONG_SIDE),
        ((-112, 112), Nulling.AT_INFINITY),
        ((113, 500), Nulling.TOO_LITTLE),
        ((796, 1768), Nulling.AS_DESIGNED),
        ((1769, 9000), Nulling.TOO_MUCH),
        ((-120, -100), Nulling.UNDECIDED),
        ((-2000, 5000), Nulling.UNDECIDED),
    ],
)
def test_regions_of_a_left_half_plane_design_by_numbers(
    healthy: LoopFit, ends_ps: tuple[float, float], nulling: Nulling
) -> None:
    # Small is 10 % of Cc/gm2 = 1.125 ns; the limits 90 and 200 MHz are 1768.4 and 795.8 ps.
    design = replace(DESIGN, limits=LIMITS)
    assert verdict_on(healthy, design, interval(ends_ps[0] * 1e-12, ends_ps[1] * 1e-12)).nulling is nulling


# Sentences


def test_an_undecided_sentence_names_every_region_it_reaches_into(healthy: LoopFit) -> None:
    verdict = verdict_on(healthy, replace(DESIGN, limits=LIMITS), interval(-0.2e-9, 0.9e-9))
    assert verdict.nulling is Nulling.UNDECIDED
    assert "reaches into wrong-side, at-infinity, too-little, as-designed;" in verdict.reason
    assert "too-much" not in verdict.reason


@pytest.mark.parametrize(
    ("ends", "nulling", "words"),
    [
        ((2e-9, None), Nulling.TOO_MUCH, "zero time above 2.000 ns lies beyond the window"),
        ((None, -1e-9), Nulling.WRONG_SIDE, "zero time below −1.000 ns is in the other half plane"),
        ((1e-9, None), Nulling.UNDECIDED, "1.000 ns and up, reaches into as-designed, too-much;"),
        ((None, 0.0), Nulling.UNDECIDED, "anything up to 0 s, reaches into wrong-side, at-infinity;"),
    ],
)
def test_a_bound_is_judged_as_the_open_interval_that_it_is(
    healthy: LoopFit, ends: tuple[float | None, float | None], nulling: Nulling, words: str
) -> None:
    known = Known.LOWER_BOUND if ends[1] is None else Known.UPPER_BOUND
    verdict = verdict_on(healthy, DESIGN, Estimate(value=None, stderr=None, ci95=ends, known=known))
    assert verdict.nulling is nulling
    assert words in verdict.reason


def test_a_zero_that_is_not_determined_leaves_the_verdict_open(healthy: LoopFit) -> None:
    verdict = verdict_on(healthy, DESIGN, NOT_KNOWN)
    assert verdict.nulling is Nulling.UNDECIDED
    assert verdict.reason.startswith("the sweep does not determine the zero; ")
    assert verdict.gm2_rz == NOT_KNOWN


@pytest.mark.parametrize(
    ("bench", "f_max_hz", "words"),
    [
        (BENCH, 3e6, "the third pole decides: state tighter spreads for C1, CL, Cc and gm2"),
        (replace(BENCH, delay_spread_s=3e-9), 8e6, "the path delay decides: measure it with a through sweep"),
        (Bench(load_f=2e-12, delay_s=0.4e-9), 0.5e6, "the band does not determine pole 2: sweep up to"),
    ],
)
def test_an_undecided_sentence_names_the_measurement_that_would_settle_it(
    bench: Bench, f_max_hz: float, words: str
) -> None:
    # C1 known to 0.1 % where the noise is to be what is left.
    tight = {"C1": 0.001, "CL": 0.001, "Cc": 0.001, "gm2": 0.001, "R1": 0.001, "R2": 0.001}
    spreads = SPREADS if bench.load_spread else SPREADS | tight
    design = Design.from_elements(NOMINAL, spreads=spreads, bench=bench, limits=LIMITS)
    sweep = measured(NOMINAL, 33, freq_hz=np.geomspace(10, f_max_hz, 121))
    verdict = judge_nulling(fit_with_design(sweep, design), design)
    assert verdict.nulling is Nulling.UNDECIDED
    assert words in verdict.reason


def test_settling_what_the_sentence_names_settles_the_verdict() -> None:
    # The same sweep as where the delay decided, now with the cable measured to 1 ps.
    vague = Design.from_elements(NOMINAL, spreads=SPREADS, bench=replace(BENCH, delay_spread_s=3e-9), limits=LIMITS)
    known = replace(vague, bench=replace(BENCH, delay_spread_s=1e-12))
    sweep = measured(NOMINAL, 34, freq_hz=np.geomspace(10, 20e6, 121))
    assert compare(sweep, vague).verdict.nulling is Nulling.UNDECIDED
    assert compare(sweep, known).verdict.nulling is Nulling.AS_DESIGNED
