"""Whatever the bytes: a sweep or a design, or one of fitamp's own errors in one line. Seeds are the corpus."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import TypeVar

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from make import BAD_DESIGNS, BAD_SWEEPS, ODD_SWEEPS

from fitamp.design import read_design
from fitamp.errors import FitampError, InputError, SweepError, UsageError
from fitamp.importers import read_sweep, read_sweeps
from fitamp.sweep import Sign, Sweep

MANY = settings(max_examples=200, suppress_health_check=[HealthCheck.function_scoped_fixture])


def seed_bytes(content: object) -> bytes:
    if isinstance(content, str):
        return content.encode("utf-8")
    return content if isinstance(content, bytes) and len(content) < 5000 else b""


TEXTS = sorted({seed_bytes(c) for n, c in BAD_SWEEPS.items() if ".s" not in n and ".ts" not in n} - {b""})
TEXTS += sorted({seed_bytes(odd.content) for n, odd in ODD_SWEEPS.items() if ".s" not in n.lower()} - {b""})
TOUCHSTONES = sorted({seed_bytes(c) for n, c in BAD_SWEEPS.items() if ".s" in n} - {b""})
TOUCHSTONES += sorted({seed_bytes(odd.content) for n, odd in ODD_SWEEPS.items() if ".s" in n.lower()} - {b""})
DESIGNS = sorted({seed_bytes(content) for content in BAD_DESIGNS.values()} - {b""})

# What breaks readers: marks of every kind, numbers at the edge of a double, words that stand for numbers.
MARKS = [bytes([code]) for code in b"01-+.,;\t \n\r\"'()#!%[]{}=ejkM\x00\x1a\xb0\xff"]
WORDS = (
    b"E400|1e-400|nan|inf|OVL|---|Hz|dB|=cmd()|1,000|1.000.000|9.91E37|sep=;\n|[End]|R 50|freq_hz,re,im\n|\x1b[2J|"
    b"\xe2\x88\x92|\xef\xbb\xbf|\xff\xfe|\x1f\x8b\x08"
).split(b"|")
TOKENS = [*MARKS, *WORDS, b"9" * 400, b"\n" * 50, b"," * 300]


@st.composite
def mutated(draw: st.DrawFn, seeds: list[bytes]) -> bytes:
    """A seed with some pieces replaced, doubled, taken out or put in from another seed."""
    data = draw(st.sampled_from(seeds))
    for _ in range(draw(st.integers(1, 4))):
        start = draw(st.integers(0, len(data)))
        end = min(start + draw(st.sampled_from([0, 0, 1, 1, 2, 5, 40])), len(data))
        other = draw(st.sampled_from(seeds))
        new = draw(
            st.sampled_from(TOKENS)
            | st.binary(max_size=3)
            | st.just(data[start:end] * 2)
            | st.just(other[: draw(st.integers(0, len(other)))])
        )
        data = data[:start] + new + data[end:]
    return data


HARD_CELLS = (
    "|0|1|2.5|-3|1e3|1,5|1.000,5|1 000|1k|2M|3M3|OVL|---|nan|1+2j|(1,2)|10 Hz|60 dB|-5°|x|=1+1|1e999|9.9E37|"
    f'"a"|\N{MINUS SIGN}4|{"1" * 250}'
)
HARD_NAMES = (
    "f|freq_hz|Frequenz (Hz)|omega|mag_db|Betrag|dB|phase_deg|Phase (Grad)|re|im|T|Hz|sweep|位相(度)|complex||note|#|1"
)
CELLS = st.sampled_from(HARD_CELLS.split("|"))
NAMES = st.sampled_from([*HARD_NAMES.split("|"), "|T|"])


@st.composite
def tables(draw: st.DrawFn) -> bytes:
    """A text table put together from cells that are hard to read."""
    separator = draw(st.sampled_from([",", ";", "\t", " ", "  "]))
    width = draw(st.integers(1, 5))
    lines = draw(st.lists(st.lists(NAMES, min_size=width, max_size=width), max_size=2))
    column = [draw(CELLS) for _ in range(width)]
    for k in range(draw(st.integers(0, 12))):
        row = [str(10 * k + 10) if index == 0 and draw(st.booleans()) else column[index] for index in range(width)]
        if draw(st.integers(0, 9)) == 0:
            row[draw(st.integers(0, width - 1))] = draw(CELLS)
        lines.append(row)
    end = draw(st.sampled_from(["\n", "\r\n", "\r", "\n\n"]))
    return end.join(separator.join(line) for line in lines).encode(
        draw(st.sampled_from(["utf-8", "utf-16", "cp932"])), "replace"
    )


Result = TypeVar("Result")


def outcome(call: Callable[[], Result]) -> Result | FitampError:
    """What a call returns, or the one kind of error that it may end with."""
    try:
        return call()
    except FitampError as error:
        return error


def assert_is_plain(error: FitampError) -> None:
    """An error for the user is one line, and what it shows of a file cannot steer a terminal."""
    assert isinstance(error, InputError | UsageError)
    assert len(str(error).splitlines()) == 1
    assert all(len(line) <= 200 and line.isprintable() for line in getattr(error, "excerpt", ()))


def assert_reads_or_refuses(path: Path, *, columns: str | None = None, trace: str | None = None) -> None:
    """Read a file both ways; what comes out has to be a sound sweep, or one line."""
    for sign in (None, Sign.AS_READ):
        one = outcome(partial(read_sweep, path, columns=columns, trace=trace, sign=sign))
        every = outcome(partial(read_sweeps, path, columns=columns, trace=trace, sign=sign))
        for result in (one, every):
            if isinstance(result, FitampError):
                assert_is_plain(result)
        if isinstance(one, Sweep):
            assert every == (one,)


@MANY
@given(mutated(TEXTS))
def test_any_text_table_is_read_or_refused(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(data)
    assert_reads_or_refuses(path)


@MANY
@given(tables(), st.none() | st.sampled_from(["f=1:Hz re=2 im=3", "f=1:kHz mag=2:dB phase=3:deg", "f=1:Hz complex=2"]))
def test_any_table_of_hard_cells_is_read_or_refused(tmp_path: Path, data: bytes, columns: str | None) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(data)
    assert_reads_or_refuses(path, columns=columns)


@MANY
@given(mutated(TOUCHSTONES), st.sampled_from(["a.s1p", "a.s2p", "a.ts", "a.s1p.gz"]), st.none() | st.just("S11"))
def test_any_touchstone_file_is_read_or_refused(tmp_path: Path, data: bytes, name: str, trace: str | None) -> None:
    path = tmp_path / name
    path.write_bytes(data)
    assert_reads_or_refuses(path, trace=trace)


@MANY
@given(mutated(DESIGNS))
def test_any_design_file_is_read_or_refused(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "a.toml"
    path.write_bytes(data)
    result = outcome(partial(read_design, path))
    if isinstance(result, FitampError):
        assert_is_plain(result)
    else:
        assert result.file == str(path)


@settings(max_examples=200)
@given(st.text(max_size=60))
def test_any_choice_of_columns_is_taken_or_refused(text: str) -> None:
    with pytest.raises((UsageError, SweepError), match=r"--columns|no such file"):
        read_sweep("not_there.csv", columns=text)
