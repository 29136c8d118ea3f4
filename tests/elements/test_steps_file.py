"""The steps file: what was added in which sweep."""

from __future__ import annotations

from pathlib import Path

import pytest

from fitamp.elements import Condition, read_steps
from fitamp.errors import InputError

HEADER = "file,load_added_F,rz_added_ohm,temp_C,note\n"


def written(folder: Path, text: str | bytes) -> Path:
    path = folder / "steps.csv"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def refusal(folder: Path, text: str | bytes) -> str:
    path = written(folder, text)
    with pytest.raises(InputError, match=r"steps\.csv") as caught:
        read_steps(path)
    message = str(caught.value)
    assert "\n" not in message
    return message.replace(str(path), "steps.csv")


def test_values_are_numbers_or_have_units(tmp_path: Path) -> None:
    path = written(
        tmp_path,
        HEADER
        + "base.csv,,,25,as it came\n"
        + "# a remark\n\n"
        + 'load5.csv, 5 pF ,0 Ohm,25,"probe, short lead"\n'
        + "more/load15.csv,15e-12,0,24.5,\n"
        + "trim.csv,0,−400,25,code 3\n"
        + "series.csv,0,0.5 kOhm,,\n",
    )
    steps = read_steps(path)
    assert [step.path for step in steps] == [
        tmp_path / name for name in ("base.csv", "load5.csv", "more/load15.csv", "trim.csv", "series.csv")
    ]
    assert [step.line for step in steps] == [2, 5, 6, 7, 8]
    assert [step.condition for step in steps] == [
        Condition(temp_c=25.0, note="as it came"),
        Condition(load_added_f=5e-12, temp_c=25.0, note="probe, short lead"),
        Condition(load_added_f=15e-12, temp_c=24.5),
        Condition(rz_added_ohm=-400.0, temp_c=25.0, note="code 3"),
        Condition(rz_added_ohm=500.0),
    ]


@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_columns_come_in_any_order_and_case_and_most_may_be_missing(tmp_path: Path, separator: str) -> None:
    text = f"\ufeffRZ_ADDED_OHM{separator}File\r\n-400 Ohm{separator}a.csv\r\n"
    (step,) = read_steps(written(tmp_path, text))
    assert step.condition == Condition(rz_added_ohm=-400.0)
    assert step.path == tmp_path / "a.csv"


def test_an_absolute_name_stays(tmp_path: Path) -> None:
    other = tmp_path / "elsewhere" / "a.csv"
    (step,) = read_steps(written(tmp_path, f"file\n{other}\n"))
    assert step.path == other


@pytest.mark.parametrize(
    ("text", "complaint"),
    [
        ("", "steps.csv: is empty; expected a header such as file,load_added_F"),
        (HEADER, "steps.csv: has no steps below its header"),
        ("file,load\na.csv,1\n", "line 1: unknown column 'load'; known are file, load_added_F"),
        ("load_added_F\n5 pF\n", "line 1: column file is missing"),
        ("file,file\na,b\n", "line 1: column file stands there twice"),
        ("file,note\na.csv\n", "line 2: has 1 cells, but the header 2 columns"),
        ('file,note\na.csv,"open\n', "line 2: is not a line of CSV"),
        ("file\n\n# x\na.csv\na.csv\n", "line 5: a.csv stands in line 4 already"),
        ("file,note\n,b\n", "line 2: file is ''; expected the name"),
        ("file,load_added_F\na.csv,5 pFF\n", "line 2: load_added_F: '5 pFF'"),
        ('file,load_added_F\na.csv,"5,0 pF"\n', "has a comma; write the decimal mark as a point"),
        ("file,load_added_F\na.csv,5 Ohm\n", "write farads, such as 5 pF or 5e-12"),
        ("file,load_added_F\na.csv,-5 pF\n", "line 2: the added load must be 0 F or more"),
        ("file,rz_added_ohm\na.csv,nan\n", "line 2: rz_added_ohm: 'nan'"),
        ("file,rz_added_ohm\na.csv,1e999\n", "line 2: the added resistance must be finite"),
        ("file,rz_added_ohm\na.csv,1_000\n", "line 2: rz_added_ohm: '1_000'"),
        ("file,temp_C\na.csv,warm\n", "line 2: temp_C: 'warm' is not a number; write degrees, such as 25"),
        ("file,temp_C\na.csv,-300\n", "line 2: the temperature must be finite and -273.15"),
        ("file,note\na.csv,\x07\n", "line 2: note has characters that cannot be printed"),
        (b"file\n\xff\xfea.csv\n", "line 2: is not UTF-8 text"),
        (b"file\n" + b"a" * 1_000_001, "is larger than 1 MB"),
    ],
)
def test_refusals_say_where_and_what(tmp_path: Path, text: str | bytes, complaint: str) -> None:
    message = refusal(tmp_path, text)
    assert message.startswith("steps.csv")
    assert complaint in message


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such file; check the path of the steps file"):
        read_steps(tmp_path / "none.csv")
    with pytest.raises(InputError, match="cannot be read"):
        read_steps(tmp_path)
    with pytest.raises(InputError, match="cannot be read"):
        read_steps("a\0b")
