"""fitamp: where the poles and the Miller zero of a two-stage amplifier are on silicon, how surely, and what to change.

    sweep = fitamp.read_sweep("bench7.csv")
    fit = fitamp.fit_sweep(sweep)
    comparison = fitamp.compare(sweep, fitamp.read_design("miller.toml"))

Names are loaded when first used, so that importing fitamp costs nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fitamp.amplifier import Elements
    from fitamp.comparison import Comparison, Nulling, compare
    from fitamp.conditioning.repeats import average_repeats
    from fitamp.conditioning.through import ThroughDelay, divided_by_through, through_delay
    from fitamp.design import Design, HalfPlane, read_design, write_design
    from fitamp.elements import (
        Condition,
        ElementEstimate,
        blame,
        estimate_elements,
        line_fits,
        load_range,
        predict,
        read_steps,
        restoring_resistor,
        write_estimated_design,
    )
    from fitamp.errors import DesignError, FitampError, FitError, InputError, SweepError, UsageError
    from fitamp.estimate import Estimate, Known
    from fitamp.findings import ElementFindings, findings_of
    from fitamp.fitting import DelayPrior, FarPolePrior, LoopFit, ZeroPlace, fit_sweep
    from fitamp.importers import read_sweep, read_sweeps, write_sweep
    from fitamp.margins import closed_loop_step
    from fitamp.margins import margins as loop_margins
    from fitamp.noise import estimate_noise, simulate_bench
    from fitamp.planning import Plan, PlannedSweep, Wanted, affordable_sweeps, plan
    from fitamp.sweep import NoiseLevels, Sign, Sweep
    from fitamp.transfer import Transfer

# Module, and after a colon the name there: a public name that is also a module's would become that module as soon as
# anything imports it.
_HOME = {
    "Comparison": "comparison",
    "Condition": "elements",
    "DelayPrior": "fitting",
    "Design": "design",
    "DesignError": "errors",
    "ElementEstimate": "elements",
    "ElementFindings": "findings",
    "Elements": "amplifier",
    "Estimate": "estimate",
    "FarPolePrior": "fitting",
    "FitError": "errors",
    "FitampError": "errors",
    "HalfPlane": "design",
    "InputError": "errors",
    "Known": "estimate",
    "LoopFit": "fitting",
    "NoiseLevels": "sweep",
    "Nulling": "comparison",
    "Plan": "planning",
    "PlannedSweep": "planning",
    "Sign": "sweep",
    "Sweep": "sweep",
    "SweepError": "errors",
    "ThroughDelay": "conditioning.through",
    "Transfer": "transfer",
    "UsageError": "errors",
    "Wanted": "planning",
    "ZeroPlace": "fitting",
    "affordable_sweeps": "planning",
    "average_repeats": "conditioning.repeats",
    "blame": "elements",
    "closed_loop_step": "margins",
    "compare": "comparison",
    "divided_by_through": "conditioning.through",
    "estimate_elements": "elements",
    "estimate_noise": "noise",
    "findings_of": "findings",
    "fit_sweep": "fitting",
    "line_fits": "elements",
    "load_range": "elements",
    "loop_margins": "margins:margins",
    "plan": "planning",
    "predict": "elements",
    "read_design": "design",
    "read_steps": "elements",
    "read_sweep": "importers",
    "read_sweeps": "importers",
    "restoring_resistor": "elements",
    "simulate_bench": "noise",
    "through_delay": "conditioning.through",
    "write_design": "design",
    "write_estimated_design": "elements",
    "write_sweep": "importers",
}

__version__ = "0.1.0"
__all__ = [
    "Comparison",
    "Condition",
    "DelayPrior",
    "Design",
    "DesignError",
    "ElementEstimate",
    "ElementFindings",
    "Elements",
    "Estimate",
    "FarPolePrior",
    "FitError",
    "FitampError",
    "HalfPlane",
    "InputError",
    "Known",
    "LoopFit",
    "NoiseLevels",
    "Nulling",
    "Plan",
    "PlannedSweep",
    "Sign",
    "Sweep",
    "SweepError",
    "ThroughDelay",
    "Transfer",
    "UsageError",
    "Wanted",
    "ZeroPlace",
    "affordable_sweeps",
    "average_repeats",
    "blame",
    "closed_loop_step",
    "compare",
    "divided_by_through",
    "estimate_elements",
    "estimate_noise",
    "findings_of",
    "fit_sweep",
    "line_fits",
    "load_range",
    "loop_margins",
    "plan",
    "predict",
    "read_design",
    "read_steps",
    "read_sweep",
    "read_sweeps",
    "restoring_resistor",
    "simulate_bench",
    "through_delay",
    "write_design",
    "write_estimated_design",
    "write_sweep",
]


def __getattr__(name: str) -> object:
    if name not in _HOME:
        raise AttributeError(f"module 'fitamp' has no attribute {name!r}")
    module, _, own_name = _HOME[name].partition(":")
    return getattr(import_module(f"fitamp.{module}"), own_name or name)


def __dir__() -> list[str]:
    return sorted((*__all__, "__version__"))
