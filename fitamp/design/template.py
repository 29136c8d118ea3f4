"""A design file to fill in, with every table and key that there is."""

from __future__ import annotations

from collections.abc import Iterator

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.design.keys import KEYS
from fitamp.design.model import SMALL_ZERO_RATIO
from fitamp.design.parts import DEFAULT_SPREAD, HalfPlane

__all__ = ["design_template", "example_line"]

_HEAD = f"""\
# Design file of a Miller-compensated two-stage amplifier, for fitamp compare. All values are invented: put in yours.
# A value is text with its unit, "1.6 mS", or a table with a spread, one standard deviation: "8 %", or 0.08.
# A spread that is not stated is taken as {100 * DEFAULT_SPREAD:.0f} %, and the answer says so.
# under_test = true marks what is to be judged: its spread is then no prior. Rz is, unless it says under_test = false.
# Lines that start with # and a key are optional: take the # away to use them."""

# An invented, consistent design: every key of every table, so that a new one cannot be forgotten here.
_ENTRIES: dict[str, dict[str, tuple[str, str]]] = {
    "about": {
        "name": ('"line buffer"', "for tables and pictures; else the file's name"),
        "note": ('"first silicon"', "a remark"),
    },
    "elements": {
        "gm1": ('{ value = "150 uS", spread = "8 %" }', "first stage"),
        "R1": ('{ value = "1.0 MOhm", spread = "15 %" }', "output of the first stage to ground"),
        "C1": ('{ value = "200 fF", spread = "10 %" }', "likewise"),
        "gm2": ('{ value = "1.6 mS", spread = "8 %" }', "second stage, inverting"),
        "R2": ('{ value = "50 kOhm", spread = "15 %" }', "output of the second stage to ground"),
        "CL": ('{ value = "4.0 pF", spread = "5 %" }', "likewise, without what the bench adds"),
        "Cc": ('{ value = "1.8 pF", spread = "6 %" }', "in series with Rz across the second stage"),
        "Rz": (
            '{ value = "1.3 kOhm", spread = "12 %" }',
            'nulling resistor; "0 Ohm" without one',
        ),
        "Cgd": ('{ value = "10 fF", spread = "30 %" }', "overlap across the second stage, bypasses Rz"),
        "mirror_pole": ('{ value = "600 MHz", spread = "20 %" }', "pole of a current mirror in the first stage"),
    },
    "designed": {
        "dc_gain": ('{ value = "82 dB", spread = "20 %" }', "loop gain at DC; a plain number is V/V"),
        "pole1": ('{ value = "1.0 kHz", spread = "20 %" }', "distance from the origin, above 0"),
        "pole2": ('{ value = "45 MHz", spread = "15 %" }', "likewise, with the load of the bench"),
        "pole3": ('{ value = "700 MHz", spread = "20 %" }', "if known"),
        "zero": ('{ value = "130 MHz", spread = "15 %" }', '"none" for a zero at infinity'),
        "half_plane": (f'"{HalfPlane.LEFT}"', f"one of {', '.join(HalfPlane)}"),
    },
    "loop": {
        "beta": ("1.0", "feedback factor, above 0"),
        "delay": ('"0.1 ns"', "delay inside the amplifier's loop"),
    },
    "limits": {
        "dc_gain": ('["76 dB", "88 dB"]', "a plain number is V/V"),
        "gain_bandwidth_hz": ('["9 MHz", "18 MHz"]', "a plain number is Hz"),
        "pole1_hz": ('["none", "3 kHz"]', ""),
        "pole2_hz": ('["30 MHz", "90 MHz"]', ""),
        "zero_hz": ('["90 MHz", "200 MHz"]', ""),
        "crossover_hz": ('["9 MHz", "18 MHz"]', ""),
        "phase_margin_deg": ("[65, 90]", "degrees"),
        "gain_margin_db": ("[12, inf]", "dB"),
        "half_plane": (f'"{HalfPlane.LEFT}"', "place of the zero; else it follows from the elements"),
        "small_zero": (f"{SMALL_ZERO_RATIO}", "share of Cc/gm2 up to which a zero time counts as none"),
    },
    "bench": {
        "load": ('{ value = "2 pF", spread = "5 %" }', "added to CL by probe and socket"),
        "delay": ('{ value = "0.4 ns", spread = "0.02 ns" }', "added by cables; without this line it is not known"),
    },
}
_HEADINGS = {
    "limits": 'what was promised, as [low, high]; "none" leaves an end open',
    "bench": "what the measurement adds",
}
_ALTERNATIVE = """\
# Instead of [elements], a design may give its poles and zero. [loop] beta and [bench] load then belong to these values
# and must be left out."""


def design_template() -> str:
    """A commented design file with all tables and keys, which `fitamp.design.read_design` takes as it is.

    Entries that are optional stand behind a ``#`` without a space after it, and so does the whole table
    ``[designed]``, which replaces ``[elements]``.
    """
    blocks = [_HEAD]
    blocks += ["\n".join(_table(name)) for name in KEYS if name != "designed"]
    alternative = [line if line.startswith("#") else f"#{line}" for line in _table("designed")]
    return "\n\n".join([*blocks, "\n".join([_ALTERNATIVE, *alternative])]) + "\n"


def example_line(table: str, key: str) -> str:
    """An entry as it may stand in a design file, without remark."""
    return f"{key} = {_ENTRIES[table][key][0]}"


def _table(name: str) -> Iterator[str]:
    yield f"[{name}]  # {_HEADINGS[name]}" if name in _HEADINGS else f"[{name}]"
    for key in KEYS[name]:
        remark = _ENTRIES[name][key][1]
        needed = key in ELEMENT_NAMES or (name, key) == ("about", "name")
        entry = f"{'' if needed else '#'}{example_line(name, key)}"
        yield f"{entry:<53}  # {remark}" if remark else entry
