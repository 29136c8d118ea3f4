"""Measured against designed: one door, `compare`."""

from __future__ import annotations

from dataclasses import replace

from fitamp.comparison.by_circuit import advise_by_circuit, judge_circuit, parasitics_by_circuit
from fitamp.comparison.circuit_zero import CircuitZero, zero_by_circuit
from fitamp.comparison.expectation import designed_as_measured, fit_with_design
from fitamp.comparison.notes import comparison_notes
from fitamp.comparison.parasitic import parasitics
from fitamp.comparison.result import Advice, Comparison, Nulling, Parasitic, Route, Row, Verdict, Window
from fitamp.comparison.rows import comparison_rows
from fitamp.comparison.verdict import advise, describes, judge_nulling
from fitamp.design import Design
from fitamp.elements import ElementEstimate
from fitamp.errors import UsageError
from fitamp.estimate import Estimate
from fitamp.fitting import LoopFit
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["Advice", "Comparison", "Nulling", "Parasitic", "Route", "Row", "Verdict", "Window", "compare"]


def compare(sweep: Sweep, design: Design, *, noise: NoiseLevels | None = None, keep_all: bool = False) -> Comparison:
    """Fit a sweep with what its design expects, and hold the two against each other.

    Zero time, verdict, advice and parasitic capacitance come from the elements of the exact circuit, fitted to the same
    sweep, where the design has elements and the circuit describes the sweep as well as two poles and a zero do; else
    from these. ``verdict.route`` says which, and a note why the circuit was set aside.

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
    circuit = None if design.elements is None else zero_by_circuit(fit, design)
    if isinstance(circuit, CircuitZero) and circuit.doubt is None:
        return _by_circuit(circuit, fit, designed_fit, design)
    return _by_behaviour(fit, designed_fit, design, circuit)


def _by_circuit(circuit: CircuitZero, fit: LoopFit, designed_fit: LoopFit | None, design: Design) -> Comparison:
    verdict = judge_circuit(circuit, fit, design)
    rows = comparison_rows(fit, designed_fit, design, verdict.window, trusted=describes(fit), verdict=verdict)
    return Comparison(
        design=design,
        fit=fit,
        designed_fit=designed_fit,
        elements=circuit.estimate,
        rows=rows,
        verdict=verdict,
        advice=advise_by_circuit(circuit, verdict, rows),
        parasitic=parasitics_by_circuit(circuit, design) or parasitics(fit, design),
        notes=comparison_notes(fit, design, rows, verdict),
    )


def _by_behaviour(
    fit: LoopFit, designed_fit: LoopFit | None, design: Design, circuit: CircuitZero | str | None
) -> Comparison:
    """circuit : in doubt; or why there is none; None where there are no elements"""
    elements: ElementEstimate | None = None
    others: list[Estimate] = []
    doubt = None
    if isinstance(circuit, CircuitZero):
        elements, doubt, other = circuit.estimate, circuit.doubt, circuit.of_other_set
        others = [] if other is None else [circuit.zero_time_s, other]
    else:
        doubt = circuit
    verdict = judge_nulling(fit, design, others=others)
    designed_zero_s = design.zero_time_s
    if designed_fit is not None and designed_fit.parameters.zero_time_s.value is not None:
        designed_zero_s = designed_fit.parameters.zero_time_s.value
    rows = comparison_rows(fit, designed_fit, design, verdict.window, trusted=describes(fit), verdict=verdict)
    return Comparison(
        design=design,
        fit=fit,
        designed_fit=designed_fit,
        elements=elements,
        rows=rows,
        verdict=verdict,
        advice=advise(verdict, design, designed_zero_s, fit=fit, rows=rows),
        parasitic=parasitics(fit, design),
        notes=comparison_notes(fit, design, rows, verdict, doubt=doubt),
    )
