"""What a reader of a comparison must know beside the verdict: contradictions between sweep, design and bench."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

from fitamp.comparison.expectation import expectation
from fitamp.comparison.result import Row, Verdict
from fitamp.design import Design
from fitamp.errors import FitError
from fitamp.fitting import DelayPrior, FitWarning, LoopFit, WarningCode, fit_sweep
from fitamp.fitting.result import LABELS, text_of
from fitamp.units import si, si_with_error

__all__ = ["comparison_notes"]

# No spread of elements explains a gain or gain-bandwidth this many times off: a unit, a column or the wrong part does.
FAR_OFF = 5.0
CLEARLY = 3.0


def comparison_notes(fit: LoopFit, design: Design, rows: tuple[Row, ...], verdict: Verdict) -> tuple[FitWarning, ...]:
    """Notes on this comparison, in the order of their weight."""
    return tuple(
        FitWarning(code=code, message=message)
        for notes in (_on_delay(fit, design), _on_distance(rows), _on_product(verdict))
        for code, message in notes
    )


def _on_delay(fit: LoopFit, design: Design) -> Iterator[tuple[WarningCode, str]]:
    bench, delay = design.bench, fit.parameters.delay_s
    if bench.delay_s is None:
        yield (
            WarningCode.DELAY_NOT_STATED,
            f"no delay is stated, so it was fitted: {text_of('delay_s', delay)}; measure it with a through sweep: "
            "it passes for a zero farther right",
        )
        return
    if fit.adequacy.adequate:
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


def _on_product(verdict: Verdict) -> Iterator[tuple[WarningCode, str]]:
    product = verdict.gm2_rz
    if product.value is not None and product.stderr is not None and product.value < -CLEARLY * product.stderr:
        yield (
            WarningCode.PRODUCT_NEGATIVE,
            f"gm2·Rz comes out at {si(product.value, '', digits=3)}, which no resistor gives: gm2 or Cc is not as "
            "designed, and what is derived with them (change of Rz, load) cannot be trusted",
        )
