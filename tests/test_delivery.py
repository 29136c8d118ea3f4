"""How results are handed over: printed, as JSON, in files and folders."""

from __future__ import annotations

import argparse
import json
from pathlib import Path

import pytest
from matplotlib.figure import Figure

from fitamp.delivery import deliver, refuse_early, write_folder
from fitamp.errors import UsageError

RECORD = {"schema": "fitamp/test/1", "value": 1.5}


def _args(**given: object) -> argparse.Namespace:
    return argparse.Namespace(**({"json": None, "out": None, "force": False} | given))


def test_the_table_is_printed(capsys: pytest.CaptureFixture[str]) -> None:
    deliver(_args(), RECORD, "a table\n")
    assert capsys.readouterr().out == "a table\n"
    deliver(_args(out="bench7"), RECORD, "a table\n")
    assert capsys.readouterr().out == "a table\npictures and numbers: bench7\n"


def test_json_on_stdout_stands_alone(capsys: pytest.CaptureFixture[str]) -> None:
    deliver(_args(json="-", out="bench7"), RECORD, "a table\n")
    assert json.loads(capsys.readouterr().out) == RECORD


def test_json_goes_to_a_file_beside_the_table(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "a.json"
    deliver(_args(json=str(path)), RECORD, "a table\n")
    assert capsys.readouterr().out == "a table\n"
    assert json.loads(path.read_text(encoding="utf-8")) == RECORD


def test_what_exists_is_refused_before_the_work(tmp_path: Path) -> None:
    path = tmp_path / "a.json"
    refuse_early(_args(json=str(path), out=str(tmp_path)))  # an empty folder is free
    path.write_text("{}", encoding="utf-8")
    with pytest.raises(UsageError, match="exists already"):
        refuse_early(_args(json=str(path)))
    with pytest.raises(UsageError, match="exists already"):
        refuse_early(_args(out=str(tmp_path)))
    refuse_early(_args(json=str(path), out=str(tmp_path), force=True))
    refuse_early(_args(json="-"))


def test_a_folder_has_all_of_a_result(tmp_path: Path) -> None:
    figure = Figure(figsize=(1, 1))
    folder = tmp_path / "out"
    write_folder(folder, "plan", RECORD, "a table\n", {"one": figure}, force=False, tables={"rows.csv": "a,b\n"})
    assert {path.name for path in folder.iterdir()} == {"plan.json", "plan.txt", "rows.csv", "one.png", "one.svg"}
    assert (folder / "rows.csv").read_text(encoding="utf-8") == "a,b\n"
