"""The written choice of columns: what it means, and what is refused with an example."""

from __future__ import annotations

import re

import pytest

from fitamp.errors import UsageError
from fitamp.importers.choice import ColumnChoice, ColumnRef, example_choice
from fitamp.importers.quantity import Quantity, Unit, meaning_of

ANY_F = "Hz-or-kHz-or-MHz-or-GHz-or-rad/s"


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("f=1:Hz mag=2:dB phase=3:deg", [(1, Unit.HZ), (2, Unit.DB), (3, Unit.DEGREE)]),
        ("f='Frequency':MHz mag='my gain':linear phase=\"it's\":rad", [
            ("Frequency", Unit.MHZ), ("my gain", Unit.LINEAR), ("it's", Unit.RADIAN)
        ]),
        ("  F=Freq  mag=Gain   phase=4 ", [("Freq", None), ("Gain", None), (4, None)]),
    ],
)  # fmt: skip
def test_magnitude_and_phase(text: str, expected: list[tuple[int | str, Unit | None]]) -> None:
    columns = ColumnChoice.parse(text).columns
    keys = (Quantity.FREQUENCY, Quantity.MAGNITUDE, Quantity.PHASE)
    assert [(columns[key].column, columns[key].unit) for key in keys] == expected


def test_real_and_imaginary_and_complex() -> None:
    assert set(ColumnChoice.parse("re=2 im=3 f=1:rad/s").columns) == {"re", "im", "f"}
    assert ColumnChoice.parse("f='1':Hz complex='T (x)'").columns[Quantity.FREQUENCY].column == "1"


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "names nothing; expected f with re and im, f with mag and phase, or f with complex, as in --columns"),
        ("f=1:Hz mag=2:dB", "names f mag; expected f with re and im"),
        ("f=1 re=2 im=3 phase=4", "names f im phase re; expected"),
        ("f=1 f=2", "names f twice; name each quantity once"),
        ("freq=1", "key 'freq' is not known; expected one of f, mag, phase, re, im, complex"),
        ("f=1:dB", "gives f the unit 'dB'; expected one of Hz, kHz, MHz, GHz, rad/s"),
        ("f=1:mHz", "gives f the unit 'mHz'; expected one of"),
        ("f=1:Hz re=2:dB", "gives re the unit 'dB'; re is V/V and takes no unit"),
        ("f=0:Hz complex=2", "gives f column 0; columns count from 1"),
        ("f=1:Hz complex", "cannot read 'complex'; expected key=column:unit, as in --columns"),
        ("1,2,3", "cannot read '1,2,3'; expected key=column:unit"),
        ("f='a", 'cannot read "f=\'a"'),
    ],
)
def test_malformed_choice_is_refused(text: str, message: str) -> None:
    with pytest.raises(UsageError, match=message):
        ColumnChoice.parse(text)


def test_choice_built_by_hand_is_checked_as_well() -> None:
    with pytest.raises(UsageError, match="gives f the unit dB; expected one of Hz"):
        ColumnChoice(
            columns={
                Quantity.FREQUENCY: ColumnRef(column=1, unit=Unit.DB),
                Quantity.COMPLEX: ColumnRef(column=2),
            }
        )


@pytest.mark.parametrize(
    ("header", "expected"),
    [
        (["Frequency", "Gain", "Phase"], f"f='Frequency':{ANY_F} mag='Gain':dB-or-linear phase='Phase':deg-or-rad"),
        (["", "", ""], f"f=1:{ANY_F} mag=2:dB-or-linear phase=3:deg-or-rad"),
        (["a", "b"], f"f='a':{ANY_F} complex='b'"),
        (["f (kHz)", "x", "Re", "Im"], "f='f (kHz)':kHz re='Re' im='Im'"),
        (["it's f", "gain", "gain", "phase_rad"], f"f=1:{ANY_F} mag=2:dB-or-linear phase='phase_rad':rad"),
    ],
)
def test_example_uses_the_file_s_columns_and_leaves_no_guess_to_paste(header: list[str], expected: str) -> None:
    example = example_choice([meaning_of(text) for text in header])
    open_units = [part.split("=")[0] for part in expected.split() if "-or-" in part]
    hint = f" (choose the unit of {', '.join(open_units)})" if open_units else ""
    assert example == f'--columns "{expected}"{hint}'
    if open_units:
        with pytest.raises(UsageError, match=r"-or-.*; expected one of "):
            ColumnChoice.parse(expected)
    settled = re.sub("-or-[^ ]*", "", expected)
    assert ColumnChoice.parse(settled).columns
