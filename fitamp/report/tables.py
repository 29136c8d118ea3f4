"""Results as tables for a terminal, at most 100 columns wide, by rich.

Text from files is printed as it is, never read as markup, and control characters are shown, not sent.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from fitamp.comparison import Comparison, Route, Row
from fitamp.estimate import Estimate
from fitamp.fitting import FitWarning, LoopFit
from fitamp.fitting.result import LABELS, text_of, unit_of
from fitamp.report.conditions import cautions, conditions
from fitamp.report.console import new_console, print_table, printable, say, text_of_console
from fitamp.report.further import further_sentences, model_in_words
from fitamp.report.reading import levels_text
from fitamp.units import si, si_with_error, to_db

if TYPE_CHECKING:
    from rich.console import Console

__all__ = [
    "comparison_text",
    "deviation_text",
    "estimate_text",
    "fit_text",
    "interval_text",
    "limits_text",
    "printable",
]


def fit_text(fit: LoopFit) -> str:
    """A fit: parameters, the zero in words, margins, what to know."""
    console = new_console()
    rows = [
        (LABELS[name], estimate_text(name, estimate), _interval(name, estimate.ci95), estimate.known.value)
        for name, estimate in fit.parameters.items()
        if name not in {"delay_s", "far_pole_s"} or estimate.stderr is not None
    ]
    print_table(console, printable(fit.sweep.origin.file), ("quantity", "value ± 1 σ", "95 % interval", "known"), rows)
    _complex_pair(console, fit)
    for sentence in further_sentences(fit):
        say(console, sentence)
    say(console, f"zero: {zero_sentence(fit)}")
    _margins(console, fit)
    say(
        console,
        f"model: {model_in_words(fit)}; {fit.adequacy.sentence} (reduced chi-square "
        f"{fit.adequacy.reduced_chi_square:.3g})",
    )
    say(console, noise_sentence(fit))
    _warnings(console, fit, ())
    return text_of_console(console)


def comparison_text(comparison: Comparison) -> str:
    """A comparison: verdict first, then what to do, then the numbers."""
    console = new_console()
    verdict = comparison.verdict
    say(console, f"{verdict.nulling.value.upper()}: {verdict.reason}", style="bold")
    say(console, f"what to do: {comparison.advice.sentence}")
    if comparison.parasitic is not None:
        say(console, f"parasitic: {comparison.parasitic.sentence}")
    gm2_rz = verdict.gm2_rz
    if gm2_rz.value is not None:
        say(
            console,
            f"gm2·Rz: {si_with_error(gm2_rz.value, gm2_rz.stderr, '')} (1 puts the zero at infinity; with gm2 and Cc "
            f"{'as sweep and design tell them' if verdict.route is Route.CIRCUIT else 'as designed'})",
        )
    if comparison.design.elements is not None:
        say(console, f"route: {verdict.route.value}; zero time and verdict rest on {verdict.route.phrase}")
    title = f"{printable(comparison.fit.sweep.origin.file)} against {printable(comparison.design.file)}"
    headings = ("quantity", "designed", "seen as\nmeasured", "measured ± 1 σ", "deviation", "in σ", "limits", "within")
    print_table(console, title, headings, _comparison_rows(comparison.rows), numbers=True)
    _limits_kept(console, comparison)
    _complex_pair(console, comparison.fit)
    for sentence in further_sentences(comparison.fit):
        say(console, sentence)
    _margins(console, comparison.fit, rows=("overshoot", "settling_s"))
    say(console, f"lag: {lag_sentence(comparison.fit)}")
    say(
        console,
        f"model: {comparison.fit.adequacy.sentence} (reduced chi-square "
        f"{comparison.fit.adequacy.reduced_chi_square:.3g}); {noise_sentence(comparison.fit)}",
    )
    if comparison.design.assumed_spreads:
        say(
            console,
            f"assumed: a spread of 20 % for {', '.join(comparison.design.assumed_spreads)}, not stated in "
            "the design file",
        )
    _warnings(console, comparison.fit, comparison.notes)
    return text_of_console(console)


def _complex_pair(console: Console, fit: LoopFit) -> None:
    for root in fit.poles:
        if root.value_hz.imag > 0:
            real, imaginary = si(root.value_hz.real, "Hz"), si(root.value_hz.imag, "Hz")
            quality = abs(root.value_hz) / abs(2 * root.value_hz.real)
            say(console, f"poles: a complex pair at {real} ± j {imaginary} (Q = {quality:.3g}); pole 1 is pole 2")


def _limits_kept(console: Console, comparison: Comparison) -> None:
    """How many of the stated limits are kept, and which are not."""
    stated = [row for row in comparison.rows if row.quantity != "zero_time_s" and (row.low, row.high) != (None, None)]
    if not stated:
        return
    kept = sum(row.inside is True for row in stated)
    parts = [f"{kept} of {len(stated)} kept beyond doubt"]
    broken = [LABELS[name] for name in comparison.broken_limits]
    if broken:
        parts.append(f"BROKEN: {', '.join(broken)}")
    open_rows = [LABELS[row.quantity] for row in stated if row.inside is None]
    if open_rows:
        parts.append(f"not decided: {', '.join(open_rows)}")
    say(console, f"limits beside the zero's: {'; '.join(parts)}")


def lag_sentence(fit: LoopFit) -> str:
    """Path delay and third pole as the fit took them, held against what was known of them."""
    model, parameters = fit.solution.model, fit.parameters
    delay, far_pole = text_of("delay_s", parameters.delay_s), text_of("far_pole_s", parameters.far_pole_s)
    known = f"stated {si_with_error(model.delay.mean_s, model.delay.sd_s, 's')}"
    if not math.isfinite(model.delay.sd_s):
        known = "not stated"
    expected_s = model.far_pole.intercept_s + model.far_pole.slope * (parameters.zero_time_s.value or 0.0)
    beforehand = f"the design expects {si_with_error(max(expected_s, 0.0), model.far_pole.sd_s, 's')}"
    if not math.isfinite(model.far_pole.sd_s):
        beforehand = "nothing known beforehand"
    return f"path delay {delay} ({known}), third pole time {far_pole} ({beforehand})"


def zero_sentence(fit: LoopFit) -> str:
    """The half plane of the zero, and how far out it is."""
    near, far = fit.zero.ci95_hz
    place = {"left": "left half plane", "right": "right half plane", "infinity": "as good as at infinity"}.get(
        fit.zero.half_plane.value, "half plane undecided"
    )
    if near is None:
        return place
    if far is None:
        return f"{place}, farther out than {si(near, 'Hz')}"
    return f"{place}, {si(fit.zero.frequency_hz, 'Hz')} (95 %: {si(near, 'Hz')} to {si(far, 'Hz')})"


def noise_sentence(fit: LoopFit) -> str:
    """The three noise numbers in words."""
    return f"noise: {levels_text(fit.noise)} ({fit.noise.source})"


def _comparison_rows(rows: Sequence[Row]) -> list[tuple[str, ...]]:
    cells = []
    for row in rows:
        cells.append(_comparison_row(row))
        if row.quantity == "zero_time_s":
            cells.append(_zero_row(row))
    return cells


def _comparison_row(row: Row) -> tuple[str, ...]:
    unit = unit_of(row.quantity)
    if row.quantity == "dc_gain":
        # A gain is read in dB at the bench; scripts get V/V.
        numbers = [_decibels(value) for value in (row.designed, row.designed_as_measured)]
        measured = estimate_text(row.quantity, row.measured)
        limits = limits_text(_as_db(row.low), _as_db(row.high), "dB")
    else:
        numbers = [si(value, unit) for value in (row.designed, row.designed_as_measured)]
        measured, limits = estimate_text(row.quantity, row.measured), limits_text(row.low, row.high, unit)
        if row.quantity == "gain_margin_db" and row.measured.value is None:
            measured = "unlimited"
    return (
        LABELS[row.quantity],
        *numbers,
        measured,
        deviation_text(row.deviation, unit),
        "–" if row.sigma is None else _sigma(row.sigma),
        limits,
        {True: "yes", False: "NO", None: "–" if row.low is None and row.high is None else "?"}[row.inside],
    )


def deviation_text(deviation: float | None, unit: str) -> str:
    """A relative deviation in percent; of degrees and dB the difference."""
    if deviation is None:
        return "–"
    if unit in {"°", "dB"}:
        return f"{deviation:+.2f} {unit}".replace("-", "−")
    # Ten times as much is no longer a percentage.
    return (f"{100 * deviation:+.2f} %" if abs(deviation) < 10 else f"× {1 + deviation:.3g}").replace("-", "−")


def _zero_row(row: Row) -> tuple[str, ...]:
    """The zero time once more, as a frequency with its half plane."""
    places = [zero_place(value) for value in (row.designed, row.designed_as_measured, row.measured.value)]
    return ("as a zero at", *places, "", "", "", "")


def zero_place(zero_time_s: float | None) -> str:
    """A zero time as a frequency with its half plane: "131 MHz L"."""
    if zero_time_s is None:
        return "–"
    if zero_time_s == 0:
        return "infinity"
    side = "L" if zero_time_s > 0 else "R"
    return f"{si(1 / (2 * math.pi * abs(zero_time_s)), 'Hz', digits=3)} {side}"


def _as_db(ratio: float | None) -> float | None:
    return None if ratio is None else to_db(ratio)


def _decibels(ratio: float | None) -> str:
    return si(_as_db(ratio), "dB")


def estimate_text(quantity: str, estimate: Estimate) -> str:
    """Value ± standard error or a bound; a gain in dB."""
    return _gain_text(estimate) if quantity == "dc_gain" else text_of(quantity, estimate)


def _gain_text(gain: Estimate) -> str:
    """A gain estimate in dB, or its bound."""
    if gain.value is not None and gain.stderr is not None:
        return si_with_error(to_db(gain.value), 20 / math.log(10) * gain.stderr / gain.value, "dB")
    low, high = gain.ci95
    in_db = Estimate(value=None, stderr=None, ci95=(_as_db(low), _as_db(high)), known=gain.known)
    return text_of("gain_margin_db", in_db)


def _sigma(sigma: float) -> str:
    if abs(sigma) >= 1000:
        return "> +999" if sigma > 0 else "< −999"
    return (f"{sigma:+.1f}" if abs(sigma) < 100 else f"{sigma:+.0f}").replace("-", "−")


def limits_text(low: float | None, high: float | None, unit: str) -> str:
    """Limits as "≥ 60°", or a span."""
    if low is not None and high is not None and math.isfinite(low) and math.isfinite(high):
        return _span(low, high, unit)
    if low is not None and math.isfinite(low):
        return f"≥ {si(low, unit, digits=3)}"
    if high is not None and math.isfinite(high):
        return f"≤ {si(high, unit, digits=3)}"
    return "–"


def _span(low: float, high: float, unit: str) -> str:
    """Both ends under the larger one's prefix where that keeps them readable: "80 … 160 MHz"."""
    start, end = si(low, unit, digits=3), si(high, unit, digits=3)
    number, _, suffix = end.rpartition(" ")
    return f"{start.rpartition(' ')[0]} … {number} {suffix}" if start.endswith(f" {suffix}") else f"{start} … {end}"


def _interval(name: str, ci95: tuple[float | None, float | None]) -> str:
    low, high = ci95
    unit = unit_of(name)
    if name == "dc_gain":
        low, high, unit = _as_db(low), _as_db(high), "dB"
    return interval_text((low, high), unit)


def interval_text(ci95: tuple[float | None, float | None], unit: str) -> str:
    """Both ends of an interval, with digits enough to tell them apart."""
    low, high = ci95
    if low is None and high is None:
        return "–"
    digits = 4
    if low is not None and high is not None and high > low:
        digits = min(max(digits, 2 + math.ceil(-math.log10((high - low) / max(abs(low), abs(high))))), 12)
    return f"{'…' if low is None else si(low, unit, digits)} to {'…' if high is None else si(high, unit, digits)}"


def _margins(console: Console, fit: LoopFit, rows: Sequence[str] | None = None) -> None:
    parts = []
    for name, estimate in fit.margins.items():
        if rows is not None and name not in rows:
            continue
        if name == "overshoot" and estimate.value is not None and estimate.stderr is not None:
            parts.append(f"overshoot {si_with_error(100 * estimate.value, 100 * estimate.stderr, '%')}")
        elif name == "gain_margin_db" and estimate.value is None:
            parts.append("gain margin unlimited (phase never reaches −180°)")
        else:
            parts.append(f"{LABELS[name]} {text_of(name, estimate)}")
    say(console, f"closed loop: {', '.join(parts)}")


def _warnings(console: Console, fit: LoopFit, notes: Sequence[FitWarning]) -> None:
    for condition in conditions(fit.sweep):
        say(console, condition)
    for code, sentence in cautions(fit.sweep):
        say(console, f"note ({code}): {sentence}", style="yellow")
    for warning in (*notes, *fit.warnings):
        say(console, f"note ({warning.code.value}): {warning.message}", style="yellow")
