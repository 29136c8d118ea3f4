"""The command line: parse, call the library, print, return an exit code.

0 done · 1 internal fault · 2 usage · 3 unusable input · 4 no trustworthy result. Results go to stdout, errors as one
line to stderr; with ``--json -`` an error without a result is an object on stdout, too (schema fitamp/error/1).
Nothing heavy is imported before a command runs.
"""

from __future__ import annotations

import argparse
import json
import sys
from collections.abc import Callable, Sequence
from typing import NoReturn

from fitamp import __version__
from fitamp.errors import FitampError, InputError, UsageError
from fitamp.loop_options import add_loop_options

__all__ = ["build_parser", "main", "run"]

EXIT_INTERNAL = 1
EXIT_INTERRUPTED = 130
# Written out, because --help shall not import the readers; a test holds it against them.
COLUMNS_HELP = (
    'columns of a CSV as key=column:unit, a column by its number or quoted name, as in "f=1:Hz mag=2:dB phase=3:deg"; '
    "keys and units: f Hz, kHz, MHz, GHz, rad/s; mag dB, linear; phase deg, rad; re, im and complex without unit"
)
NOISE_HELP = (
    "noise levels of one sweep instead of those estimated from it, complex standard deviations, as in "
    '"error=2e-5 return=2e-5 relative=1e-3": floors of the two receivers for a drive of 1, relative gain error, and '
    "ratio, a floor of the loop gain itself; one that is left out is 0"
)
THROUGH_HELP = (
    "through sweep of the same bench, both receivers on one node: its delay, with its standard error, is that of the "
    "path, in place of --delay and of what the design file states; read with the same --columns or --trace"
)
REPEATED_HELP = (
    "CSV or Touchstone sweep of the loop gain; several must be repeats of one sweep, of the same part at the same "
    "frequencies and settings, in the order in which they were taken, and are averaged"
)
REPEATS_HELP = "the files, and all sweeps in each of them, are repeats of one sweep: average them"
DELAY_HELP = (
    'delay that the bench adds to the loop: "0.4 ns", "0.4 ns +- 0.02 ns" with its standard deviation, or free where '
    "nothing is known of it"
)


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
    read.add_argument(
        "files", nargs="+", metavar="FILE", help="CSV or Touchstone sweep, also as .gz; - is standard input"
    )
    _reading_options(read)
    _output_options(read, folder=False)
    read.add_argument("--plot", action="store_true", help="draw magnitude and phase in characters, too")
    read.set_defaults(action="read")

    fit = commands.add_parser("fit", help="fit two poles and one zero to a sweep or its repeats")
    fit.add_argument("files", nargs="+", metavar="FILE", help=REPEATED_HELP)
    _reading_options(fit)
    _bench_options(fit, unstated="free")
    _output_options(fit, folder=True)
    fit.set_defaults(action="fit")

    compare = commands.add_parser("compare", help="hold a sweep against its design: verdict, numbers, pictures")
    compare.add_argument("files", nargs="+", metavar="FILE", help=REPEATED_HELP)
    compare.add_argument("--design", required=True, metavar="D.toml", help="design file")
    _reading_options(compare)
    _bench_options(compare, unstated="as the design file states it")
    _output_options(compare, folder=True)
    compare.set_defaults(action="compare")

    _elements_command(
        commands.add_parser("elements", help="which element of a part moved, by how much, and what to change")
    )
    _plan_command(
        commands.add_parser("plan", help="the best sweeps to take, and how surely they will tell the elements")
    )

    add_loop_options(
        commands.add_parser("loop", help="make the loop gain from raw records: receivers, injections, a two-port"),
        name=_name,
        count=_count,
    )

    template = commands.add_parser("template", help="print a design file to fill in, with every table and key")
    template.add_argument("--out", type=_name, metavar="FILE", help="write it to a file instead")
    template.add_argument("--force", action="store_true", help="write over an existing file")
    template.set_defaults(action="template")

    demo = commands.add_parser("demo", help="run the main job on the invented example parts")
    demo.add_argument("--examples", metavar="DIR", help="folder of the examples (default: data_examples)")
    demo.add_argument("--out", metavar="DIR", default="demo_output", help="folder for pictures and numbers")
    demo.add_argument("--force", action="store_true", help="write over what stands in the output folder")
    demo.set_defaults(action="demo")
    return parser


def _elements_command(elements: argparse.ArgumentParser) -> None:
    elements.add_argument(
        "files",
        nargs="*",
        metavar="FILE",
        help="CSV or Touchstone sweep of the loop gain, with nothing added unless --steps says so; all of one part",
    )
    elements.add_argument("--design", required=True, metavar="D.toml", help="design file, with elements")
    elements.add_argument(
        "--steps",
        type=_name,
        metavar="S.csv",
        help="what was added in which sweep, a CSV with the columns file, load_added_F, rz_added_ohm, temp_C and note; "
        "its sweeps are taken beside those named",
    )
    elements.add_argument(
        "--under-test",
        type=_name,
        metavar="NAMES",
        help='elements whose designed value shall count nothing, as in "CL gm2"',
    )
    elements.add_argument(
        "--margin-wanted",
        metavar="ANGLE",
        help='phase margin to keep, as in "60 deg": which loads and resistors do (default: the design\'s limit)',
    )
    _reading_options(elements, repeats="the sweeps in each file are repeats of one sweep: average them")
    _bench_options(elements, unstated="as the design file states it")
    _output_options(elements, folder=True)
    elements.add_argument(
        "--design-out", type=_name, metavar="NEW.toml", help="write the part as estimated as a design file"
    )
    elements.set_defaults(action="elements")


def _plan_command(plan: argparse.ArgumentParser) -> None:
    plan.add_argument("--design", required=True, metavar="D.toml", help="design file, with elements")
    plan.add_argument(
        "--under-test",
        type=_name,
        metavar="NAMES",
        help='elements whose designed value shall count nothing, as in "CL gm2"',
    )
    listed = plan.add_argument_group("what can be taken: every load with every resistance in every band")
    listed.add_argument("--loads", metavar="LIST", help='added loads, as in "0, 5 pF, 10 pF" (default: by the design)')
    listed.add_argument(
        "--resistances", metavar="LIST", help='added in series with Rz, as in "0, 500 Ohm, -400 Ohm" (default: 0)'
    )
    listed.add_argument(
        "--band",
        nargs=2,
        action="append",
        metavar=("LOW", "HIGH"),
        help='as in "1 kHz" "200 MHz"; may be given again for another band to choose from (default: by the design)',
    )
    listed.add_argument("--points", type=_count, default=281, metavar="N", help="points of a sweep (default 281)")
    listed.add_argument("--averages", type=_count, default=1, metavar="N", help="averages of each sweep (default 1)")
    listed.add_argument("--noise", metavar="LEVELS", help=f"{NOISE_HELP}; default: usual ones, or those of --have")
    choice = plan.add_argument_group("choice")
    choice.add_argument(
        "--sweeps", type=_count, metavar="N", help="how many to choose (default: as few as meet --want, else 3)"
    )
    choice.add_argument(
        "--want",
        action="append",
        metavar="PRECISION",
        help='standard deviations that shall be met, as in "gm2 1 %%, phase_margin_deg 0.5 deg"',
    )
    choice.add_argument(
        "--parts",
        type=_count,
        default=30,
        metavar="N",
        help="parts drawn from the spreads beside the centre (default 30)",
    )
    choice.add_argument("--seed", type=_count, default=1, metavar="N", help="of the parts drawn (default 1)")
    have = plan.add_argument_group("what was taken already")
    have.add_argument(
        "--have",
        metavar="FILE",
        help="steps file of the sweeps taken, or one sweep with nothing added; plan what is next",
    )
    have.add_argument("--columns", metavar="SPEC", help="as for read")
    have.add_argument("--trace", metavar="Sij", help="as for read")
    have.add_argument("--sign", choices=("as-read", "inverted"), help="as for read")
    _output_options(plan, folder=True)
    plan.set_defaults(action="plan")


def _reading_options(parser: argparse.ArgumentParser, *, repeats: str = REPEATS_HELP) -> None:
    group = parser.add_argument_group("reading")
    group.add_argument("--columns", metavar="SPEC", help=COLUMNS_HELP)
    group.add_argument("--trace", metavar="Sij", help="trace of a Touchstone file (default S11 of one port, else S21)")
    group.add_argument("--sign", choices=("as-read", "inverted"), help="sign of the read-out, where it is not plain")
    group.add_argument("--sweep", type=_count, metavar="N", help="which sweep of a CSV that holds several, from 1")
    group.add_argument("--repeats", action="store_true", help=repeats)


def _bench_options(parser: argparse.ArgumentParser, *, unstated: str) -> None:
    group = parser.add_argument_group("bench")
    group.add_argument("--noise", metavar="LEVELS", help=NOISE_HELP)
    group.add_argument("--delay", metavar="TIME", help=f"{DELAY_HELP}; default: {unstated}")
    group.add_argument("--through", metavar="FILE", help=THROUGH_HELP)
    group.add_argument(
        "--keep-all",
        action="store_true",
        help="fit all points; without it glitches and mains lines are left out, each listed with its reason",
    )


def _output_options(parser: argparse.ArgumentParser, *, folder: bool) -> None:
    group = parser.add_argument_group("output")
    group.add_argument(
        "--json", type=_name, metavar="FILE", help="write the result as JSON; - prints it, and nothing else"
    )
    if folder:
        group.add_argument("--out", type=_name, metavar="DIR", help="folder for pictures (PNG, SVG), JSON and table")
    group.add_argument("--force", action="store_true", help="write over existing output")


def _count(text: str) -> int:
    if not (text.isascii() and text.isdigit() and 0 < len(text) < 10 and int(text) > 0):
        raise argparse.ArgumentTypeError(f"{text!r} is not a whole number from 1")
    return int(text)


def _name(text: str) -> str:
    if not text.strip():
        raise argparse.ArgumentTypeError("the name is empty")
    return text


def main(argv: Sequence[str] | None = None) -> int:
    """Run a command and return its exit code."""
    words = sys.argv[1:] if argv is None else argv
    shows_place = False
    try:
        args = build_parser().parse_args(words)
        shows_place = args.action == "read"
        return _action(args.action)(args)
    except FitampError as error:
        excerpt = error.excerpt if shows_place and isinstance(error, InputError) else ()
        return _fail(str(error), error.exit_code, words, excerpt)
    except KeyboardInterrupt:
        return _fail("interrupted; nothing half-written is left", EXIT_INTERRUPTED, words)


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
        fault = f"internal fault: {type(error).__name__}: {error}; please report it with the file that caused it"
        code = _fail(fault, EXIT_INTERNAL, sys.argv[1:])
    sys.exit(code)


def _fail(message: str, exit_code: int, words: Sequence[str], excerpt: Sequence[str] = ()) -> int:
    """Say what went wrong: one line on stderr, with the place in the file under it where `excerpt` shows it.

    With ``--json -`` there is an object on stdout, too.
    """
    line = _one_line(message)
    print("\n".join([f"fitamp: {line}", *excerpt]), file=sys.stderr)
    if _wants_json_printed(words):
        error = {"message": line, "exit_code": exit_code}
        print(json.dumps({"schema": "fitamp/error/1", "error": error}, indent=2))
    return exit_code


def _wants_json_printed(words: Sequence[str]) -> bool:
    """Whether ``--json -`` is there; read off the words, because those that cannot be parsed say it as well."""
    for word, following in zip(words, [*words[1:], ""], strict=False):
        option, equals, value = word.partition("=")
        is_json = len(option) > 2 and "--json".startswith(option)  # argparse takes what is short and unmistakable
        if is_json and (value if equals else following) == "-":
            return True
    return False


def _one_line(text: str) -> str:
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def _action(name: str) -> Callable[[argparse.Namespace], int]:
    from fitamp import commands, elements_command, loop_command, plan_command

    actions: dict[str, Callable[[argparse.Namespace], int]] = {
        "read": commands.read,
        "fit": commands.fit,
        "compare": commands.compare,
        "elements": elements_command.elements,
        "loop": loop_command.loop,
        "plan": plan_command.plan,
        "template": commands.template,
        "demo": commands.demo,
    }
    return actions[name]


if __name__ == "__main__":
    run()
