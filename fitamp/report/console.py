"""Text for a terminal, at most 100 columns wide, by rich: lines and tables that no text from a file can steer.

Text from files is printed as it is, never read as markup, and control characters are shown, not sent.
"""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["WIDTH", "new_console", "print_table", "printable", "say", "text_of_console"]

WIDTH = 100


def printable(text: str) -> str:
    """Text with control characters written as escapes, so that a file name cannot steer a terminal."""
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in text)


def new_console() -> Console:
    """A console that keeps what is printed, for `text_of_console`."""
    from rich.console import Console

    # Not a terminal whatever the environment says (FORCE_COLOR …): the text also goes into files.
    return Console(
        file=io.StringIO(),
        width=WIDTH,
        markup=False,
        highlight=False,
        emoji=False,
        no_color=True,
        force_terminal=False,
    )


def say(console: Console, text: str, style: str | None = None) -> None:
    """Print a paragraph, wrapped."""
    console.print(printable(text), style=style)


def print_table(
    console: Console,
    title: str,
    headings: Sequence[str],
    rows: Sequence[Sequence[str]],
    *,
    numbers: bool = False,
) -> None:
    """Print a table; of `numbers` all columns but the first are set to the right."""
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(
        title=Text(title),
        title_justify="left",
        box=box.SIMPLE_HEAD,
        pad_edge=False,
        padding=(0, 0),
        show_edge=False,
    )
    for index, heading in enumerate(headings):
        table.add_column(Text(heading), justify="right" if numbers and index else "left")
    for row in rows:
        table.add_row(*(Text(printable(cell)) for cell in row))
    console.print(table)


def text_of_console(console: Console) -> str:
    """All that was printed, without blanks at the ends of lines."""
    stream = console.file
    assert isinstance(stream, io.StringIO)
    return "\n".join(line.rstrip() for line in stream.getvalue().splitlines()) + "\n"
