"""Gzip in memory: Python's gzip module packs, zlib's limits are ours to keep."""

from __future__ import annotations

import gzip
import random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fitamp.errors import SweepError
from fitamp.importers.unpack import unpacked


@given(st.lists(st.binary(max_size=200), min_size=1, max_size=4), st.integers(0, 9))
def test_members_come_back_one_after_the_other(contents: list[bytes], zeros: int) -> None:
    data = b"".join(gzip.compress(content) for content in contents) + b"\0" * zeros
    assert unpacked("a.gz", data, max_bytes=10_000) == b"".join(contents) == gzip.decompress(data)


def test_content_larger_than_any_piece_comes_back() -> None:
    content = random.Random(5).randbytes(3_000_000) + b"0" * 3_000_000
    assert unpacked("a.gz", gzip.compress(content, 1), max_bytes=10_000_000) == content


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (gzip.compress(b"0" * 3_000_000, mtime=0) * 2, "unpacks to more than the 5 MB that a sweep may have"),
        (gzip.compress(b"", mtime=0) * 10_001, "the gzip file has more than 10000 members; pack it again as one"),
        (gzip.compress(b"1,2", mtime=0)[:-9], "the gzip file is cut short"),
        (b"\x1f\x8b", "the gzip file is cut short"),
        (b"\x1f\x8b\x08\xff" + b"\xff" * 50, "the gzip file is (damaged|cut short)"),
        (gzip.compress(b"1", mtime=0) + b"\0x", "there is something else behind the end"),
    ],
    ids=["limit", "members", "short", "mark alone", "flags", "appended"],
)
def test_what_cannot_be_unpacked_is_refused(data: bytes, message: str) -> None:
    with pytest.raises(SweepError, match=f"^a.gz: {message}"):
        unpacked("a.gz", data, max_bytes=5_000_000)


def test_growth_is_counted_over_all_members() -> None:
    data = gzip.compress(b"0" * 2_000_000, mtime=0) * 10
    with pytest.raises(SweepError, match="unpacks to more than 200 times its size, as no table of numbers does"):
        unpacked("a.gz", data, max_bytes=100_000_000)
