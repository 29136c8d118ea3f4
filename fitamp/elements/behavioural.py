"""Two poles and a zero for each sweep, fitted with what the design expects under the sweep's condition."""

from __future__ import annotations

from dataclasses import replace

from fitamp.design import Design
from fitamp.elements.condition import Condition
from fitamp.fitting import LoopFit, fit_sweep
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["behavioural_fit", "design_under"]


def design_under(design: Design, condition: Condition) -> Design:
    """The design with the load and the resistance that a condition adds."""
    if design.elements is None:
        return design
    elements = design.elements
    added = replace(
        elements, CL=elements.CL + condition.load_added_f, Rz=max(elements.Rz + condition.rz_added_ohm, 0.0)
    )
    return replace(design, elements=added)


def behavioural_fit(
    sweep: Sweep, design: Design, condition: Condition, *, noise: NoiseLevels | None = None, keep_all: bool = False
) -> LoopFit:
    """Fit two poles and a zero with the far pole, delay and known factor of the design under this condition.

    Raises
    ------
    FitError
        As `fit_sweep`.
    """
    # Here, because a comparison is made of element estimates too, and would import this package in turn.
    from fitamp.comparison.expectation import expectation

    arguments = expectation(design_under(design, condition)).as_arguments()
    return fit_sweep(sweep, noise=noise, keep_all=keep_all, **arguments)
