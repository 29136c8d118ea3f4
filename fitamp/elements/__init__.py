"""Element values from sweeps: which one moved, by how much, and what follows. One door: `estimate_elements`."""

from fitamp.elements.circuit import Circuit, Parameter
from fitamp.elements.condition import Condition
from fitamp.elements.estimate import estimate_elements
from fitamp.elements.residual import information
from fitamp.elements.result import (
    DerivedQuantities,
    ElementEstimate,
    ElementNote,
    ElementNoteCode,
    ElementParasitics,
    EstimatedElement,
    SweepCheck,
)

__all__ = [
    "Circuit",
    "Condition",
    "DerivedQuantities",
    "ElementEstimate",
    "ElementNote",
    "ElementNoteCode",
    "ElementParasitics",
    "EstimatedElement",
    "Parameter",
    "SweepCheck",
    "estimate_elements",
    "information",
]
