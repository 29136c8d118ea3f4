"""What `fitamp elements` does, once parsed. Errors travel as FitampError to `fitamp.cli`."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from fitamp.delivery import deliver, refuse_early, write_folder
from fitamp.design import Design, read_design
from fitamp.elements import Condition, ElementEstimate, estimate_elements, estimated_design_text, read_steps
from fitamp.errors import FitError, InputError, UsageError
from fitamp.findings import ElementFindings, findings_of
from fitamp.importers import read_sweep
from fitamp.measured import Measured, Reading, measured
from fitamp.report.conditions import through_as_dict
from fitamp.report.console import printable
from fitamp.report.elements_json import elements_as_dict
from fitamp.report.elements_text import elements_csv, elements_text
from fitamp.report.files import refuse_existing, write_text
from fitamp.sweep import Sign
from fitamp.units import parse_quantity

__all__ = ["elements", "findings_of_steps", "write_findings"]


def elements(args: argparse.Namespace) -> int:
    """`fitamp elements --design D.toml FILE… [--steps S.csv]`: element values, and what moved poles and zero."""
    refuse_early(args)
    if args.design_out:
        refuse_existing(Path(args.design_out), force=args.force)
    wanted_deg = None if args.margin_wanted is None else _margin(args.margin_wanted)
    named = _named_sweeps(args)
    design = read_design(args.design)
    taken = [_measured(args, file) for file, _ in named]
    on_bench = [one.on_bench_of(design) for one in taken]
    estimate = estimate_elements(
        [sweep for sweep, _ in on_bench],
        on_bench[0][1],
        conditions=[condition for _, condition in named],
        under_test=[] if args.under_test is None else args.under_test.replace(",", " ").split(),
        keep_all=args.keep_all,
    )
    findings = findings_of(estimate, wanted_deg=wanted_deg, curves=bool(args.out or args.json))
    through = taken[0].through
    record = elements_as_dict(findings) | {"through": None if through is None else through_as_dict(through)}
    text = elements_text(findings)
    if args.out:
        write_findings(findings, record, text, Path(args.out), force=args.force)
    if args.design_out:
        write_text(Path(args.design_out), estimated_design_text(estimate), force=args.force)
        text += f"design file of the part as estimated: {printable(args.design_out)}\n"
    deliver(args, record, text)
    return _trusted(estimate)


def findings_of_steps(steps_file: Path, design: Design) -> ElementFindings:
    """What the sweeps of a steps file say, read as they are, with curves."""
    steps = read_steps(steps_file)
    sweeps = [read_sweep(step.path) for step in steps]
    return findings_of(estimate_elements(sweeps, design, conditions=[step.condition for step in steps]))


def write_findings(
    findings: ElementFindings, record: Mapping[str, Any], text: str, folder: Path, *, force: bool
) -> None:
    """Pictures, JSON, text and table of a part whose elements were estimated."""
    from fitamp.plots.elements import element_figures

    tables = {"elements.csv": elements_csv(findings)}
    write_folder(folder, "elements", record, text, element_figures(findings), force=force, tables=tables)


def _named_sweeps(args: argparse.Namespace) -> list[tuple[str, Condition]]:
    """Every sweep once, with what was added: those named as files have nothing added unless the steps file says so."""
    steps = () if args.steps is None else read_steps(args.steps)
    for step in steps:
        if not step.path.is_file():
            raise InputError(
                f"{args.steps}, line {step.line}: {step.path}: no such file; names are relative to the steps file"
            )
    stepped = {step.path.resolve() for step in steps}
    named: list[tuple[str, Condition]] = []
    seen: set[Path] = set()
    for file in args.files:
        place = Path(file).resolve()
        if place in seen:
            raise UsageError(f"{file}: is named twice; a sweep counts once")
        seen.add(place)
        if place not in stepped:
            named.append((file, Condition()))
    named += [(str(step.path), step.condition) for step in steps]
    if not named:
        raise UsageError("no sweep is named; give sweep files, or --steps with a file that says what was added in each")
    return named


def _measured(args: argparse.Namespace, file: str) -> Measured:
    sign = Sign(args.sign) if args.sign else None
    reading = Reading(columns=args.columns, trace=args.trace, sign=sign, are_repeats=args.repeats, sweep=args.sweep)
    return measured([file], reading, noise=args.noise, delay=args.delay, through=args.through, keep_all=args.keep_all)


def _margin(text: str) -> float:
    try:
        return parse_quantity(text, "deg")
    except ValueError as error:
        raise UsageError(f'--margin-wanted: {error}; write it as in --margin-wanted "60 deg"') from None


def _trusted(estimate: ElementEstimate) -> int:
    """Exit code of an estimate that was delivered: 4, and a line to say so, where it is not to be trusted."""
    if estimate.is_trustworthy:
        return 0
    why = estimate.notes[0].message if estimate.notes else "the sweeps leave too much open"
    print(f"fitamp: {printable(f'not trustworthy: {why}')}", file=sys.stderr)
    return FitError.exit_code
