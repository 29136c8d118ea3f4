"""What a reader of a comparison must know beside the verdict: contradictions between sweep, design and bench."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

from fitamp.comparison.expectation import expectation
from fitamp.comparison.result import Route, Row, Verdict
from fitamp.comparison.verdict import nulling_product
from fitamp.design import Design
from fitamp.errors import FitError
from fitamp.fitting import DelayPrior, FitWarning, LoopFit, WarningCode, fit_sweep
from fitamp.fitting.result import LABELS, text_of
from fitamp.units import si, si_with_error

__all__ = ["comparison_notes"]

# No spread of elements explains a gain or gain-bandwidth this many times off: a unit, a column or the wrong part does.
FAR_OFF = 5.0
CLEARLY = 3.0


def comparison_notes(
    fit: LoopFit, design: Design, rows: tuple[Row, ...], verdict: Verdict, *, doubt: str | None = None
) -> tuple[FitWarning, ...]:
    """Notes on this comparison, in the order of their weight.

    doubt : why the verdict does not rest on the circuit; None where it does, or there is none
    """
    return tuple(
        FitWarning(code=code, message=message)
        for notes in (
            _on_delay(fit, design, verdict),
            _on_distance(rows),
            _on_product(verdict, design),
            _on_route(doubt),
        )
        for code, message in notes
    )


def _on_route(doubt: str | None) -> Iterator[tuple[WarningCode, str]]:
    if doubt is not None:
        yield (
            WarningCode.CIRCUIT_SET_ASIDE,
            f"zero time and verdict rest on {Route.BEHAVIOUR.phrase}, not on the circuit's elements: {doubt}",
        )


def _on_delay(fit: LoopFit, design: Design, verdict: Verdict) -> Iterator[tuple[WarningCode, str]]:
    bench, delay = design.bench, fit.parameters.delay_s
    if bench.delay_s is None:
        yield (
            WarningCode.DELAY_NOT_STATED,
            f"no delay is stated, so it was fitted: {text_of('delay_s', delay)}; measure it with a through sweep: "
            "it passes for a zero farther right",
        )
        return
    if fit.adequacy.adequate or verdict.route is Route.CIRCUIT:
        return
    wanted = _with_free_delay(fit, design)
    if wanted is None or wanted.adequacy.reduced_chi_square > 0.5 * fit.adequacy.reduced_chi_square:
        return
    stated = si_with_error(bench.delay_s, bench.delay_spread_s, "s")
    yield (
        WarningCode.DELAY_CONTRADICTED,
        f"a delay of {stated} is stated, but the sweep asks for {text_of('delay_s', wanted.parameters.delay_s)}; "
        "measure it with a through sweep, or look for a pole that the design does not have",
    )


def _with_free_delay(fit: LoopFit, design: Design) -> LoopFit | None:
    expected = replace(expectation(design), delay=DelayPrior(sd_s=math.inf))
    try:
        return fit_sweep(fit.sweep, noise=fit.sweep.noise, keep_all=True, **expected.as_arguments())
    except FitError:
        return None


def _on_distance(rows: tuple[Row, ...]) -> Iterator[tuple[WarningCode, str]]:
    for row in rows:
        measured, designed = row.measured.value, row.designed
        if row.quantity not in {"dc_gain", "gain_bandwidth_hz"} or not measured or not designed:
            continue
        ratio = measured / designed
        if not 1 / FAR_OFF < ratio < FAR_OFF:
            factor = f"{ratio:.3g} times" if ratio > 1 else f"1/{1 / ratio:.3g} of"
            yield (
                WarningCode.FAR_FROM_DESIGN,
                f"{LABELS[row.quantity]} is {factor} the designed: check the units of sweep and design file, and that "
                "the sweep is the loop gain of this design, not a closed-loop response",
            )


def _on_product(verdict: Verdict, design: Design) -> Iterator[tuple[WarningCode, str]]:
    product = nulling_product(verdict.zero_time_s, design)
    if product.value is None or product.stderr is None or product.value >= -CLEARLY * product.stderr:
        return
    found = f"with gm2 and Cc as designed, gm2·Rz would be {si(product.value, '', digits=3)}, which no resistor gives"
    if verdict.route is Route.CIRCUIT:
        yield WarningCode.PRODUCT_NEGATIVE, f"{found}: gm2 or Cc is not as designed"
        return
    yield (
        WarningCode.PRODUCT_NEGATIVE,
        f"{found}: gm2 or Cc is not as designed, and what is derived with them (change of Rz, load) cannot be trusted",
    )
