"""Tables: no line wider than 100 columns, nothing in a file name that steers a terminal, the verdict first."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import pytest
from awkward_parts import AWKWARD, HOSTILE_NAME, awkward
from rich.cells import cell_len

from fitamp.comparison import Comparison
from fitamp.design import Limit
from fitamp.report.reading import sweep_text
from fitamp.report.tables import comparison_text, fit_text, printable


def texts_of(comparison: Comparison) -> Iterator[str]:
    """All three tables."""
    yield comparison_text(comparison)
    yield fit_text(comparison.fit)
    yield sweep_text(comparison.fit.sweep)


def widest(text: str) -> int:
    """Columns that a terminal needs."""
    return max(cell_len(line) for line in text.splitlines())


@pytest.mark.parametrize("name", AWKWARD)
def test_no_line_is_wider_than_100_columns(name: str) -> None:
    for text in texts_of(awkward(name)):
        assert widest(text) <= 100


def test_the_examples_fit_into_100_columns(compared_examples: dict[str, Comparison]) -> None:
    assert sorted(compared_examples) == ["a", "b", "c", "d", "e"]
    for comparison in compared_examples.values():
        for text in texts_of(comparison):
            assert widest(text) <= 100


def test_a_long_name_in_wide_characters_is_wrapped() -> None:
    comparison = awkward("no resistor")
    origin = replace(comparison.fit.sweep.origin, file="測定" * 60 + ".csv")
    fit = replace(comparison.fit, sweep=replace(comparison.fit.sweep, origin=origin))
    for text in texts_of(replace(comparison, fit=fit)):
        assert widest(text) <= 100
        assert text.count("測") == 60


def test_wide_numbers_are_wrapped_and_not_cut() -> None:
    comparison = awkward("no resistor")
    rows = tuple(
        replace(row, deviation=-9.123456789, sigma=-1e7, low=1.23456789e-9, high=9.87654321e11)
        for row in comparison.rows
    )
    text = comparison_text(replace(comparison, rows=rows))
    assert widest(text) <= 100
    assert "…" in text
    assert text.count("−912.35 %") >= 6
    assert text.count("< −999") == len(rows)


@pytest.mark.parametrize("colour", ["FORCE_COLOR", "CLICOLOR_FORCE", "TTY_COMPATIBLE", "COLORTERM"])
def test_no_escape_sequence_whatever_the_environment_asks_for(colour: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(colour, "1")
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.setenv("COLUMNS", "200")
    for text in texts_of(awkward("hostile name")):
        assert "\x1b" not in text
        assert widest(text) <= 100


def test_a_hostile_name_is_shown_and_not_obeyed() -> None:
    inert = r"[red]x[/red]\x1b[31m\n\x07\u202e\udcff:smile:.csv"
    for text in texts_of(awkward("hostile name")):
        assert inert in text
        assert all(c == "\n" or c.isprintable() for c in text)
        text.encode("utf-8")


def test_printable_leaves_plain_text_alone() -> None:
    assert printable("τz − 1/pole 2, 10 µm Ω \\ [bold]") == "τz − 1/pole 2, 10 µm Ω \\ [bold]"
    assert printable(HOSTILE_NAME) == r"[red]x[/red]\x1b[31m\n\x07\u202e\udcff:smile:.csv"
    assert printable("\x9b2J\x7f\t\r") == r"\x9b2J\x7f\t\r"


def test_the_verdict_comes_first_then_what_to_do(compared_examples: dict[str, Comparison]) -> None:
    lines = comparison_text(compared_examples["b"]).splitlines()
    assert lines[0].startswith("WRONG-SIDE: by the circuit, zero time −1.05")
    assert any(line.startswith("what to do: raise Rz by 1.2") for line in lines[1:4])


def cells_of(text: str, label: str) -> str:
    """The line of a table that begins with a label."""
    (line,) = (line for line in text.splitlines() if line.startswith(label + " "))
    return line


def test_rows_say_measured_limits_and_whether_within(compared_examples: dict[str, Comparison]) -> None:
    text = comparison_text(compared_examples["b"])
    assert cells_of(text, "zero time τz").split()[-1] == "NO"
    assert cells_of(text, "pole 2").split()[-5:] == ["30.0", "…", "90.0", "MHz", "yes"]
    assert cells_of(text, "T(0)").split()[-5:] == ["76.0", "…", "88.0", "dB", "yes"]
    place = cells_of(text, "as a zero at")
    assert "131 MHz L" in place
    assert "MHz R" in place


def test_an_open_limit_is_an_inequality() -> None:
    comparison = awkward("no resistor")
    rows = tuple(
        replace(row, low=limit.low, high=limit.high, inside=None)
        for row, limit in zip(comparison.rows, [Limit(low=1e3), Limit(high=20e6)] * 4, strict=True)
    )
    text = comparison_text(replace(comparison, rows=rows))
    assert "≥ 60.0 dB" in text
    assert "≤ 20.0 MHz" in text
    assert cells_of(text, "pole 1").endswith("?")


def test_bounds_are_written_as_bounds() -> None:
    text = fit_text(awkward("pole 1 below band").fit)
    assert "below " in cells_of(text, "pole 1")
    assert cells_of(text, "pole 1").endswith("upper-bound")
    assert "above " in cells_of(text, "T(0)")
    assert "note (pole1-below-band): " in text


def test_assumed_spreads_and_noise_are_stated() -> None:
    text = " ".join(comparison_text(awkward("no resistor")).split())
    assert "assumed: a spread of 20 % for gm1, R1, C1, gm2, R2, CL, Cc, Rz, not stated in the design file" in text
    assert "(estimated from the sweep)" in text


def test_what_was_left_out_is_listed_with_its_reason() -> None:
    lines = sweep_text(awkward("hostile name").fit.sweep).splitlines()
    at = lines.index("left out")
    assert any(line.startswith("50.00 Hz") for line in lines[at:])
