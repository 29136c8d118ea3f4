"""Measured against designed: one door, `compare`."""

from __future__ import annotations

from dataclasses import replace

from fitamp.comparison.expectation import designed_as_measured, fit_with_design
from fitamp.comparison.notes import comparison_notes
from fitamp.comparison.parasitic import parasitics
from fitamp.comparison.result import Advice, Comparison, Nulling, Parasitic, Row, Verdict, Window
from fitamp.comparison.rows import comparison_rows
from fitamp.comparison.verdict import advise, describes, judge_nulling
from fitamp.design import Design
from fitamp.errors import UsageError
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["Advice", "Comparison", "Nulling", "Parasitic", "Row", "Verdict", "Window", "compare"]


def compare(sweep: Sweep, design: Design, *, noise: NoiseLevels | None = None, keep_all: bool = False) -> Comparison:
    """Fit a sweep with what its design expects, and hold the two against each other.

    Parameters
    ----------
    sweep
        Loop gain, positive real at DC.
    design
        Element values with spreads, or poles, zero and gain.
    noise
        Noise levels; estimated from the sweep where neither this nor ``sweep.noise`` is given.
    keep_all
        Keep glitches and mains lines, which are otherwise left out and listed in ``fit.sweep.left_out``.

    Raises
    ------
    FitError
        When the sweep cannot be fitted.
    UsageError
        When these are not a Sweep and a Design.
    """
    if not isinstance(sweep, Sweep) or not isinstance(design, Design):
        raise UsageError("compare takes a Sweep and a Design: read them with read_sweep and read_design")
    if noise is not None:
        sweep = replace(sweep, noise=noise)  # for every fit of this sweep, the notes' too
    fit = fit_with_design(sweep, design, keep_all=keep_all)
    designed_fit = designed_as_measured(design, fit)
    verdict = judge_nulling(fit, design)
    designed_zero_s = design.zero_time_s
    if designed_fit is not None and designed_fit.parameters.zero_time_s.value is not None:
        designed_zero_s = designed_fit.parameters.zero_time_s.value
    rows = comparison_rows(fit, designed_fit, design, verdict.window, trusted=describes(fit))
    return Comparison(
        design=design,
        fit=fit,
        designed_fit=designed_fit,
        rows=rows,
        verdict=verdict,
        advice=advise(verdict, design, designed_zero_s, fit=fit, rows=rows),
        parasitic=parasitics(fit, design),
        notes=comparison_notes(fit, design, rows, verdict),
    )
