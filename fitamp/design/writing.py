"""A design as the text of its TOML file, digit for digit, with what differs from the defaults."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design.model import LIMITED_QUANTITIES, SMALL_ZERO_RATIO, Design
from fitamp.design.parts import Limit, Roots
from fitamp.units import si_exact

__all__ = ["design_text"]

_ELEMENT_UNITS = {"g": "S", "R": "Ω", "C": "F"}  # by the first letter of the name
_HEADINGS = {
    "elements": "value with unit; spread = one standard deviation, relative",
    "limits": "what was promised",
    "bench": "what the bench adds",
}


def design_text(design: Design) -> str:
    """Write a design as the text of a design file."""
    stated = {name: value for name, value in design.spreads.items() if name not in design.assumed_spreads}
    tables: dict[str, list[str]] = {"about": list(_about(design))}
    if design.elements is not None:
        tables["elements"] = list(_elements(design.elements, stated, design.under_test))
        tables["loop"] = list(_loop(design.elements.beta, design.elements.delay_s))
    if design.roots is not None:
        tables["designed"] = list(_roots(design.roots, design.assumed_spreads))
        tables["loop"] = list(_loop(1.0, design.roots.delay_s))
    tables["limits"] = list(_limits(design))
    tables["bench"] = list(_bench(design))
    blocks = ["\n".join([_heading(name), *lines]) for name, lines in tables.items() if lines]
    return "\n\n".join(blocks) + "\n"


def _heading(name: str) -> str:
    return f"[{name}]  # {_HEADINGS[name]}" if name in _HEADINGS else f"[{name}]"


def _about(design: Design) -> Iterator[str]:
    # JSON's escapes are a part of TOML's, and it escapes all that TOML wants escaped in printable text.
    for key, text in (("name", design.name), ("note", design.note)):
        if text:
            yield f"{key} = {json.dumps(text, ensure_ascii=False)}"


def _elements(elements: Elements, stated: Mapping[str, float], under_test: frozenset[str]) -> Iterator[str]:
    for name in ELEMENT_NAMES:
        yield _entry(name, getattr(elements, name), _ELEMENT_UNITS[name[0]], stated.get(name), name in under_test)
    if elements.Cgd or "Cgd" in stated:
        yield _entry("Cgd", elements.Cgd, "F", stated.get("Cgd"), "Cgd" in under_test)
    if elements.mirror_pole_hz is not None:
        name = "mirror_pole_hz"
        yield _entry("mirror_pole", elements.mirror_pole_hz, "Hz", stated.get(name), name in under_test)


def _roots(roots: Roots, assumed: tuple[str, ...]) -> Iterator[str]:
    for key in ("dc_gain", "pole1", "pole2", "pole3", "zero"):
        name, unit = ("dc_gain", "V/V") if key == "dc_gain" else (f"{key}_hz", "Hz")
        value = getattr(roots, name)
        if value is not None:
            yield _entry(key, value, unit, None if name in assumed else roots.spreads.get(name))
    yield f'half_plane = "{roots.half_plane}"'


def _loop(beta: float, delay_s: float) -> Iterator[str]:
    if beta != 1.0:
        yield f"beta = {beta!r}"
    if delay_s:
        yield f'delay = "{si_exact(delay_s, "s")}"'


def _limits(design: Design) -> Iterator[str]:
    for name, limit in design.limits.items():
        yield f"{name} = [{', '.join(_ends(limit, LIMITED_QUANTITIES[name]))}]"
    if design.elements is not None:
        yield f'half_plane = "{design.half_plane}"'
    if design.small_zero_ratio != SMALL_ZERO_RATIO:
        yield f"small_zero = {design.small_zero_ratio!r}"


def _ends(limit: Limit, unit: str) -> Iterator[str]:
    for end, otherwise in ((limit.low, "-inf"), (limit.high, "inf")):
        if end is None:
            yield otherwise
        else:
            yield f'"{_typed(end, "Hz")}"' if unit == "Hz" else repr(float(end))


def _bench(design: Design) -> Iterator[str]:
    bench = design.bench
    if bench.load_f:
        yield _entry("load", bench.load_f, "F", bench.load_spread or None)
    if bench.delay_s is not None:
        spread = f', spread = "{si_exact(bench.delay_spread_s, "s")}"' if bench.delay_spread_s else ""
        yield f'delay = {{ value = "{si_exact(bench.delay_s, "s")}"{spread} }}'


def _entry(key: str, value: float, unit: str, spread: float | None, under_test: bool | None = None) -> str:
    parts = [f'value = "{_typed(value, unit)}"']
    if spread is not None:
        parts.append(f"spread = {float(spread)!r}")
    if under_test if key != "Rz" else under_test is not None:
        parts.append(f"under_test = {str(under_test).lower()}")
    return f"{key} = {{ {', '.join(parts)} }}" if len(parts) > 1 else f'{key} = "{_typed(value, unit)}"'


def _typed(value: float, unit: str) -> str:
    """As it is typed on any keyboard."""
    return si_exact(value, unit).replace("Ω", "Ohm").replace("µ", "u")
