"""Verdict, advice and parasitic capacitance from the circuit's elements, for a comparison of one sweep."""

from __future__ import annotations

from fitamp.comparison.circuit_zero import CircuitZero
from fitamp.comparison.parasitic import SEEN_BY_DATA, load_sentence
from fitamp.comparison.result import Advice, Nulling, Parasitic, Route, Row, Verdict
from fitamp.comparison.settling import what_settles_circuit
from fitamp.comparison.verdict import (
    advice_of_change,
    decided_sentence,
    open_sentence,
    place_among,
    window_of,
    with_broken_limits,
)
from fitamp.design import Design
from fitamp.estimate import NOT_KNOWN
from fitamp.fitting import LoopFit

__all__ = ["advise_by_circuit", "judge_circuit", "parasitics_by_circuit"]


def judge_circuit(found: CircuitZero, fit: LoopFit, design: Design) -> Verdict:
    """Verdict on the circuit's zero time, which is not in doubt."""
    window, zero_time = window_of(design), found.zero_time_s
    nulling, touched = place_among(zero_time, design, window)
    if nulling is Nulling.UNDECIDED:
        seen = open_sentence(zero_time, touched, window=window, design=design)
        reason = f"{seen}; {what_settles_circuit(found, fit, design)}"
    else:
        reason = decided_sentence(nulling, zero_time, window=window, design=design)
    return Verdict(
        nulling=nulling,
        reason=f"by the circuit, {reason}",
        route=Route.CIRCUIT,
        zero_time_s=zero_time,
        gm2_rz=found.gm2_rz,
        window=window,
    )


def advise_by_circuit(found: CircuitZero, verdict: Verdict, rows: tuple[Row, ...]) -> Advice:
    """Change of Rz by this part's own Cc, (τz_designed − τz)/Cc; other broken limits."""
    advice = advice_of_change(verdict, found.rz_change_ohm)
    change = found.rz_change_ohm.value
    if change is not None and found.rz_ohm + change < 0 and advice.sentence.startswith("lower"):
        advice = Advice(
            rz_change_ohm=found.rz_change_ohm,
            sentence="no resistor puts this part's zero at the designed place; gm2 or Cc has to change",
        )
    return with_broken_limits(advice, verdict, rows)


def parasitics_by_circuit(found: CircuitZero, design: Design) -> Parasitic | None:
    """Load and first-stage parasitic by the sweep; None where the design says that its load is exact."""
    load, extra = found.parasitics.load_total_f, found.parasitics.load_f
    if not (load.is_measured and extra.is_measured):
        return None
    first_stage = NOT_KNOWN
    if found.estimate.element("C1").informed > 1 - SEEN_BY_DATA:
        first_stage = found.parasitics.first_stage_f
    return Parasitic(
        load_total_f=load,
        load_f=extra,
        first_stage_f=first_stage,
        sentence=load_sentence(load, extra, first_stage, design),
    )
