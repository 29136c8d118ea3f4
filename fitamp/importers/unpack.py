"""Gzip files unpacked in memory, by the piece, so that a small file cannot grow without end (RFC 1952)."""

from __future__ import annotations

import zlib

from fitamp.errors import SweepError

__all__ = ["GZIP_MARK", "unpacked"]

GZIP_MARK = b"\x1f\x8b"
# zlib's way of saying: a gzip header, the largest window.
_GZIP_WINDOW = 16 + zlib.MAX_WBITS
_PIECE = 1 << 20


def unpacked(file: str, data: bytes, *, max_bytes: int) -> bytes:
    """Unpack a gzip file of one or more members.

    Parameters
    ----------
    max_bytes
        The most that it may hold; no more than this and one piece is ever in memory.

    Raises
    ------
    SweepError
        For a file that holds more, is damaged, cut short, or has something else behind its end.
    """
    pieces: list[bytes] = []
    size = 0
    rest = data
    while rest:
        member = zlib.decompressobj(_GZIP_WINDOW)
        while not member.eof:
            try:
                piece = member.decompress(rest, _PIECE)
            except zlib.error as error:
                raise SweepError(f"{file}: the gzip file is damaged ({error}); copy or export it again") from error
            rest = member.unconsumed_tail
            if not piece and not rest and not member.eof:
                raise SweepError(f"{file}: the gzip file is cut short; copy or export it again")
            size += len(piece)
            if size > max_bytes:
                raise SweepError(
                    f"{file}: unpacks to more than the {max_bytes / 1e6:.0f} MB that a sweep may have; "
                    "export one sweep per file"
                )
            pieces.append(piece)
        rest = member.unused_data.lstrip(b"\0")  # tapes and block devices pad with zeros
        if rest and not rest.startswith(GZIP_MARK):
            raise SweepError(
                f"{file}: there is something else behind the end of the gzip file; copy or export it again"
            )
    return b"".join(pieces)
