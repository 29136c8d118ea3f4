"""The loop-gain picture shows the sweep, the fit and the design at their own numbers."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from drawn_parts import (
    ELEMENTS,
    bench_sweep,
    comparison_in_trouble,
    comparison_of,
    covered,
    drawn,
    drawn_lines,
    fit_of_pair,
    part,
    shown_points,
    words_in,
    x_of,
    y_of,
)
from matplotlib.patches import Rectangle
from matplotlib.text import Annotation, Text

from fitamp.comparison import Comparison
from fitamp.design import Bench, Design
from fitamp.fitting import DelayPrior, LoopFit, fit_sweep
from fitamp.plots import loop_figure
from fitamp.transfer import Transfer


def test_points_are_the_sweep() -> None:
    comparison = comparison_of(0)
    sweep = comparison.fit.sweep
    magnitude, phase = sorted(drawn_lines(loop_figure(comparison.fit), "measured"), key=lambda line: y_of(line).min())[
        ::-1
    ]
    for line in (magnitude, phase):
        np.testing.assert_array_equal(x_of(line), sweep.freq_hz)
    np.testing.assert_allclose(y_of(magnitude), 20 * np.log10(np.abs(sweep.gain)), rtol=1e-12)
    np.testing.assert_allclose(y_of(phase), np.degrees(np.unwrap(np.angle(sweep.gain))), atol=1e-9)


def test_fitted_curve_is_the_fit() -> None:
    fit = comparison_of(0).fit
    magnitude = max(drawn_lines(loop_figure(fit), "fitted"), key=lambda line: y_of(line).max())
    np.testing.assert_allclose(y_of(magnitude), 20 * np.log10(np.abs(fit.evaluate(x_of(magnitude)))), rtol=1e-12)


def test_designed_curve_is_the_design_on_the_bench() -> None:
    comparison = comparison_of(0)
    magnitude, phase = sorted(
        drawn_lines(loop_figure(comparison.fit, comparison), "designed"), key=lambda line: -y_of(line).max()
    )
    designed = comparison.design.on_bench().evaluate(x_of(magnitude))
    np.testing.assert_allclose(y_of(magnitude), 20 * np.log10(np.abs(designed)), rtol=1e-12)
    np.testing.assert_allclose(np.exp(1j * np.radians(y_of(phase))), designed / np.abs(designed), atol=1e-9)
    assert abs(y_of(phase)[0]) < 1  # positive real at DC


def test_a_fit_alone_has_no_designed_curve() -> None:
    assert drawn_lines(loop_figure(comparison_of(0).fit), "designed") == []


def test_crossover_line_stands_where_the_fit_crosses_0_db() -> None:
    fit = comparison_of(0).fit
    lines = drawn_lines(loop_figure(fit), "crossover")
    assert len(lines) == 2
    for line in lines:
        assert abs(fit.response.evaluate(x_of(line))[0]) == pytest.approx(1.0, abs=1e-9)


def test_phase_margin_and_crossover_are_written_with_their_errors() -> None:
    words = " ".join(words_in(loop_figure(comparison_of(0).fit)))
    assert "crossover 12.77" in words
    assert "phase margin 71.9" in words
    assert words.count("±") >= 2


def test_residuals_are_the_fit_s_residuals() -> None:
    fit = comparison_of(0).fit
    figure = loop_figure(fit)
    np.testing.assert_array_equal(y_of(drawn_lines(figure, "residual real")[0]), fit.residuals().real)
    np.testing.assert_array_equal(y_of(drawn_lines(figure, "residual imaginary")[0]), fit.residuals().imag)


def test_limits_are_drawn_at_their_ends() -> None:
    comparison = comparison_of(0)
    lines = drawn_lines(loop_figure(comparison.fit, comparison), "limit")
    margin, crossover = sorted(lines, key=lambda line: y_of(line).min())
    np.testing.assert_array_equal(x_of(crossover), [10e6, 16e6])
    np.testing.assert_array_equal(y_of(margin), [60 - 180, 85 - 180])


def test_window_of_the_zero_spans_its_limits() -> None:
    comparison = comparison_of(0)
    (window,) = drawn(loop_figure(comparison.fit, comparison), "zero window")
    assert isinstance(window, Rectangle)
    assert window.get_x() == pytest.approx(80e6)
    assert window.get_x() + window.get_width() == pytest.approx(160e6)


def test_roots_stand_at_their_distances_with_the_half_plane_named() -> None:
    comparison = comparison_of(0)
    figure = loop_figure(comparison.fit, comparison)
    (measured,) = drawn_lines(figure, "measured zero")
    (designed,) = drawn_lines(figure, "designed zero")
    # Without a resistor the zero is at gm2/Cc in the right half plane (common practice).
    assert x_of(measured)[0] == pytest.approx(1.6e-3 / (2 * np.pi * 1.8e-12), rel=0.01)
    assert x_of(designed)[0] == pytest.approx(131e6, rel=0.01)
    assert {"zero (right)", "zero (left)"} <= set(words_in(figure))


def test_a_root_beyond_the_band_becomes_an_arrow_at_the_edge() -> None:
    fit = comparison_of(625).fit
    figure = loop_figure(fit)
    (zero,) = drawn_lines(figure, "measured zero")
    assert zero.get_marker() == ">"
    low, high = fit.parameters.zero_time_s.ci95
    assert low is not None
    assert high is not None
    nearest_ghz = 1e-9 / (2 * np.pi * max(-low, high))
    assert f"zero > {nearest_ghz:.2f} GHz" in words_in(figure)


def test_points_left_out_are_shown_with_their_reason() -> None:
    sweep = part(0)
    keep = np.ones(len(sweep), dtype=bool)
    keep[[40, 90]] = False
    figure = loop_figure(fit_sweep(sweep.without(keep, "mains spur")))
    left_out = drawn_lines(figure, "left out")
    assert len(left_out) == 2
    np.testing.assert_array_equal(x_of(left_out[0]), sweep.freq_hz[[40, 90]])
    assert "left out, 2 points: mains spur" in words_in(figure)


def test_many_reasons_are_summed_up() -> None:
    sweep = part(0)
    for index, reason in enumerate(("one", "two", "three", "four", "five")):
        keep = np.arange(len(sweep)) != 30 + index
        sweep = sweep.without(keep, reason)
    words = words_in(loop_figure(fit_sweep(sweep)))
    assert [text for text in words if text.startswith("left out")] == [
        "left out, 1 point: one",
        "left out, 1 point: two",
        "left out, 3 more points for other reasons",
    ]


def test_phase_counts_from_dc_even_where_the_sweep_starts_late() -> None:
    # Two poles and a right-half-plane zero turn the phase to −270° in the end; the sweep begins beyond pole 2.
    fit = fit_sweep(
        bench_sweep(Transfer(dc_gain=1e3, poles_hz=(-1e3, -5e5), zeros_hz=(2e6,)), np.geomspace(1e6, 1e8, 60))
    )
    phase = min(drawn_lines(loop_figure(fit), "measured"), key=lambda line: y_of(line).min())
    assert -270 < y_of(phase).min() < -260
    assert y_of(phase).max() < -150


def test_a_pair_is_one_mark_at_its_distance() -> None:
    figure = loop_figure(fit_of_pair())
    (pair,) = drawn_lines(figure, "measured pole pair")
    assert x_of(pair)[0] == pytest.approx(5e6, rel=0.01)  # |−3 + 4j| MHz


def _against(elements_factor: float, delay_s: float) -> Comparison:
    """A part against a design with another gm2, or on a bench with another delay, than it was made with."""
    elements = ELEMENTS.with_changes(gm2=ELEMENTS.gm2 * elements_factor)
    return replace(comparison_of(0), design=Design.from_elements(elements, bench=Bench(delay_s=delay_s)))


@pytest.mark.parametrize("comparison", [_against(1e9, 0.0), _against(1.0, 50e-9)], ids=["mega", "delay"])
def test_a_far_off_design_leaves_the_data_their_room(comparison: Comparison) -> None:
    figure = loop_figure(comparison.fit, comparison)
    sweep = comparison.fit.sweep
    magnitude, phase = figure.axes[3], figure.axes[2]
    low_hz, high_hz = phase.get_xlim()
    assert sweep.f_min_hz / 10 <= low_hz < sweep.f_min_hz
    assert sweep.f_max_hz < high_hz <= 10 * sweep.f_max_hz
    for axes, share in ((magnitude, 0.5), (phase, 0.5)):
        (data,) = [line for line in axes.lines if line.get_gid() == "measured"]
        bottom, top = axes.get_ylim()
        assert bottom < y_of(data).min()
        assert y_of(data).max() < top
        assert y_of(data).max() - y_of(data).min() > share * (top - bottom)


@pytest.mark.parametrize("delay_s", [0.0, 1e-9, 20e-9, 200e-9])
def test_phase_ticks_are_few_and_round(delay_s: float) -> None:
    freq_hz = comparison_of(1300).fit.sweep.freq_hz
    gain = ELEMENTS.transfer().evaluate(freq_hz) * np.exp(-2j * np.pi * freq_hz * delay_s)
    fit = comparison_of(1300).fit
    figure = loop_figure(replace(fit, sweep=replace(fit.sweep, gain=gain)))
    ticks = figure.axes[2].get_yticks()
    assert 3 <= len(ticks) <= 8
    (step,) = set(np.diff(ticks))
    assert step in {45 * 2**n for n in range(12)}
    np.testing.assert_allclose(np.mod(ticks, step), 0)


def _fit_with_margin(load_farad: float, rz_ohm: float = 1300) -> LoopFit:
    response = ELEMENTS.with_changes(CL=load_farad, Rz=rz_ohm).transfer()
    return fit_sweep(bench_sweep(response, np.geomspace(1e3, 1e8, 101)))


@pytest.mark.parametrize(
    "fit",
    [
        comparison_of(0).fit,
        comparison_of(3000).fit,
        comparison_in_trouble().fit,
        fit_of_pair(),
        _fit_with_margin(9e-11),
    ],
    ids=["no resistor", "large resistor", "trouble", "pair", "heavy load"],
)
def test_words_hide_neither_data_nor_curves(fit: LoopFit) -> None:
    figure = loop_figure(fit)
    figure.draw_without_rendering()
    for axes, gid in ((figure.axes[3], "crossover words"), (figure.axes[2], "phase margin words")):
        (words,) = [text for text in drawn(figure, gid) if isinstance(text, Text)]
        lines = [line for line in axes.lines if line.get_gid() in {"measured", "fitted", "crossover"}]
        assert len(lines) == 3
        assert sum(covered(words, shown_points(line)) for line in lines) == 0


@pytest.mark.parametrize(("fit", "arrows"), [(comparison_of(0).fit, 1), (comparison_in_trouble().fit, 2)])
def test_a_small_margin_has_its_arrow_heads_outside(fit: LoopFit, arrows: int) -> None:
    found = [mark for mark in drawn(loop_figure(fit), "phase margin") if isinstance(mark, Annotation)]
    assert len(found) == arrows
    margin = fit.margins.phase_margin_deg.value
    assert margin is not None
    ends = sorted({mark.xy[1] for mark in found} | ({-180.0} if arrows == 1 else set()))
    np.testing.assert_allclose(ends, sorted([-180.0, -180 + margin]))


def test_an_inadequate_fit_is_told_in_full_with_its_largest_residual() -> None:
    fit = comparison_in_trouble().fit
    figure = loop_figure(fit)
    title = " ".join(figure.axes[0].get_title(loc="left").split())
    assert fit.adequacy.sentence in title
    assert "…" not in title
    size = np.abs(fit.residuals())
    largest_hz = fit.sweep.freq_hz[np.argmax(size)]
    found = title.rpartition(" at ")[2].split()
    scale = {"Hz": 1, "kHz": 1e3, "MHz": 1e6}[found[1]]
    assert float(found[0]) * scale == pytest.approx(largest_hz, rel=0.005)


def test_a_large_residual_is_ringed_and_leaves_the_small_ones_visible() -> None:
    sweep = part(0)
    gain = sweep.gain.copy()
    gain[100] *= 1.2
    fit = fit_sweep(replace(sweep, gain=gain), keep_all=True)
    figure = loop_figure(fit)
    (ring,) = drawn_lines(figure, "largest residual")
    assert x_of(ring)[0] == sweep.freq_hz[100]
    axes = figure.axes[0]
    at = axes.transData.transform([(1e3, -2), (1e3, 0), (1e3, 2), (1e3, y_of(ring)[0])])[:, 1]
    assert axes.bbox.y0 < at[3] < axes.bbox.y1
    assert at[2] - at[0] > 0.15 * axes.bbox.height


def test_the_path_delay_is_told_with_its_origin() -> None:
    fitted = fit_sweep(part(0), delay=DelayPrior(mean_s=0.4e-9, sd_s=20e-12))
    (words,) = [text for text in words_in(loop_figure(fitted)) if text.startswith("path delay")]
    assert words.endswith("ps, fitted (stated: 400 ps ± 20 ps)")
    held = fit_sweep(part(0), delay=DelayPrior(mean_s=0.4e-9))
    assert "path delay held at 400 ps" in words_in(loop_figure(held))


def test_warnings_stand_below_in_full_and_the_rest_is_counted() -> None:
    comparison = comparison_in_trouble()
    figure = loop_figure(comparison.fit, comparison)
    notes = [text.get_text() for text in drawn(figure, "note") if isinstance(text, Text)]
    together = " ".join(notes)
    for warning in comparison.fit.warnings[:2]:
        assert f"note: {warning.message}" in together
    assert notes[-1] == "note: 1 more note in the report's text"


def test_names_in_the_lane_do_not_overlap() -> None:
    for comparison in (*map(comparison_of, (0.0, 625.0, 900.0, 3000.0)), _against(1e9, 0.0), comparison_in_trouble()):
        figure = loop_figure(comparison.fit, comparison)
        figure.draw_without_rendering()
        boxes = [text.get_window_extent() for text in figure.axes[1].texts]
        for index, box in enumerate(boxes):
            assert not any(box.overlaps(other) for other in boxes[:index])
            assert figure.axes[1].bbox.y0 <= box.y0
            assert box.y1 <= figure.axes[1].bbox.y1


def test_data_with_a_delay_that_the_fit_lacks_fall_without_bounces() -> None:
    fit = comparison_of(1300).fit
    gain = fit.sweep.gain * np.exp(-2j * np.pi * fit.sweep.freq_hz * 20e-9)
    figure = loop_figure(replace(fit, sweep=replace(fit.sweep, gain=gain)))
    (phase,) = [line for line in figure.axes[2].lines if line.get_gid() == "measured"]
    # 20 ns are two turns at 100 MHz, on top of the loop's own lag, and a quarter turn between the last two points.
    assert -1000 < y_of(phase)[-1] < -720
    assert np.abs(np.diff(y_of(phase))).max() < 120
