"""What `fitamp loop` does: raw records to a sweep of the loop gain that every other command reads."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterator
from dataclasses import asdict, dataclass
from pathlib import Path, PurePath
from typing import Any

from fitamp.delivery import STDOUT
from fitamp.errors import UsageError
from fitamp.importers import read_sweep
from fitamp.importers.write import sweep_csv
from fitamp.loopgain import (
    DoubleInjection,
    Termination,
    double_injection,
    read_receivers,
    read_two_port_loop,
)
from fitamp.loopgain.receivers import RECEIVER_EXAMPLE
from fitamp.report.as_json import dumps, sweep_record
from fitamp.report.conditions import caution_records
from fitamp.report.console import printable
from fitamp.report.files import refuse_existing, write_text
from fitamp.report.reading import sweep_text
from fitamp.sweep import Concern, Sign, Sweep

__all__ = ["loop"]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Made:
    """The loop gain, how it was come by, and what two injections told beside it."""

    route: str
    sweep: Sweep
    double: DoubleInjection | None = None


def loop(args: argparse.Namespace) -> int:
    """`fitamp loop FILE --out T.csv`, or with `--voltage` and `--current` in place of the file."""
    _refuse_mixed(args)
    outputs = [Path(name) for name in (args.out, args.json) if name and name != STDOUT]
    _refuse_own_input(args, outputs)
    for path in outputs:
        refuse_existing(path, force=args.force)
    made = _made(args)
    write_text(Path(args.out), sweep_csv(made.sweep, _comments(made.sweep)), force=args.force)
    record = _record(made, args.out)
    if args.json == STDOUT:
        print(dumps(record))
        return 0
    if args.json:
        write_text(Path(args.json), dumps(record) + "\n", force=args.force)
    sys.stdout.write(_text(made, args.out))
    return 0


def _made(args: argparse.Namespace) -> _Made:
    sign = Sign(args.sign) if args.sign else None
    if args.voltage:
        records = [
            read_sweep(file, columns=args.columns, trace=args.trace, sign=sign, sweep=args.sweep)
            for file in (args.voltage, args.current)
        ]
        double = double_injection(*records)
        return _Made(route="double-injection", sweep=double.sweep, double=double)
    if _is_two_port(args.file):
        stated = {
            name: Termination.parse(text) for name in ("load", "source") if (text := getattr(args, name)) is not None
        }
        if "source" in stated and stated["source"].is_loop:
            stated.setdefault("load", Termination())
        return _Made(route="two-port", sweep=read_two_port_loop(args.file, sign=sign, **stated))
    return _Made(route="receivers", sweep=read_receivers(args.file, columns=args.columns, sign=sign, sweep=args.sweep))


def _is_two_port(file: str) -> bool:
    return PurePath(file.lower().removesuffix(".gz")).suffix == ".s2p"


def _refuse_mixed(args: argparse.Namespace) -> None:
    """Options that do not go together, or lack each other."""
    if bool(args.voltage) != bool(args.current):
        missing = "--current" if args.voltage else "--voltage"
        raise UsageError(f"double injection needs both records; name the other one with {missing}")
    if bool(args.file) == bool(args.voltage):
        have = "a file as well as --voltage and --current" if args.file else "no record"
        raise UsageError(f"{have}; name one file, or two with --voltage and --current")
    if args.voltage and Path(args.voltage).resolve() == Path(args.current).resolve():
        raise UsageError(f"{args.voltage}: is named for both injections; name the record of each")
    is_two_port = bool(args.file) and _is_two_port(args.file)
    if (args.load or args.source) and not is_two_port:
        raise UsageError("--load and --source are for the opened loop as a two-port (.s2p)")
    if is_two_port and (args.columns or args.trace or args.sweep):
        raise UsageError(
            f"{args.file}: all four S-parameters count; leave out --columns, --trace and --sweep (where one trace is "
            "the loop gain, the other commands read it as it is)"
        )
    if args.file and not is_two_port:
        if args.trace:
            raise UsageError("--trace is for Touchstone records with --voltage and --current")
        if not args.columns:
            raise UsageError(
                f"{args.file}: say where the error and the return receiver are, as in --columns {RECEIVER_EXAMPLE}"
            )


def _refuse_own_input(args: argparse.Namespace, outputs: list[Path]) -> None:
    """With --force, too: a record that is written over is lost."""
    if args.out == STDOUT:
        raise UsageError("--out is for a file; name one, such as T.csv")
    inputs = {Path(file).resolve() for file in (args.file, args.voltage, args.current) if file}
    seen: set[Path] = set()
    for path in outputs:
        if path.resolve() in inputs:
            raise UsageError(f"{path}: is one of the records; name another file for the output")
        if path.resolve() in seen:
            raise UsageError(f"{path}: is named for both outputs; name two files")
        seen.add(path.resolve())


def _comments(sweep: Sweep) -> Iterator[str]:
    """Where the loop gain came from and what was decided, a line each."""
    origin = sweep.origin
    if origin.sha256:
        yield f"sha256 of the source: {origin.sha256}"
    if origin.trace:
        yield f"from: {origin.trace}"
    for decision in sweep.decisions:
        caution = "CAUTION, " if decision.concern is Concern.CAUTION else ""
        yield f"{caution}{decision.topic}: {decision.choice} ({decision.reason})"
    for point in sweep.left_out:
        yield f"left out: {point.f_hz!r} Hz ({point.reason})"
    for note in origin.notes:
        yield f"note: {note}"


def _record(made: _Made, written: str) -> dict[str, Any]:
    """What was done (schema fitamp/loop/1)."""
    record: dict[str, Any] = {
        "schema": "fitamp/loop/1",
        "route": made.route,
        "written": written,
        "sweep": sweep_record(made.sweep),
        "warnings": caution_records(made.sweep),
        "impedance_ratio": None,
        "one_injection_alone": None,
    }
    if made.double is not None:
        span = made.double.impedance_range
        record["impedance_ratio"] = None if span is None else {"smallest": span[0], "largest": span[1]}
        record["one_injection_alone"] = [
            asdict(found) | {"injection": found.injection.value} for found in made.double.alone
        ]
    return record


def _text(made: _Made, written: str) -> str:
    lines = [sweep_text(made.sweep)]
    lines += [f"beware: {printable(one['message'])}\n" for one in caution_records(made.sweep)]
    lines.append(f"loop gain: {printable(written)}\n")
    return "".join(lines)
