"""Text that fits and text that stays text."""

from __future__ import annotations

import pytest

from fitamp.plots.style import inert, shortened, text_width_in, wrapped


def test_shortened_keeps_both_ends_and_fits() -> None:
    name = "bench_" + "x" * 300 + "_part7.csv"
    short = shortened(name, 3.0)
    assert short.startswith("bench_")
    assert short.endswith("_part7.csv")
    assert "…" in short
    assert 2.8 < text_width_in(short) <= 3.0


def test_shortened_leaves_short_text_alone() -> None:
    assert shortened("bench7.csv", 3.0) == "bench7.csv"


def test_wrapped_lines_fit_and_lose_no_word() -> None:
    text = "the 95 % interval of the zero time reaches into at-infinity and too-little " * 5
    lines = wrapped(text, 4.0)
    assert max(text_width_in(line, 10.0) for line in lines) <= 4.0
    assert " ".join(lines).split() == text.split()


def test_text_width_grows_with_size() -> None:
    assert text_width_in("zero", 18.0) == pytest.approx(2 * text_width_in("zero", 9.0), rel=0.1)


@pytest.mark.parametrize(
    ("text", "safe"),
    [
        ("bench7.csv", "bench7.csv"),
        ("a\x1b[31mb", "a\\x1b[31mb"),
        ("right\u202eleft", "right\\u202eleft"),
        ("\u6e2c", "?"),  # a character that the font lacks
        ("Ω ± τ − ∞ $x$", "Ω ± τ − ∞ $x$"),
    ],
)
def test_inert(text: str, safe: str) -> None:
    assert inert(text) == safe
