"""What tests of several folders share: the shipped examples, each compared once."""

from __future__ import annotations

from pathlib import Path

import pytest

from fitamp.comparison import Comparison, compare
from fitamp.design import read_design
from fitamp.elements import estimate_elements, read_steps
from fitamp.findings import ElementFindings, findings_of
from fitamp.importers import read_sweep

EXAMPLES = Path(__file__).resolve().parent.parent / "data_examples"


@pytest.fixture(scope="session")
def examples() -> Path:
    """Folder of the shipped examples."""
    return EXAMPLES


@pytest.fixture(scope="session")
def compared_examples() -> dict[str, Comparison]:
    """Every example part against the example design, by the letter in its name."""
    design = read_design(EXAMPLES / "line_buffer.toml")
    parts = sorted(EXAMPLES.glob("part_*.*"))
    return {part.name.removeprefix("part_")[0]: compare(read_sweep(part), design) for part in parts}


@pytest.fixture(scope="session")
def stepped_example() -> ElementFindings:
    """Everything that the example with added loads and resistances says."""
    design, steps = read_design(EXAMPLES / "line_buffer.toml"), read_steps(EXAMPLES / "part_f_stepped" / "steps.csv")
    sweeps = [read_sweep(step.path) for step in steps]
    return findings_of(estimate_elements(sweeps, design, conditions=[step.condition for step in steps]))
