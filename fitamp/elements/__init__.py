"""Element values from sweeps: which one moved, by how much, and what follows. One door: `estimate_elements`."""

from fitamp.elements.advice import LoadRange, RestoringResistor, load_range, restoring_resistor
from fitamp.elements.attribution import Blame, Contribution, QuantityBlame, blame
from fitamp.elements.circuit import Circuit, Parameter
from fitamp.elements.condition import Condition
from fitamp.elements.estimate import estimate_elements
from fitamp.elements.lines import Line, LineFit, LineKind, line_fits
from fitamp.elements.posterior import informed_shares
from fitamp.elements.prediction import Against, Band, Prediction, predict, resistors_about
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
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
from fitamp.elements.silicon import estimated_design, estimated_design_text, write_estimated_design
from fitamp.elements.steps import Step, read_steps

__all__ = [
    "Against",
    "Band",
    "Blame",
    "Circuit",
    "Condition",
    "Contribution",
    "DerivedQuantities",
    "ElementEstimate",
    "ElementNote",
    "ElementNoteCode",
    "ElementParasitics",
    "EstimatedElement",
    "Line",
    "LineFit",
    "LineKind",
    "LoadRange",
    "Parameter",
    "Prediction",
    "Quantity",
    "QuantityBlame",
    "RestoringResistor",
    "Step",
    "SweepCheck",
    "blame",
    "by_vector",
    "estimate_elements",
    "estimated_design",
    "estimated_design_text",
    "information",
    "informed_shares",
    "line_fits",
    "load_range",
    "predict",
    "quantities_and_slopes",
    "read_steps",
    "resistors_about",
    "restoring_resistor",
    "write_estimated_design",
]
