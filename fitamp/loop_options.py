"""The words of `fitamp loop`, for the parser; nothing heavy is imported."""

from __future__ import annotations

import argparse
from collections.abc import Callable

__all__ = ["add_loop_options"]

RECEIVERS_HELP = (
    'receivers of a table, as in "f=1:Hz error_mag=2:dB error_phase=3:deg return_mag=4:dB return_phase=5:deg"; also '
    "error_re, error_im, or error for complex cells; with --voltage and --current as for read, of both records"
)
SIGN_HELP = "where it is not plain: as-read for T = return/error (or V2/E), inverted for the negative of it"
LOAD_HELP = 'what port 2 sees, as in "1 MOhm || 2 pF", open, or loop: the loop itself, by default'
SOURCE_HELP = 'what drives port 1, as in "50 Ohm" with a load; by default a source without impedance'


def add_loop_options(
    parser: argparse.ArgumentParser, *, name: Callable[[str], str], count: Callable[[str], int]
) -> None:
    """Give a parser the options of `fitamp loop`; `name` and `count` check a file name and a number from 1."""
    parser.add_argument(
        "file",
        nargs="?",
        type=name,
        metavar="FILE",
        help="table with error and return receiver, or .s2p of the opened loop, driven at port 1",
    )
    pair = parser.add_argument_group("double injection, in place of FILE")
    pair.add_argument(
        "--voltage", type=name, metavar="FILE", help="record with a voltage put in: returned over forward"
    )
    pair.add_argument("--current", type=name, metavar="FILE", help="record with a current put in at the same cut")
    group = parser.add_argument_group("reading")
    group.add_argument("--columns", metavar="SPEC", help=RECEIVERS_HELP)
    group.add_argument("--trace", metavar="Sij", help="trace of Touchstone records with --voltage and --current")
    group.add_argument("--sign", choices=("as-read", "inverted"), help=SIGN_HELP)
    group.add_argument("--sweep", type=count, metavar="N", help="which sweep of a CSV that holds several, from 1")
    ends = parser.add_argument_group("two-port")
    ends.add_argument("--load", type=name, metavar="Z", help=LOAD_HELP)
    ends.add_argument("--source", type=name, metavar="Z", help=SOURCE_HELP)
    output = parser.add_argument_group("output")
    output.add_argument(
        "--out", type=name, required=True, metavar="T.csv", help="sweep of T, which every command reads"
    )
    output.add_argument(
        "--json", type=name, metavar="FILE", help="what was done as JSON; - prints it, and nothing else"
    )
    output.add_argument("--force", action="store_true", help="write over existing output")
    parser.set_defaults(action="loop")
