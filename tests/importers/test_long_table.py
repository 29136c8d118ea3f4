"""The short way for large files: the same sweep as by the long way, or none at all."""

from __future__ import annotations

import numpy as np
import pytest
from bench_tables import cells, table
from hypothesis import given
from hypothesis import strategies as st

from fitamp.errors import SweepError
from fitamp.importers.blocks import find_tables
from fitamp.importers.dialect import find_block
from fitamp.importers.found import Found, found_in
from fitamp.importers.long_table import long_table
from fitamp.importers.source import Source
from fitamp.importers.text import decode
from fitamp.importers.understanding import understand

LINES = table(["freq_hz", "re", "im"], cells("re im"), separator=",")


def source_of(text: str | bytes) -> Source:
    return Source(file="a.csv", data=text.encode() if isinstance(text, str) else text, digest=str)


def by_the_long_way(source: Source) -> list[Found]:
    text = decode(source)
    tables = find_tables(source.file, find_block(source.file, text.lines), text.lines)
    return [one for own in tables for one in found_in(source.file, own, understand(source.file, text, own, None))]


def by_the_short_way(source: Source) -> Found | None:
    return long_table(source, None, large=1)


def assert_same(short: Found | None, source: Source) -> None:
    (long,) = by_the_long_way(source)
    assert short is not None
    assert list(short.points.lines) == list(long.points.lines)
    assert short.points.freq_hz.tolist() == long.points.freq_hz.tolist()
    assert short.points.gain.tolist() == long.points.gain.tolist()
    assert (short.trace, short.decisions, short.left_out) == (long.trace, long.decisions, long.left_out)


@pytest.mark.parametrize(
    ("separator", "decimal"), [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ","), ("  ", ".")]
)
@pytest.mark.parametrize("form", ["re im", "dB deg", "linear rad"])
def test_plain_tables_are_read_alike(separator: str, decimal: str, form: str) -> None:
    header = {
        "re im": ["freq_hz", "re", "im"],
        "dB deg": ["Frequenz/kHz", "Betrag/dB", "Phase/Grad"],
        "linear rad": ["omega", "mag_lin", "phase_rad"],
    }[form]
    source = source_of("# invented\n\n" + table(header, cells(form), separator=separator, decimal=decimal))
    assert_same(by_the_short_way(source), source)


@pytest.mark.parametrize(
    "text",
    [
        LINES.rstrip("\n"),
        LINES.replace("\n", "\r\n"),
        "\ufeff" + LINES,
        "\n".join([LINES.split("\n", 1)[0], *LINES.split("\n")[:0:-1]]).replace("\n\n", "\n"),
        LINES.replace("im\n", "im,n\n").replace("\n", ",1\n").replace("n,1\n", "n\n"),
    ],
    ids=["no last line end", "CRLF", "byte order mark", "falling", "another column"],
)
def test_small_print_of_files_changes_nothing(text: str) -> None:
    source = source_of(text)
    assert_same(by_the_short_way(source), source)


def test_rows_beyond_the_first_ones_keep_every_bit() -> None:
    rng = np.random.default_rng(11)
    freq_hz = np.cumsum(rng.random(3000) + 1e-3)
    gain = rng.standard_normal((3000, 2)) * 10.0 ** rng.integers(-300, 300, (3000, 2))
    rows = "".join(f"{f!r},{a!r},{b!r}\n" for f, (a, b) in zip(freq_hz.tolist(), gain.tolist(), strict=True))
    source = source_of("freq_hz,re,im\n" + rows)
    short = by_the_short_way(source)
    assert_same(short, source)
    assert short is not None
    assert short.points.gain.real.tolist() == gain[:, 0].tolist()


def test_both_readings_of_a_gain_have_to_agree() -> None:
    rows = [a + b[1:] for a, b in zip(cells("re im"), cells("dB deg"), strict=True)]
    text = table(["freq_hz", "re", "im", "mag_db", "phase_deg"], rows, separator=",")
    source = source_of(text)
    assert_same(by_the_short_way(source), source)
    rows[-1][3] = "7"
    assert (
        by_the_short_way(source_of(table(["freq_hz", "re", "im", "mag_db", "phase_deg"], rows, separator=","))) is None
    )


SPOILERS = {
    "word": "3e8,OVL,1\n",
    "empty cell": "3e8,,1\n",
    "NaN": "3e8,nan,1\n",
    "quotes": '3e8,"1",1\n',
    "short row": "3e8,1\n",
    "long row": "3e8,1,1,1\n",
    "separator at the end": "3e8,1,1,\n",
    "comment": "# x\n3e8,1,1\n",
    "blank line": "\n3e8,1,1\n",
    "header again": "freq_hz,re,im\n3e8,1,1\n",
    "too large": "3e8,1e400,1\n",
    "too small": "3e8,1e-400,1\n",
    "too small, in full": f"3e8,0.{'0' * 400}1,1\n",
    "instrument's NaN": "3e8,9.91E37,1\n",
    "Fortran": "3D8,1,1\n",
    "repeated frequency": "1e8,1,1\n",
    "negative frequency": "-1,1,1\n",
    "line end of old": "3e8,1,1\r4e8,1,1\n",
    "minus": "3e8,\N{MINUS SIGN}1,1\n",
}


@pytest.mark.parametrize("name", SPOILERS)
def test_what_needs_a_closer_look_goes_the_long_way(name: str) -> None:
    rows = "".join(f"{1e8 * k / 1999!r},{1 + k / 7},1\n" for k in range(1, 2000))
    for text in (LINES + SPOILERS[name], "freq_hz,re,im\n" + rows + SPOILERS[name]):
        assert by_the_short_way(source_of(text)) is None


def test_tables_of_another_kind_go_the_long_way() -> None:
    complex_cells = table(["freq_hz", "T"], cells("complex j"), separator=",")
    sweeps = table(["sweep", "freq_hz", "re", "im"], [["1", *row] for row in cells("re im")], separator=",")
    for text in (complex_cells, sweeps, LINES * 2, LINES + LINES.split("\n", 1)[1], "words\n", LINES.encode("utf-16")):
        assert by_the_short_way(source_of(text)) is None
    assert long_table(source_of(LINES), None) is None


@given(st.integers(0, len(LINES) - 1), st.binary(min_size=0, max_size=2) | st.sampled_from(list(b"0123456789.,-+eE\n")))
def test_a_changed_file_is_read_alike_or_goes_the_long_way(place: int, change: bytes | int) -> None:
    data = LINES.encode()
    new = bytes([change]) if isinstance(change, int) else change
    source = source_of(data[:place] + new + data[place + 1 :])
    short = by_the_short_way(source)
    if short is not None:
        assert_same(short, source)
        return
    try:
        found = by_the_long_way(source)
    except SweepError:
        return
    assert found
