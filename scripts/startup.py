#!/usr/bin/env python3
"""How long the commands take against what they cannot avoid: ratios within one run, for noisy machines.

    python scripts/startup.py [--runs 7]

`fitamp --help` is held against importing argparse; `fitamp compare` with pictures against importing numpy,
scipy.optimize, lmfit and matplotlib.pyplot plus the drawing itself. Each is run in turn, several times; medians are
compared.
"""

from __future__ import annotations

import argparse
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

EXAMPLES = Path(__file__).resolve().parent.parent / "data_examples"
SWEEP, DESIGN = EXAMPLES / "part_a_healthy.csv", EXAMPLES / "line_buffer.toml"
STAGES = f"""
import time
marks = [("", time.perf_counter())]
def mark(name):
    marks.append((name, time.perf_counter()))
import numpy, scipy.optimize, lmfit; mark("import numpy, scipy.optimize, lmfit")
import fitamp.commands, fitamp.plots; mark("import the rest (fitamp, matplotlib's figures, scikit-rf's part)")
sweep = fitamp.read_sweep({str(SWEEP)!r}); mark("read the sweep")
design = fitamp.read_design({str(DESIGN)!r}); mark("read the design")
result = fitamp.compare(sweep, design); mark("fit and compare")
figures = fitamp.plots.comparison_figures(result)
import pathlib, tempfile
with tempfile.TemporaryDirectory() as folder:
    fitamp.plots.save_figures(figures, pathlib.Path(folder)); mark("draw and save the pictures")
for (_, before), (name, after) in zip(marks, marks[1:]):
    print(f"{{after - before:.4f}} {{name}}")
"""


def seconds(command: Sequence[str]) -> float:
    """Wall time of a process that must succeed."""
    start = time.perf_counter()
    subprocess.run([sys.executable, *command], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def stages() -> dict[str, float]:
    """Seconds of each stage of a comparison in one fresh process."""
    done = subprocess.run([sys.executable, "-c", STAGES], check=True, capture_output=True, text=True, encoding="utf-8")
    pairs = (line.split(" ", 1) for line in done.stdout.splitlines())
    return {name: float(number) for number, name in pairs}


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--runs", type=int, default=7)
    runs: int = parser.parse_args().runs
    imports = "import numpy, scipy.optimize, lmfit, matplotlib.pyplot"
    with tempfile.TemporaryDirectory() as folder:
        compare = ["compare", str(SWEEP), "--design", str(DESIGN), "--out", f"{folder}/out", "--force"]
        commands = {
            "import argparse": ["-c", "import argparse"],
            "fitamp --help": ["-m", "fitamp", "--help"],
            "bare imports": ["-c", imports],
            "fitamp compare --out": ["-m", "fitamp", *compare],
        }
        taken: dict[str, list[float]] = {name: [] for name in commands}
        detail: list[dict[str, float]] = []
        for _ in range(runs + 1):
            for name, command in commands.items():
                taken[name].append(seconds(command))
            detail.append(stages())
    # The first round warms the file cache and the compiled modules.
    medians = {name: statistics.median(values[1:]) for name, values in taken.items()}
    parts = {name: statistics.median(stage[name] for stage in detail[1:]) for name in detail[0]}
    drawing = parts["draw and save the pictures"]
    for name, median in medians.items():
        print(f"{median:7.3f} s  {name}")
    print(f"{medians['fitamp --help'] / medians['import argparse']:7.2f}    fitamp --help over import argparse")
    bare = medians["bare imports"] + drawing
    print(f"{medians['fitamp compare --out'] / bare:7.2f}    fitamp compare --out over bare imports and drawing")
    print("where a comparison's time goes:")
    for name, median in parts.items():
        print(f"{median:7.3f} s  {name}")


if __name__ == "__main__":
    main()
