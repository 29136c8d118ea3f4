"""The design file to fill in: read as it is, with everything optional in use, and by roots instead of elements."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.design import LIMITED_QUANTITIES, Design, HalfPlane, read_design
from fitamp.design.keys import KEYS
from fitamp.design.template import design_template, example_line


def in_use(text: str) -> str:
    """The text with every optional entry in use."""
    return re.sub(r"(?m)^#(?=[A-Za-z\[])", "", text)


def parts(text: str) -> dict[str, str]:
    """The tables by name, each with its heading."""
    return {match[1]: match[0] for match in re.finditer(r"(?ms)^\[(\w+)\].*?(?=^\[|\Z)", text)}


def read(tmp_path: Path, text: str) -> Design:
    path = tmp_path / "template.toml"
    path.write_text(text, encoding="utf-8")
    return read_design(path)


def test_template_is_read_as_it_is_and_promises_nothing(tmp_path: Path) -> None:
    design = read(tmp_path, design_template())
    assert design.elements is not None
    assert set(design.spreads) == set(ELEMENT_NAMES)
    assert design.assumed_spreads == ()
    assert design.under_test == {"Rz"}
    assert design.half_plane is HalfPlane.LEFT
    assert dict(design.limits) == {}
    assert (design.bench.load_f, design.bench.delay_s) == (0.0, None)


def test_every_table_and_key_is_there() -> None:
    document = tomllib.loads(in_use(design_template()))
    assert {name: tuple(table) for name, table in document.items()} == dict(KEYS)


def test_everything_optional_can_be_used_at_once(tmp_path: Path) -> None:
    tables = parts(in_use(design_template()))
    del tables["designed"]
    design = read(tmp_path, "".join(tables.values()))
    assert design.elements is not None
    assert design.elements.Cgd > 0
    assert design.elements.mirror_pole_hz == 600e6
    assert set(design.limits) == set(LIMITED_QUANTITIES)
    assert design.bench.load_f == pytest.approx(2e-12)
    assert design.bench.delay_s == pytest.approx(0.4e-9)


def test_roots_may_stand_instead_of_elements(tmp_path: Path) -> None:
    tables = parts(in_use(design_template()))
    design = read(tmp_path, "".join(tables[name] for name in ("about", "designed", "limits")))
    assert design.roots is not None
    assert design.roots.pole3_hz == 700e6
    assert design.roots.zero_time_s > 0


def test_limits_of_the_template_hold_its_own_design(tmp_path: Path) -> None:
    tables = parts(in_use(design_template()))
    design = read(tmp_path, "".join(tables[name] for name in ("about", "elements", "limits")))
    transfer = design.transfer()
    assert design.limits["dc_gain"].contains(transfer.dc_gain)
    zero = min(transfer.zeros_hz, key=abs)
    assert design.limits["zero_hz"].contains(abs(zero))


def test_lines_are_plain_and_fit_a_screen() -> None:
    text = design_template()
    assert text.isascii()
    assert text.endswith("\n")
    assert max(map(len, text.splitlines())) <= 120
    assert example_line("elements", "Cc") == 'Cc = { value = "1.8 pF", spread = "6 %" }'
