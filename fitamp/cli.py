"""The command line: parse, call the library, print, return an exit code.

0 done · 1 internal fault · 2 usage · 3 unusable input · 4 no trustworthy result. Results go to stdout, errors as one
line to stderr. Nothing heavy is imported before a command runs.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Sequence
from typing import NoReturn

from fitamp import __version__
from fitamp.errors import FitampError, UsageError

__all__ = ["build_parser", "main", "run"]

EXIT_INTERNAL = 1
EXIT_INTERRUPTED = 130


class _Parser(argparse.ArgumentParser):
    """argparse with one-line errors, as everywhere in fitamp."""

    def error(self, message: str) -> NoReturn:
        raise UsageError(f"{message}; see {self.prog} --help")


def build_parser() -> argparse.ArgumentParser:
    """The parser of all commands."""
    parser = _Parser(
        prog="fitamp",
        description="Where the poles and the Miller zero of a two-stage amplifier are on silicon, how surely, "
        "and what to change.",
        epilog="Exit codes: 0 done, 1 internal fault, 2 usage, 3 unusable input, 4 no trustworthy result.",
    )
    parser.add_argument("--version", action="version", version=f"fitamp {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True, parser_class=_Parser)

    read = commands.add_parser("read", help="show what is understood of sweep files")
    read.add_argument("files", nargs="+", metavar="FILE", help="CSV or Touchstone sweep")
    _reading_options(read)
    _output_options(read, folder=False)
    read.set_defaults(action="read")

    fit = commands.add_parser("fit", help="fit two poles and one zero to a sweep")
    fit.add_argument("file", metavar="FILE", help="CSV or Touchstone sweep of the loop gain")
    _reading_options(fit)
    _output_options(fit, folder=True)
    fit.set_defaults(action="fit")

    compare = commands.add_parser("compare", help="hold a sweep against its design: verdict, numbers, pictures")
    compare.add_argument("file", metavar="FILE", help="CSV or Touchstone sweep of the loop gain")
    compare.add_argument("--design", required=True, metavar="D.toml", help="design file")
    _reading_options(compare)
    _output_options(compare, folder=True)
    compare.set_defaults(action="compare")

    demo = commands.add_parser("demo", help="run the main job on the invented example parts")
    demo.add_argument("--examples", metavar="DIR", help="folder of the examples (default: data_examples)")
    demo.add_argument("--out", metavar="DIR", default="demo_output", help="folder for pictures and numbers")
    demo.add_argument("--force", action="store_true", help="write over what stands in the output folder")
    demo.set_defaults(action="demo")
    return parser


def _reading_options(parser: argparse.ArgumentParser) -> None:
    group = parser.add_argument_group("reading")
    group.add_argument(
        "--columns", metavar="SPEC", help='columns and units of a CSV, as in "f=1:Hz mag=2:dB phase=3:deg"'
    )
    group.add_argument("--trace", metavar="Sij", help="trace of a Touchstone file (default S11 of one port, else S21)")
    group.add_argument("--sign", choices=("as-read", "inverted"), help="sign of the read-out, where it is not plain")


def _output_options(parser: argparse.ArgumentParser, *, folder: bool) -> None:
    group = parser.add_argument_group("output")
    group.add_argument("--json", metavar="FILE", help="write the result as JSON; - prints it, and nothing else")
    if folder:
        group.add_argument("--out", metavar="DIR", help="folder for pictures (PNG, SVG), JSON and table")
    group.add_argument("--force", action="store_true", help="write over existing output")


def main(argv: Sequence[str] | None = None) -> int:
    """Run a command and return its exit code."""
    try:
        args = build_parser().parse_args(argv)
        return _action(args.action)(args)
    except FitampError as error:
        print(f"fitamp: {_one_line(str(error))}", file=sys.stderr)
        return error.exit_code
    except KeyboardInterrupt:
        print("fitamp: interrupted; nothing half-written is left", file=sys.stderr)
        return EXIT_INTERRUPTED


def run() -> NoReturn:
    """Entry point of the `fitamp` command."""
    for stream in (sys.stdout, sys.stderr):
        # A console in a legacy code page must not stop a result over a µ or an Ω.
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")
    try:
        code = main()
    except BrokenPipeError:
        # Whoever read our output has seen enough.
        sys.stderr.close()
        code = 0
    except Exception as error:  # the last net: a fault of ours is one line too
        fault = _one_line(f"internal fault: {type(error).__name__}: {error}")
        print(f"fitamp: {fault}; please report it with the file that caused it", file=sys.stderr)
        code = EXIT_INTERNAL
    sys.exit(code)


def _one_line(text: str) -> str:
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def _action(name: str) -> Callable[[argparse.Namespace], int]:
    from fitamp import commands

    actions: dict[str, Callable[[argparse.Namespace], int]] = {
        "read": commands.read,
        "fit": commands.fit,
        "compare": commands.compare,
        "demo": commands.demo,
    }
    return actions[name]


if __name__ == "__main__":
    run()
