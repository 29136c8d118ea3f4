"""What tests of several folders share: the shipped examples, each compared once."""

from __future__ import annotations

from pathlib import Path

import pytest

from fitamp.comparison import Comparison, compare
from fitamp.design import read_design
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
