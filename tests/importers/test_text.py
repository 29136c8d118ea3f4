"""Encodings and line ends: the codecs of Python's own library are the reference."""

from __future__ import annotations

import pytest

from fitamp.errors import SweepError
from fitamp.importers.source import Source
from fitamp.importers.text import decode, line_of

CONTENT = "Phase (°), µV\n1,2\n"


def source(data: bytes) -> Source:
    return Source(file="bench.csv", data=data, digest=str)


@pytest.mark.parametrize(
    ("data", "encoding"),
    [
        (CONTENT.encode("utf-8"), "UTF-8"),
        (CONTENT.encode("utf-8-sig"), "UTF-8"),
        (b"\xff\xfe" + CONTENT.encode("utf-16-le"), "UTF-16 LE"),
        (b"\xfe\xff" + CONTENT.encode("utf-16-be"), "UTF-16 BE"),
        (CONTENT.encode("utf-16-le"), "UTF-16 LE"),
        (CONTENT.encode("utf-16-be"), "UTF-16 BE"),
        (CONTENT.encode("latin-1"), "Latin-1"),
        (CONTENT.encode("utf-8") + b"\x1a", "UTF-8"),
        (CONTENT.encode("cp1252"), "Latin-1"),
    ],
)
def test_encoding_is_found_and_stated(data: bytes, encoding: str) -> None:
    text = decode(source(data))
    assert text.encoding == text.decisions[-1].choice == encoding
    assert [(line.number, line.text) for line in text.lines] == [(1, "Phase (°), µV"), (2, "1,2")]


@pytest.mark.parametrize(
    ("text", "codec", "encoding"),
    [
        ("周波数(Hz),位相(度)", "cp932", "Shift-JIS"),
        ("周波数(Hz),位相(度)", "euc_jp", "EUC-JP"),
        ("f,|T|\n1,\N{EN DASH}2", "cp1252", "Windows-1252"),
        ("f \xb0\n\x81", "latin-1", "Latin-1"),
    ],
)
def test_older_encodings_are_taken_where_they_show(text: str, codec: str, encoding: str) -> None:
    decoded = decode(source(text.encode(codec)))
    assert decoded.encoding == encoding
    assert "\n".join(line.text for line in decoded.lines) == text


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_one_line_can_be_had_also_of_what_is_no_text(end: str) -> None:
    data = source(end.join(["a", "", "b\x00c", "d"]).encode())
    assert [line_of(data, number) for number in (1, 2, 3, 4)] == ["a", "", "b\x00c", "d"]
    with pytest.raises(SweepError, match="line 3: this is a binary file"):
        decode(data)
    assert line_of(source(b"a\n\xff\xfe\xff"), 2) == "ÿþÿ"
    assert line_of(source(b"\xef\xbb\xbfa\n\xff"), 2) == "ÿ"


def test_latin_1_decision_names_the_first_line_that_shows_it() -> None:
    assert decode(source(b"a\nb\xb0\n")).decisions[-1].reason.startswith("line 2 is not valid UTF-8")


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_lines_are_counted_as_editors_count(end: str) -> None:
    text = decode(source(end.join(["a", "", "b\u2028c", ""]).encode()))
    assert [(line.number, line.text) for line in text.lines] == [(1, "a"), (2, ""), (3, "b\u2028c")]


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"1,2\n\x00\x01\x02", "bench.csv, line 2: this is a binary file, not text \\(control character 0x00\\)"),
        (b"\x80\x04\x95\x10", "bench.csv, line 1: this is a binary file, not text \\(control character 0x04\\)"),
        (CONTENT.encode("utf-32"), "bench.csv: the file is UTF-32; save it as UTF-8"),
        (b"\xef\xbb\xbf1,\xff\n", "bench.csv: marked as UTF-8, but byte 3 does not fit; save it as UTF-8"),
        (b"\xff\xfe1\x00\x00\xd8", "bench.csv: marked as UTF-16 LE, but byte 3 does not fit"),
        (b"1\n" * 2_000_001, "bench.csv: more than the 2000000 lines that a sweep may have; export one sweep"),
        (b"1\n" + b"2" * 50_001, "bench.csv, line 2: 50001 characters are more than the 50000 that a line may have"),
    ],
)
def test_what_is_no_text_is_refused(data: bytes, message: str) -> None:
    with pytest.raises(SweepError, match=message):
        decode(source(data))
