"""The head of the pictures of an element estimate: verdict, the picture's own message, and what to do."""

from __future__ import annotations

from matplotlib.figure import Figure

from fitamp.elements import ElementNoteCode
from fitamp.findings import ElementFindings
from fitamp.plots.header import figure_with_verdict
from fitamp.report.elements_words import sweeps_name

__all__ = ["figure_with_message"]

# What would be hidden by a verdict alone.
_TAGS = {
    ElementNoteCode.PART_CHANGED: "A SWEEP STANDS APART",
    ElementNoteCode.CIRCUIT_INADEQUATE: "CIRCUIT DOES NOT FIT",
    ElementNoteCode.NOT_CONVERGED: "SEARCH DID NOT SETTLE",
    ElementNoteCode.TWO_VALLEYS: "TWO SOLUTIONS",
}


def figure_with_message(findings: ElementFindings, message: str, *, body_in: float) -> Figure:
    """A figure whose lower `body_in` inches are free, under the verdict, this picture's message and the advice."""
    codes = {note.code for note in findings.estimate.notes}
    return figure_with_verdict(
        findings.verdict.nulling,
        [words for code, words in _TAGS.items() if code in codes],
        broken=findings.broken_limits,
        names=(sweeps_name(findings), findings.design.file),
        reason=message,
        advice=findings.advice.sentence,
        body_in=body_in,
    )
