"""Gzip files unpacked in memory, by the piece, so that a small file cannot grow without end (RFC 1952)."""

from __future__ import annotations

import zlib

from fitamp.errors import SweepError

__all__ = ["GZIP_MARK", "unpacked"]

GZIP_MARK = b"\x1f\x8b"
# zlib's way of saying: a gzip header, the largest window.
_GZIP_WINDOW = 16 + zlib.MAX_WBITS
_PIECE_IN, _PIECE_OUT = 1 << 14, 1 << 20
# Numbers as text pack to a half or a tenth. A file that grows by more than this, and to more than that many bytes, was
# made to fill a memory.
_MOST_GROWTH = 200
_SMALL = 1 << 24
# Programs that pack in blocks make one for every 64 kB.
_MOST_MEMBERS = 10_000


def unpacked(file: str, data: bytes, *, max_bytes: int) -> bytes:
    """Unpack a gzip file of one or more members.

    Parameters
    ----------
    max_bytes
        The most that it may hold; no more than this and one piece is ever in memory.

    Raises
    ------
    SweepError
        For a file that holds more, grows as no table of numbers does, is damaged, cut short, or has something else
        behind its end.
    """
    content = _Content(file, len(data), max_bytes)
    place = 0
    for _ in range(_MOST_MEMBERS):
        place = _unpack_member(data, place, content)
        while data[place : place + 1] == b"\0":  # tapes and block devices pad with zeros
            place += 1
        if place == len(data):
            return b"".join(content.pieces)
        if not data.startswith(GZIP_MARK, place):
            raise content.refused("there is something else behind the end of the gzip file; copy or export it again")
    raise content.refused(f"the gzip file has more than {_MOST_MEMBERS} members; pack it again as one")


class _Content:
    """What was unpacked so far, within limits."""

    def __init__(self, file: str, packed_bytes: int, max_bytes: int) -> None:
        self.file = file
        self.pieces: list[bytes] = []
        self._size = 0
        self._max_bytes = max_bytes
        self._most = max(_SMALL, _MOST_GROWTH * packed_bytes)

    def add(self, piece: bytes) -> None:
        """Take up a piece, or refuse it."""
        self._size += len(piece)
        if self._size > self._max_bytes:
            limit = f"the {self._max_bytes / 1e6:.0f} MB that a sweep may have"
            raise self.refused(f"unpacks to more than {limit}; export one sweep per file")
        if self._size > self._most:
            growth = f"more than {_MOST_GROWTH} times its size, as no table of numbers does"
            raise self.refused(f"unpacks to {growth}; unpack it and look what it holds")
        self.pieces.append(piece)

    def refused(self, text: str) -> SweepError:
        """The error for the file."""
        return SweepError(f"{self.file}: {text}")


def _unpack_member(data: bytes, place: int, content: _Content) -> int:
    """Unpack the member that starts at a place; the place behind it."""
    member = zlib.decompressobj(_GZIP_WINDOW)
    packed = b""
    while not member.eof:
        if not packed:
            packed = data[place : place + _PIECE_IN]
            place += len(packed)
        try:
            piece = member.decompress(packed, _PIECE_OUT)
        except zlib.error as error:
            raise content.refused(f"the gzip file is damaged ({error}); copy or export it again") from error
        if not packed and not piece and not member.eof:
            raise content.refused("the gzip file is cut short; copy or export it again")
        packed = member.unconsumed_tail
        content.add(piece)
    return place - len(member.unused_data)
