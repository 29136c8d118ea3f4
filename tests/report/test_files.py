"""Output is written whole or not at all, and never over something in silence."""

from __future__ import annotations

from pathlib import Path

import pytest

from fitamp.errors import UsageError
from fitamp.report.files import refuse_existing, staged_directory, write_text


def names_in(folder: Path) -> list[str]:
    """Everything below a folder, hidden things included."""
    return sorted(path.relative_to(folder).as_posix() for path in folder.rglob("*"))


def test_text_is_written_as_utf8_with_unix_line_ends(tmp_path: Path) -> None:
    write_text(tmp_path / "new" / "a.txt", "τz\n2 Ω\n", force=False)
    assert (tmp_path / "new" / "a.txt").read_bytes() == "τz\n2 Ω\n".encode()
    assert names_in(tmp_path) == ["new", "new/a.txt"]


def test_existing_text_is_refused_and_kept(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(UsageError, match=r"a\.txt: exists already; choose another name or give --force"):
        write_text(path, "new", force=False)
    assert path.read_text(encoding="utf-8") == "mine"
    write_text(path, "new", force=True)
    assert path.read_text(encoding="utf-8") == "new"
    assert names_in(tmp_path) == ["a.txt"]


def test_what_colleagues_may_read_of_a_folder_they_may_read_of_results(tmp_path: Path) -> None:
    plain = tmp_path / "plain.txt"
    plain.write_text("x", encoding="utf-8")
    write_text(tmp_path / "ours.txt", "x", force=False)
    assert (tmp_path / "ours.txt").stat().st_mode == plain.stat().st_mode


@pytest.mark.parametrize("force", [False, True])
def test_a_folder_is_no_file_to_write(tmp_path: Path, force: bool) -> None:
    (tmp_path / "full").mkdir()
    (tmp_path / "full" / "mine.txt").write_text("x", encoding="utf-8")
    with pytest.raises(UsageError, match=r"full: (is a folder; name a file|exists already)"):
        write_text(tmp_path / "full", "x", force=force)
    assert names_in(tmp_path) == ["full", "full/mine.txt"]


def test_a_place_that_cannot_be_is_refused(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    with pytest.raises(UsageError, match=r"cannot be written .*; choose another place"):
        write_text(tmp_path / "file" / "below.txt", "x", force=False)
    with (
        pytest.raises(UsageError, match=r"cannot be written .*; choose another place"),
        staged_directory(tmp_path / "file" / "below", force=False),
    ):
        pass
    assert names_in(tmp_path) == ["file"]


def test_text_that_cannot_be_encoded_leaves_nothing(tmp_path: Path) -> None:
    with pytest.raises(UnicodeEncodeError, match="surrogates"):
        write_text(tmp_path / "a.txt", "begins well \udcff", force=False)
    assert names_in(tmp_path) == []


def test_a_staged_folder_appears_when_it_is_complete(tmp_path: Path) -> None:
    out = tmp_path / "deep" / "out"
    with staged_directory(out, force=False) as staging:
        (staging / "b.txt").write_text("b", encoding="utf-8")
        assert not out.exists()
        # Beside its place, so that moving it is a matter of names and not of copying.
        assert staging.parent == out.parent
    assert names_in(tmp_path / "deep") == ["out", "out/b.txt"]


@pytest.mark.parametrize("fault", [RuntimeError("a fault of ours"), KeyboardInterrupt("enough")])
def test_an_exception_in_the_middle_leaves_nothing(tmp_path: Path, fault: BaseException) -> None:
    def interrupted() -> None:
        with staged_directory(tmp_path / "out", force=False) as staging:
            (staging / "half.txt").write_text("half", encoding="utf-8")
            raise fault

    with pytest.raises(type(fault), match=str(fault)):
        interrupted()
    assert names_in(tmp_path) == []


def test_an_exception_in_the_middle_keeps_the_run_before(tmp_path: Path) -> None:
    out = tmp_path / "out"
    with staged_directory(out, force=False) as staging:
        (staging / "a.txt").write_text("first", encoding="utf-8")

    def interrupted() -> None:
        with staged_directory(out, force=True) as staging:
            (staging / "a.txt").write_text("second", encoding="utf-8")
            raise RuntimeError("in the middle")

    with pytest.raises(RuntimeError, match="in the middle"):
        interrupted()
    assert names_in(tmp_path) == ["out", "out/a.txt"]
    assert (out / "a.txt").read_text(encoding="utf-8") == "first"


def test_a_folder_with_something_in_it_is_refused_before_any_work(tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine", encoding="utf-8")
    entered = False
    with pytest.raises(UsageError, match="exists already"), staged_directory(tmp_path, force=False):
        entered = True
    assert not entered


def test_an_empty_folder_may_be_filled(tmp_path: Path) -> None:
    refuse_existing(tmp_path, force=False)
    with staged_directory(tmp_path / "out", force=False) as staging:
        (staging / "a.txt").write_text("a", encoding="utf-8")
    assert names_in(tmp_path) == ["out", "out/a.txt"]


def test_with_force_each_file_is_replaced_whole_and_foreign_ones_stay(tmp_path: Path) -> None:
    out = tmp_path / "out"
    out.mkdir()
    (out / "a.txt").write_text("a much longer text of the run before", encoding="utf-8")
    (out / "notes of mine.txt").write_text("mine", encoding="utf-8")
    (out / "sub").mkdir()
    (out / "sub" / "deep.txt").write_text("mine too", encoding="utf-8")
    with staged_directory(out, force=True) as staging:
        (staging / "a.txt").write_text("new", encoding="utf-8")
    assert (out / "a.txt").read_text(encoding="utf-8") == "new"
    assert (out / "notes of mine.txt").read_text(encoding="utf-8") == "mine"
    assert names_in(tmp_path) == ["out", "out/a.txt", "out/notes of mine.txt", "out/sub", "out/sub/deep.txt"]


def test_a_file_is_no_folder_even_with_force(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("mine", encoding="utf-8")
    with (
        pytest.raises(UsageError, match="out: is a file; name a folder for the output"),
        staged_directory(tmp_path / "out", force=True),
    ):
        pass
    assert (tmp_path / "out").read_text(encoding="utf-8") == "mine"


def test_a_folder_in_the_way_of_a_file_is_said(tmp_path: Path) -> None:
    (tmp_path / "out" / "a.txt").mkdir(parents=True)
    (tmp_path / "out" / "a.txt" / "deep").write_text("mine", encoding="utf-8")
    with (
        pytest.raises(UsageError, match="cannot be written"),
        staged_directory(tmp_path / "out", force=True) as staging,
    ):
        (staging / "a.txt").write_text("new", encoding="utf-8")
    assert names_in(tmp_path) == ["out", "out/a.txt", "out/a.txt/deep"]
