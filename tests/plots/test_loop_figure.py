"""The loop-gain picture shows the sweep, the fit and the design at their own numbers."""

from __future__ import annotations

import numpy as np
import pytest
from drawn_parts import bench_sweep, comparison_of, drawn, drawn_lines, fit_of_pair, part, words_in, x_of, y_of
from matplotlib.patches import Rectangle

from fitamp.fitting import fit_sweep
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
