"""The TOML design file: strict reading with every refusal in one line, and writing that reads back the same.

Tables: [about] name, note; [elements] or [designed]; [loop] beta, delay; [limits]; [bench] load, delay. A value
is text with its unit, "1.6 mS", or a table { value, spread, under_test }. A name that is not known is refused,
not ignored, and nothing in the file is executed. What the parts mean: `fitamp.design`.
"""

from __future__ import annotations

import hashlib
import os
from functools import partial
from os import PathLike
from pathlib import Path
from typing import Any

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design.document import Faults, Table, file_bytes, home_of, known_tables, parse_toml
from fitamp.design.entries import (
    Entry,
    read_beta,
    read_entry,
    read_gain,
    read_half_plane,
    read_limit,
    read_line,
    read_quantity,
    read_spread,
    read_time_spread,
)
from fitamp.design.keys import ELEMENT_KEYS, KEYS, ROOT_KEYS
from fitamp.design.model import SMALL_ZERO_RATIO, Design
from fitamp.design.parts import Bench, HalfPlane, Limit, Roots
from fitamp.design.template import example_line
from fitamp.design.writing import design_text
from fitamp.errors import UsageError
from fitamp.units import si, to_db

__all__ = ["read_design", "write_design"]

_MAY_BE_ZERO = {"Rz", "Cgd"}


def read_design(path: str | PathLike[str]) -> Design:
    """Read a design file.

    Raises
    ------
    DesignError
        In one line, with file, table, key, what was found and what was expected; of several faults the first,
        and how many more there are.
    """
    file = os.fspath(path)
    data = file_bytes(file)
    faults = Faults()
    document = parse_toml(file, data)
    tables = known_tables(document, KEYS, faults)
    common: dict[str, Any] = {"file": file, "sha256": hashlib.sha256(data).hexdigest()}
    common |= _read_about(tables.get("about", {}), faults, Path(file).stem)
    common |= {"bench": _read_bench(tables.get("bench", {}), faults)}
    limits, half_plane, small_zero_ratio = _read_limits(tables.get("limits", {}), faults)
    common |= {"limits": limits, "small_zero_ratio": small_zero_ratio}
    loop = _read_loop(tables.get("loop", {}), faults)
    if ("elements" in tables) == ("designed" in tables):
        found = "both [elements] and [designed]" if "elements" in tables else "neither [elements] nor [designed]"
        if "elements" in tables or all(home_of(name, document, KEYS) is None for name in document):
            faults.add(f"{found}; expected one of the two")
        raise faults.error(file)
    if "elements" in tables:
        design = _element_design(tables["elements"], loop, half_plane, common, faults)
    else:
        design = _root_design(tables["designed"], loop, half_plane, common, faults)
    if design is None:
        raise faults.error(file)
    return design


def write_design(design: Design, path: str | PathLike[str]) -> None:
    """Write a design file, in place of what is there; read again, it is the same design.

    Raises
    ------
    UsageError
        When the file cannot be written.
    """
    file = os.fspath(path)
    try:
        Path(file).write_text(design_text(design), encoding="utf-8", newline="\n")
    except OSError as error:
        raise UsageError(f"{file}: cannot be written ({error.strerror}); choose another place") from error


def _read_about(table: Table, faults: Faults, otherwise: str) -> dict[str, str]:
    about = {"name": otherwise, "note": ""}
    for key, raw in table.items():
        with faults.at("about", key):
            about[key] = read_line(raw, lines_allowed=key == "note")
    return about


def _read_bench(table: Table, faults: Faults) -> Bench:
    load = Entry(value=0.0)
    delay: Entry | None = None
    if "load" in table:
        with faults.at("bench", "load"):
            load = read_entry(table["load"], lambda raw: read_quantity(raw, "F", zero_allowed=True))
    if "delay" in table:
        with faults.at("bench", "delay"):
            delay = read_entry(table["delay"], _read_delay, read_its_spread=read_time_spread)
    return Bench(
        load_f=load.value,
        load_spread=load.spread or 0.0,
        delay_s=None if delay is None else delay.value,
        delay_spread_s=(delay.spread if delay is not None else None) or 0.0,
    )


def _read_limits(table: Table, faults: Faults) -> tuple[dict[str, Limit], HalfPlane | None, float]:
    limits: dict[str, Limit] = {}
    half_plane: HalfPlane | None = None
    small_zero_ratio = SMALL_ZERO_RATIO
    for key, raw in table.items():
        with faults.at("limits", key):
            if key == "half_plane":
                half_plane = read_half_plane(raw)
            elif key == "small_zero":
                small_zero_ratio = read_spread(raw)
            else:
                limits[key] = read_limit(raw, key)
    return limits, half_plane, small_zero_ratio


def _read_loop(table: Table, faults: Faults) -> dict[str, float]:
    """What [loop] states: beta, delay_s."""
    loop: dict[str, float] = {}
    if "beta" in table:
        with faults.at("loop", "beta"):
            loop["beta"] = read_beta(table["beta"])
    if "delay" in table:
        with faults.at("loop", "delay"):
            loop["delay_s"] = _read_delay(table["delay"])
    return loop


def _read_delay(raw: object) -> float:
    return read_quantity(raw, "s", zero_allowed=True)


def _element_design(
    table: Table, loop: dict[str, float], half_plane: HalfPlane | None, common: Table, faults: Faults
) -> Design | None:
    entries: dict[str, Entry] = {}
    for key, raw in table.items():
        name, unit = ELEMENT_KEYS[key]
        with faults.at("elements", key):
            read = partial(read_quantity, unit=unit, zero_allowed=key in _MAY_BE_ZERO)
            entries[name] = read_entry(raw, read, may_be_under_test=True)
    missing = [name for name in ELEMENT_NAMES if name not in table]
    if missing:
        faults.add(_lacks("elements", missing))
    if faults.found:
        return None
    design = None
    with faults.at("elements"):
        elements = Elements(**{name: entry.value for name, entry in entries.items()}, **loop)
        with faults.at("limits", "half_plane"):  # with sound elements, this is all that can be refused
            design = Design.from_elements(
                elements,
                spreads=_spreads(entries),
                under_test=[name for name, entry in entries.items() if _is_under_test(name, entry)],
                half_plane=half_plane,
                **common,
            )
    return _checked(design, "elements", faults)


def _lacks(table: str, missing: list[str]) -> str:
    each = "for each, " if len(missing) > 1 else ""
    zero = ', or Rz = "0 Ohm" where there is no resistor' if missing == ["Rz"] else ""
    return f"[{table}]: lacks {', '.join(missing)}; add a line {each}such as {example_line(table, missing[0])}{zero}"


def _root_design(
    table: Table, loop: dict[str, float], half_plane: HalfPlane | None, common: Table, faults: Faults
) -> Design | None:
    entries: dict[str, Entry] = {}
    for key, raw in table.items():
        with faults.at("designed", key):
            if key == "dc_gain":
                entries["dc_gain"] = read_entry(raw, read_gain)
            elif key != "half_plane" and not (key == "zero" and raw == "none"):
                entries[ROOT_KEYS[key]] = read_entry(raw, partial(read_quantity, unit="Hz"))
    place = half_plane
    if "half_plane" in table:
        with faults.at("designed", "half_plane"):
            place = read_half_plane(table["half_plane"])
            if half_plane not in {None, place}:
                faults.add(f"[limits] half_plane: is '{half_plane}', but [designed] says '{place}'")
    missing = [key for key in ("dc_gain", "pole1", "pole2") if key not in table]
    if "zero" not in table and place is not HalfPlane.INFINITY:
        missing.append("zero")
    if "half_plane" not in table and half_plane is None:
        missing.append("half_plane")
    if missing:
        faults.add(_lacks("designed", missing))
    if "beta" in loop:
        faults.add("[loop] beta: is part of dc_gain in [designed]; leave it out")
    if common["bench"].load_f:
        faults.add("[bench] load: cannot be added to [designed]; give the poles as loaded, or [elements]")
    if faults.found or place is None:
        return None
    design = None
    with faults.at("designed"):
        values = {name: entry.value for name, entry in entries.items()}
        delay = {"delay_s": loop.get("delay_s", 0.0)}
        roots = Roots(**values, **delay, half_plane=place, spreads=_spreads(entries))
        design = Design.from_roots(roots, **common)
    return _checked(design, "designed", faults)


def _spreads(entries: dict[str, Entry]) -> dict[str, float]:
    return {name: entry.spread for name, entry in entries.items() if entry.spread is not None}


def _is_under_test(name: str, entry: Entry) -> bool:
    return name == "Rz" if entry.under_test is None else entry.under_test


def _checked(design: Design | None, table: str, faults: Faults) -> Design | None:
    """Refuse what only shows when all is read: numbers beyond computing, and a limit that nothing can keep."""
    if design is None:
        return None
    try:
        with np.errstate(all="ignore"):
            gain = design.transfer().dc_gain
            design.on_bench()
    except (ValueError, ArithmeticError):
        faults.add(f"[{table}]: no loop gain can be computed from these values; check the prefixes of the units")
        return None
    gain_limit = design.limits.get("dc_gain")
    if gain_limit is not None and not gain_limit.contains(gain) and gain_limit.contains(to_db(gain)):
        faults.add(
            f"[limits] dc_gain: a plain number is V/V, and the design has {si(gain, 'V/V')}; write decibels as text, "
            f'such as "{to_db(gain):.0f} dB"'
        )
    zero_limit = design.limits.get("zero_hz")
    if design.half_plane is HalfPlane.INFINITY and zero_limit is not None and zero_limit.high is not None:
        faults.add(
            f"[limits] zero_hz: ends at {si(zero_limit.high, 'Hz')}, but the zero is designed at infinity; "
            "open that end with inf, or state half_plane"
        )
    return None if faults.found else design
