"""Text for a terminal: markup stays text, control characters become visible, nothing is wider than 100 columns."""

from __future__ import annotations

import pytest

from fitamp.report.console import WIDTH, new_console, print_table, printable, say, text_of_console


@pytest.mark.parametrize(
    ("text", "shown"), [("a\x1b[31mb", r"a\x1b[31mb"), ("one\ntwo", r"one\ntwo"), ("[red]µΩ[/red]", "[red]µΩ[/red]")]
)
def test_no_text_steers_the_terminal(text: str, shown: str, monkeypatch: pytest.MonkeyPatch) -> None:
    # By these a terminal library is told to colour whatever it writes to.
    monkeypatch.setenv("FORCE_COLOR", "1")
    console = new_console()
    say(console, text, style="bold")
    print_table(console, "title", ("heading",), [(text,)])
    printed = text_of_console(console)
    assert printed.count(shown) == 2
    assert "\x1b" not in printed
    assert printable(text) == shown


def test_lines_are_wrapped_and_end_without_blanks() -> None:
    console = new_console()
    say(console, "word " * 60)
    print_table(console, "", ("a", "b"), [("xxxxx " * 30, "1")], numbers=True)
    lines = text_of_console(console).splitlines()
    assert max(map(len, lines)) <= WIDTH
    assert all(line == line.rstrip() for line in lines)
    assert "".join(lines).count("x") == 150
