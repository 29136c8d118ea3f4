"""What each command does, once parsed. Errors travel as FitampError to `fitamp.cli`."""

from __future__ import annotations

import argparse
import csv
import io
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from fitamp.comparison import Comparison
from fitamp.comparison import compare as compare_sweep
from fitamp.conditioning.repeats import average_repeats
from fitamp.delivery import STDOUT, deliver, refuse_early, write_folder
from fitamp.design import read_design
from fitamp.errors import FitError, InputError, UsageError
from fitamp.findings import ElementFindings
from fitamp.fitting import LoopFit, fit_sweep
from fitamp.importers import read_sweep
from fitamp.measured import Measured, Reading, measured
from fitamp.report.as_json import comparison_as_dict, dumps, fit_as_dict, sweep_as_dict
from fitamp.report.conditions import through_as_dict
from fitamp.report.files import refuse_existing, write_text
from fitamp.report.reading import sweep_text
from fitamp.report.tables import comparison_text, fit_text, printable
from fitamp.sweep import Sign, Sweep

__all__ = ["compare", "demo", "fit", "read", "template"]


def read(args: argparse.Namespace) -> int:
    """`fitamp read FILE…`: what can be shown of the good files, and one line of error for each of the others."""
    refuse_early(args)
    sweeps: list[Sweep] = []
    errors: list[dict[str, str]] = []
    places: list[tuple[str, ...]] = []
    reading = _reading(args)
    if reading.are_repeats:
        average = average_repeats(reading.sweeps(args.files))
        deliver(
            args,
            {"schema": "fitamp/read/1", "sweeps": [sweep_as_dict(average)], "errors": []},
            sweep_text(average, plot=args.plot),
        )
        return 0
    for file in args.files:
        try:
            sweeps.extend(reading.sweeps([file]))
        except InputError as error:
            if len(args.files) == 1:
                raise
            errors.append({"file": file, "message": printable(str(error))})
            places.append(error.excerpt)
    for bad, place in zip(errors, places, strict=True):
        print("\n".join([f"fitamp: {bad['message']}", *place]), file=sys.stderr)
    code = InputError.exit_code if errors else 0
    record: dict[str, Any] = {"schema": "fitamp/read/1"}
    record |= {"sweeps": [sweep_as_dict(sweep) for sweep in sweeps], "errors": errors}
    if sweeps:
        deliver(args, record, "\n".join(sweep_text(sweep, plot=args.plot) for sweep in sweeps))
    elif args.json == STDOUT:
        message = f"none of the {len(errors)} files can be read"
        print(dumps(record | {"schema": "fitamp/error/1", "error": {"message": message, "exit_code": code}}))
    return code


def fit(args: argparse.Namespace) -> int:
    """`fitamp fit FILE…`."""
    refuse_early(args)
    taken = _measured(args)
    result = fit_sweep(taken.sweep, keep_all=args.keep_all, **taken.priors)
    record, text = fit_as_dict(result) | _through(taken), fit_text(result)
    if args.out:
        from fitamp.plots import fit_figures

        write_folder(Path(args.out), "fit", record, text, fit_figures(result), force=args.force)
    deliver(args, record, text)
    return _trusted(result)


def compare(args: argparse.Namespace) -> int:
    """`fitamp compare FILE… --design D.toml`."""
    refuse_early(args)
    design = read_design(args.design)
    taken = _measured(args)
    sweep, design = taken.on_bench_of(design)
    result = compare_sweep(sweep, design, keep_all=args.keep_all)
    record, text = comparison_as_dict(result) | _through(taken), comparison_text(result)
    if args.out:
        _write_comparison(result, record, text, Path(args.out), force=args.force)
    deliver(args, record, text)
    return 0 if result.is_described else _trusted(result.fit)


def template(args: argparse.Namespace) -> int:
    """`fitamp template`: a design file to fill in."""
    from fitamp.design.template import design_template

    if not args.out:
        sys.stdout.write(design_template())
        return 0
    write_text(Path(args.out), design_template(), force=args.force)
    print(f"design file to fill in: {printable(args.out)}")
    return 0


def demo(args: argparse.Namespace) -> int:
    """`fitamp demo`: the main job on every example part, with its pictures."""
    from fitamp.elements_command import findings_of_steps, write_findings
    from fitamp.report.elements_json import elements_as_dict
    from fitamp.report.elements_text import elements_text

    examples = _examples(args.examples)
    out = Path(args.out)
    design = read_design(examples / "line_buffer.toml")
    parts = sorted(path for path in examples.iterdir() if path.name.startswith("part_") and path.is_file())
    stepped = sorted(path.parent for path in examples.glob("part_*/steps.csv"))
    for part in (*parts, *stepped):
        refuse_existing(out / part.stem, force=args.force)
    print("Invented parts of an invented chip, each held against its design file.\n")
    for part in parts:
        result = compare_sweep(read_sweep(part), design)
        record, text = comparison_as_dict(result), comparison_text(result)
        _write_comparison(result, record, text, out / part.stem, force=args.force)
        _say_verdict(part.name, result)
    for part in stepped:
        findings = findings_of_steps(part / "steps.csv", design)
        record, text = elements_as_dict(findings) | {"through": None}, elements_text(findings)
        write_findings(findings, record, text, out / part.stem, force=args.force)
        _say_verdict(part.name, findings)
    print(f"Pictures and numbers of each part are in {out.resolve()}")
    for part in parts:
        print(f"  {Path(out.name) / part.stem / 'loop.png'}")
    for part in stepped:
        print(f"  {Path(out.name) / part.stem / 'elements.png'}")
    return 0


def _say_verdict(name: str, result: Comparison | ElementFindings) -> None:
    print(f"{printable(name)}\n  {result.verdict.nulling.value}: {result.verdict.reason}")
    print(f"  what to do: {result.advice.sentence}\n")


def _trusted(result: LoopFit) -> int:
    """Exit code of a fit that was delivered: 4, and a line to say so, where the model does not describe the sweep."""
    if result.adequacy.adequate:
        return 0
    file = printable(result.sweep.origin.file)
    print(
        f"fitamp: {file}: not trustworthy, {result.adequacy.sentence}; look at the residuals for what the "
        "model lacks, or bad points",
        file=sys.stderr,
    )
    return FitError.exit_code


def _examples(given: str | None) -> Path:
    here = Path(__file__).resolve().parent.parent / "data_examples"
    folder = Path(given) if given else next((f for f in (Path("data_examples"), here) if f.is_dir()), here)
    if not (folder / "line_buffer.toml").is_file():
        raise UsageError(
            f"{folder}: no example files here; name their folder with --examples (data_examples of a checkout)"
        )
    return folder


def _reading(args: argparse.Namespace) -> Reading:
    sign = Sign(args.sign) if args.sign else None
    return Reading(columns=args.columns, trace=args.trace, sign=sign, are_repeats=args.repeats, sweep=args.sweep)


def _measured(args: argparse.Namespace) -> Measured:
    return measured(
        args.files,
        _reading(args),
        noise=args.noise,
        delay=args.delay,
        through=args.through,
        keep_all=args.keep_all,
    )


def _through(taken: Measured) -> dict[str, Any]:
    """What the record says of a through sweep."""
    return {"through": None if taken.through is None else through_as_dict(taken.through)}


def _write_comparison(result: Comparison, record: Mapping[str, Any], text: str, folder: Path, *, force: bool) -> None:
    from fitamp.plots import comparison_figures

    write_folder(
        folder,
        "comparison",
        record,
        text,
        comparison_figures(result),
        force=force,
        tables={"comparison.csv": _table(record)},
    )


def _table(record: Mapping[str, Any]) -> str:
    """The comparison rows as CSV; an unknown cell is empty."""
    columns = (
        "quantity",
        "designed",
        "designed_as_measured",
        "measured",
        "stderr",
        "deviation",
        "sigma",
        "low",
        "high",
    )
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow((*columns, "inside"))
    for row in record["comparison"]:
        inside = {True: "yes", False: "no", None: ""}[row["inside"]]
        writer.writerow([*("" if row[name] is None else row[name] for name in columns), inside])
    return stream.getvalue()
