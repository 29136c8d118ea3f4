"""What `fitamp plan` does, once parsed. Errors travel as FitampError to `fitamp.cli`."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path

from fitamp.delivery import deliver, refuse_early, write_folder
from fitamp.design import Design, read_design
from fitamp.elements import Condition, ElementEstimate, estimate_elements, read_steps
from fitamp.errors import UsageError
from fitamp.measured import Reading
from fitamp.options import parse_noise
from fitamp.planning import PlannedSweep, affordable_sweeps, usual_loads_f
from fitamp.planning import plan as make_plan
from fitamp.planning.asked import parse_band, parse_list, parse_wanted
from fitamp.report.plan_json import plan_as_dict
from fitamp.report.plan_text import plan_table, plan_text, steps_table
from fitamp.sweep import NoiseLevels, Sign

__all__ = ["plan"]

# A steps file is told from a sweep by its header, which stands within so many bytes.
HEADER_BYTES = 65536


def plan(args: argparse.Namespace) -> int:
    """`fitamp plan --design D.toml`: the best sweeps of a list and what they will tell."""
    refuse_early(args)
    design = read_design(args.design)
    noise = None if args.noise is None else parse_noise(args.noise)
    wanted = tuple(wish for text in args.want or () for wish in parse_wanted(text))
    bands = [parse_band(words) for words in args.band or ()]
    loads = usual_loads_f(design) if args.loads is None else parse_list(args.loads, "F", option="--loads")
    resistances = (0.0,) if args.resistances is None else parse_list(args.resistances, "Ω", option="--resistances")
    under_test = [] if args.under_test is None else args.under_test.replace(",", " ").split()
    have = None if args.have is None else _have(args, design, noise, under_test)
    if have is not None and not bands:
        freq_hz = have.sweeps[0].freq_hz
        bands = [(float(freq_hz[0]), float(freq_hz[-1]))]
    candidates: tuple[PlannedSweep, ...] = affordable_sweeps(
        design,
        loads_f=loads,
        resistances_ohm=resistances,
        bands_hz=bands or None,
        points=args.points,
        averages=args.averages,
    )
    if have is not None:
        taken = {(one.load_added_f, one.rz_added_ohm) for one in have.conditions}
        candidates = tuple(
            one for one in candidates if (one.condition.load_added_f, one.condition.rz_added_ohm) not in taken
        )
        if not candidates:
            raise UsageError(
                f"every sweep on the list is in {args.have} already; list further --loads or --resistances"
            )
    result = make_plan(
        design,
        candidates,
        count=args.sweeps,
        wanted=wanted,
        noise=noise,
        have=have,
        under_test=under_test if have is None else (),
        parts_drawn=args.parts,
        seed=args.seed,
    )
    record, text = plan_as_dict(result), plan_text(result)
    if args.out:
        from fitamp.plots.plan import plan_figure

        tables = {"plan.csv": plan_table(result), "steps.csv": steps_table(result)}
        write_folder(
            Path(args.out), "plan", record, text, {"plan": plan_figure(result)}, force=args.force, tables=tables
        )
    deliver(args, record, text)
    return 0


def _have(
    args: argparse.Namespace, design: Design, noise: NoiseLevels | None, under_test: Sequence[str]
) -> ElementEstimate:
    """Elements from the sweeps already taken: those of a steps file, or one sweep with nothing added."""
    sign = Sign(args.sign) if args.sign else None
    reading = Reading(columns=args.columns, trace=args.trace, sign=sign)
    if not _is_steps_file(Path(args.have)):
        sweeps, conditions = reading.sweeps([args.have]), [Condition()]
    else:
        steps = read_steps(args.have)
        sweeps = reading.sweeps([str(step.path) for step in steps])
        conditions = [step.condition for step in steps]
    return estimate_elements(sweeps, design, conditions=conditions, noise=noise, under_test=under_test)


def _is_steps_file(path: Path) -> bool:
    """Whether the header has a column "file"; what cannot be read is left to the reader of sweeps to refuse."""
    try:
        with path.open("rb") as stream:
            text = stream.read(HEADER_BYTES).decode("utf-8-sig", errors="replace")
    except (OSError, ValueError):
        return False
    header = next((line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")), "")
    return any(
        cell.strip().strip('"').lower() == "file" for cell in header.replace(";", ",").replace("\t", ",").split(",")
    )
