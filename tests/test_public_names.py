"""The public surface changes on purpose only."""

from __future__ import annotations

import subprocess
import sys
from importlib import import_module
from pathlib import Path

import pytest

import fitamp

ROOT = Path(__file__).resolve().parent.parent

PUBLIC = {
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
}


def test_all_is_exactly_the_public_names_in_order() -> None:
    assert set(fitamp.__all__) == PUBLIC
    assert fitamp.__all__ == sorted(fitamp.__all__)


def test_dir_is_the_public_names_and_the_version() -> None:
    assert dir(fitamp) == sorted(PUBLIC | {"__version__"})


@pytest.mark.parametrize("name", sorted(PUBLIC))
def test_every_name_loads_and_is_what_its_module_has(name: str) -> None:
    value = getattr(fitamp, name)
    own_name = {"loop_margins": "margins"}.get(name, name)
    assert value.__name__ == own_name
    assert value.__module__.startswith("fitamp.")
    assert value.__doc__
    assert getattr(import_module(value.__module__), own_name) is value


def test_no_public_name_is_that_of_a_module() -> None:
    # The import system puts every module that is loaded into its package, and so in the place of such a name.
    modules = {path.stem for path in Path(fitamp.__file__).parent.iterdir()}
    assert not PUBLIC & modules


def test_an_unknown_name_is_an_attribute_error() -> None:
    unknown = "fit_everything"
    with pytest.raises(AttributeError, match="module 'fitamp' has no attribute 'fit_everything'"):
        getattr(fitamp, unknown)


def test_errors_carry_the_exit_codes_of_the_command_line() -> None:
    assert [error.exit_code for error in (fitamp.UsageError, fitamp.InputError, fitamp.FitError)] == [2, 3, 4]
    assert fitamp.SweepError.exit_code == fitamp.DesignError.exit_code == 3
    assert issubclass(fitamp.UsageError, fitamp.FitampError)


def test_importing_costs_nothing_heavy() -> None:
    code = (
        "import sys, fitamp, fitamp.cli; fitamp.cli.build_parser(); "
        "print(sorted({'numpy', 'scipy', 'pandas', 'matplotlib', 'lmfit', 'skrf', 'rich'} & set(sys.modules)))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, check=True, text=True, encoding="utf-8", cwd=ROOT
    )
    assert done.stdout.strip() == "[]"
