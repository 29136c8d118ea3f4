"""How a command hands its result over: table or JSON on stdout, files, a folder; each whole or not at all."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fitamp.report.as_json import dumps
from fitamp.report.files import refuse_existing, staged_directory, write_text

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["STDOUT", "deliver", "refuse_early", "write_folder"]

STDOUT = "-"


def refuse_early(args: argparse.Namespace) -> None:
    """Say that output exists before the work is done, not after.

    Raises
    ------
    UsageError
        When ``--out`` or ``--json`` names something that is there, without ``--force``.
    """
    if getattr(args, "out", None):
        refuse_existing(Path(args.out), force=args.force)
    if args.json and args.json != STDOUT:
        refuse_existing(Path(args.json), force=args.force)


def deliver(args: argparse.Namespace, record: Mapping[str, Any], text: str) -> None:
    """Print the table, or with ``--json -`` the record and nothing else; write the record to a named file."""
    if args.json == STDOUT:
        print(dumps(record))
        return
    if args.json:
        write_text(Path(args.json), dumps(record) + "\n", force=args.force)
    sys.stdout.write(text)
    if getattr(args, "out", None):
        print(f"pictures and numbers: {args.out}")


def write_folder(
    folder: Path,
    name: str,
    record: Mapping[str, Any],
    text: str,
    figures: Mapping[str, Figure],
    *,
    force: bool,
    tables: Mapping[str, str] | None = None,
) -> None:
    """Fill a folder with ``name.json``, ``name.txt``, pictures, and tables by file name.

    Raises
    ------
    UsageError
        When the folder is not empty and `force` is not given, or it cannot be written.
    """
    from fitamp.plots import save_figures

    with staged_directory(folder, force=force) as staging:
        write_text(staging / f"{name}.json", dumps(record) + "\n", force=False)
        write_text(staging / f"{name}.txt", text, force=False)
        for file, table in (tables or {}).items():
            write_text(staging / file, table, force=False)
        save_figures(figures, staging)
