"""Bytes to numbered lines: encoding, byte order mark, line ends."""

from __future__ import annotations

import codecs
import re
from dataclasses import dataclass
from itertools import islice

from fitamp.errors import SweepError
from fitamp.importers.fault import at_cell, at_line
from fitamp.importers.source import Source
from fitamp.importers.words import JAPANESE
from fitamp.sweep import Decision

__all__ = ["MAX_LINES", "MAX_LINE_LENGTH", "Line", "Text", "decode", "line_of"]

_UTF32_MARKS = (codecs.BOM_UTF32_LE, codecs.BOM_UTF32_BE)
_LINE_END = re.compile(r"\r\n|\n|\r")
# Control characters that no text export holds; tab, line ends, form feed and a closing Ctrl-Z are fine.
_BINARY = re.compile(r"[\x00-\x08\x0e-\x1f\x7f]")
_CTRL_Z = "\x1a"
# Limits beyond which a file is no table of a sweep, and reading it would only take memory.
MAX_LINES = 2_000_000
MAX_LINE_LENGTH = 50_000
# Encodings that are only taken where they show a known word of a header.
_JAPANESE_CODECS = {"cp932": "Shift-JIS", "euc_jp": "EUC-JP"}
# Control characters in Latin-1, dashes and quotation marks in Windows-1252.
_C1_BYTES = re.compile(rb"[\x80-\x9f]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One line of a file; `number` counts from 1 as editors do."""

    number: int
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Text:
    """The lines of a file, their number, its encoding by name, and what was decided on the way to them.

    `line_count` is larger than the number of `lines` where only the first ones were decoded.
    """

    lines: tuple[Line, ...]
    line_count: int
    encoding: str
    decisions: tuple[Decision, ...]


def decode(source: Source) -> Text:
    """Decode a file: UTF-8 or UTF-16, each with or without byte order mark, else an encoding of single bytes.

    Raises
    ------
    SweepError
        When the bytes are not text, or more lines or longer ones than a table of numbers has.
    """
    content, encoding, reason = _decode(source)
    content = content.rstrip(_CTRL_Z)
    binary = _BINARY.search(content)
    if binary:
        number = _line_number(content, binary.start())
        text = (
            f"this is a binary file, not text (control character 0x{ord(binary[0]):02x}); export the sweep as CSV or "
            "Touchstone"
        )
        raise at_cell(source.file, number, binary[0], text, quoted=False)
    if max(content.count("\n"), content.count("\r")) > MAX_LINES:  # before they take memory
        raise SweepError(
            f"{source.file}: more than the {MAX_LINES} lines that a sweep may have; export one sweep per file"
        )
    texts = content.split("\n") if "\r" not in content else _LINE_END.split(content)
    if texts[-1] == "":
        texts.pop()
    _refuse_long_lines(source.file, texts)
    lines = tuple(Line(number=number, text=text) for number, text in enumerate(texts, start=1))
    decision = Decision(topic="encoding", choice=encoding, reason=reason)
    decisions = (*source.decisions, decision)
    return Text(lines=lines, line_count=len(lines), encoding=encoding, decisions=decisions)


def line_of(source: Source, number: int) -> str:
    """One line of a file to look at, also of one that is not text."""
    try:
        content = _decode(source)[0]
    except SweepError:
        content = source.data.decode("latin-1")
    start = 0
    for end in islice(_LINE_END.finditer(content), number - 1):
        start = end.end()
    stop = _LINE_END.search(content, start)
    return content[start : stop.start() if stop else len(content)]


def _line_number(content: str, place: int) -> int:
    """The line on which a character stands, counted from 1."""
    before = (content.count(end, 0, place) for end in ("\n", "\r", "\r\n"))
    return next(before) + next(before) - next(before) + 1


def _decode(source: Source) -> tuple[str, str, str]:
    """Content without byte order mark, encoding, and why this one."""
    data = source.data
    if data.startswith(_UTF32_MARKS):
        raise SweepError(f"{source.file}: the file is UTF-32; save it as UTF-8")
    for mark, codec, encoding in (
        (codecs.BOM_UTF8, "utf-8", "UTF-8"),
        (codecs.BOM_UTF16_LE, "utf-16-le", "UTF-16 LE"),
        (codecs.BOM_UTF16_BE, "utf-16-be", "UTF-16 BE"),
    ):
        if data.startswith(mark):
            return _strictly(source, data[len(mark) :], codec, encoding), encoding, "byte order mark"
    order = _utf16_without_mark(data)
    if order:
        codec = f"utf-16-{order}"
        content = _strictly(source, data, codec, f"UTF-16 {order.upper()}")
        return content, f"UTF-16 {order.upper()}", "no byte order mark, but every other byte is zero"
    try:
        return data.decode("utf-8"), "UTF-8", "all bytes are valid UTF-8"
    except UnicodeDecodeError as error:
        return _not_unicode(data, _line_number(data.decode("latin-1"), error.start))


def _not_unicode(data: bytes, number: int) -> tuple[str, str, str]:
    """Text of an older encoding; line `number` is the first that shows that it is not UTF-8."""
    for codec, encoding in _JAPANESE_CODECS.items():
        try:
            content = data.decode(codec)
        except UnicodeDecodeError:
            continue
        term = next((term for term in JAPANESE if term in content), None)
        if term is not None:
            return content, encoding, f"line {number} is not valid UTF-8; as {encoding} the file has the word {term}"
    reason = f"line {number} is not valid UTF-8; bytes above 127 are taken as "
    if _C1_BYTES.search(data):
        try:
            return data.decode("cp1252"), "Windows-1252", f"{reason}Windows-1252"
        except UnicodeDecodeError:
            pass
    return data.decode("latin-1"), "Latin-1", f"{reason}Latin-1"


def _refuse_long_lines(file: str, texts: list[str]) -> None:
    longest = max(map(len, texts), default=0)
    if longest > MAX_LINE_LENGTH:
        number = next(number for number, text in enumerate(texts, start=1) if len(text) == longest)
        text = f"{longest} characters are more than the {MAX_LINE_LENGTH} that a line may have"
        raise at_line(file, number, f"{text}; export one row of numbers per line")


def _strictly(source: Source, data: bytes, codec: str, encoding: str) -> str:
    try:
        return data.decode(codec)
    except UnicodeDecodeError as error:
        raise SweepError(
            f"{source.file}: marked as {encoding}, but byte {error.start + 1} does not fit; save it as UTF-8"
        ) from error


def _utf16_without_mark(data: bytes) -> str | None:
    """'le' or 'be' where nearly every second byte is zero, as in UTF-16 text of Latin letters and digits."""
    if len(data) % 2 or not data:
        return None
    half = len(data) // 2
    even, odd = data[0::2].count(0) / half, data[1::2].count(0) / half
    if odd > 0.9 and even == 0:
        return "le"
    if even > 0.9 and odd == 0:
        return "be"
    return None
