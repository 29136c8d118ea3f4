"""What a column holds and in which unit, told from its header cell.

A header decides only what it says. A name without a unit gives the quantity alone; whoever needs the unit then
has to ask for it. The one exception is omega, which is angular frequency by definition.
"""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, replace
from enum import StrEnum

from fitamp.importers.words import JAPANESE, WORDS, folded

__all__ = [
    "UNITS_OF",
    "Meaning",
    "Quantity",
    "Unit",
    "as_german",
    "doubt_of",
    "meaning_of",
    "names_sweeps",
    "unit_of",
]


class Quantity(StrEnum):
    """What a column holds; the value is the key used in a choice of columns."""

    FREQUENCY = "f"
    MAGNITUDE = "mag"
    PHASE = "phase"
    REAL = "re"
    IMAGINARY = "im"
    COMPLEX = "complex"


class Unit(StrEnum):
    """Units that a column may have; the value is the spelling used in a choice of columns."""

    HZ = "Hz"
    KHZ = "kHz"
    MHZ = "MHz"
    GHZ = "GHz"
    RAD_PER_S = "rad/s"
    DB = "dB"
    LINEAR = "linear"
    DEGREE = "deg"
    RADIAN = "rad"


# The units each quantity may have; real, imaginary and complex columns are V/V.
UNITS_OF: dict[Quantity, tuple[Unit, ...]] = {
    Quantity.FREQUENCY: (Unit.HZ, Unit.KHZ, Unit.MHZ, Unit.GHZ, Unit.RAD_PER_S),
    Quantity.MAGNITUDE: (Unit.DB, Unit.LINEAR),
    Quantity.PHASE: (Unit.DEGREE, Unit.RADIAN),
    Quantity.REAL: (),
    Quantity.IMAGINARY: (),
    Quantity.COMPLEX: (),
}
_SPELLINGS = {
    Unit.HZ: "hz hertz",
    Unit.KHZ: "khz kilohertz",
    Unit.MHZ: "mhz megahertz",
    Unit.GHZ: "ghz gigahertz",
    Unit.RAD_PER_S: "rad/s rad/sec rads/s radian/s radians/s rad_s rad_per_s rad·s−1 rad*s-1 rad·s^-1 rad*s^-1",
    Unit.DB: "db db20 decibel decibels dezibel decibelios",
    Unit.LINEAR: "linear lin v/v ratio lineaire lineal lineare",
    Unit.DEGREE: "deg degs degree degrees ° degre degres grados gradi",
    Unit.RADIAN: "rad rads radian radians bogenmass radiant radianes radianti",
}
# Units that say one thing here and another there; in German the first is degrees.
_DOUBTFUL = frozenset({"grad", "grads", "grade", "grades"})
_DEGREES_IN_GERMAN = "grad"


_UNIT_BY_SPELLING = {spelling: unit for unit, spellings in _SPELLINGS.items() for spelling in spellings.split()}
_MEANINGS = {
    "frequency": Quantity.FREQUENCY,
    "omega": Quantity.FREQUENCY,
    "magnitude": Quantity.MAGNITUDE,
    "phase": Quantity.PHASE,
    "real": Quantity.REAL,
    "imaginary": Quantity.IMAGINARY,
    "complex": Quantity.COMPLEX,
}


def _word_set(*kinds: str) -> frozenset[str]:
    return frozenset(word for kind in kinds for words in WORDS[kind].values() for word in words.split())


_QUANTITY_BY_WORD = {word: quantity for kind, quantity in _MEANINGS.items() for word in _word_set(kind)}
# "Loop gain phase", "real part of gain": here gain names the trace, not its magnitude.
_TRACE_WORDS = _word_set("trace")
_NEUTRAL = _word_set("neutral")
_SIDE_WORDS = _word_set("side")
_ANGULAR_WORDS = _word_set("omega", "angular")
_SWEEP_WORDS = _word_set("sweep")
_MEANT_BY_UNIT: dict[Unit, Quantity] = {
    unit: quantity for quantity, units in UNITS_OF.items() for unit in units if unit is not Unit.LINEAR
}
_SYMBOLS = {
    "ℜ": "re ",
    "ℑ": "im ",
    "∠": "phase ",
    "º": "°",
    "µ": "μ",
    "\N{GREEK CAPITAL LETTER OMEGA}": "ohm",
    "\N{OHM SIGN}": "ohm",
}
# A real part in volts or percent is no loop gain yet.
_SCALED = re.compile(r"[(\[]\s*(?!V/V\s*[)\]])(?:%|[mμunkp]?[VA](?:/[mμunkp]?[VA])?)\s*[)\]]\s*$")


@dataclass(frozen=True, slots=True, kw_only=True)
class Meaning:
    """One header cell: its text, what it names, its unit; None for what it does not say.

    `weak` where only the unit speaks, under a name that is not understood ("RBW (Hz)"); `doubt` says why a unit
    that is there does not count.
    """

    text: str
    quantity: Quantity | None = None
    unit: Unit | None = None
    weak: bool = False
    doubt: str = ""

    def with_unit(self, unit: Unit) -> Meaning:
        """Return this meaning with the unit from a row of its own; the unit may decide the quantity, too."""
        if self.quantity is None:
            return replace(self, unit=unit, quantity=_MEANT_BY_UNIT.get(unit), weak=not _is_neutral(self.text))
        if self.quantity is Quantity.MAGNITUDE and unit in UNITS_OF[Quantity.PHASE]:
            return meaning_of(f"{self.text} ({unit})")
        return replace(self, unit=unit)


def unit_of(text: str) -> Unit | None:
    """Read a unit, bare or in brackets; None where it is none of ours. ``mHz`` is not taken for MHz."""
    cell = _normalised(text)
    bracketed = re.fullmatch(r"[(\[{<]\s*(.*?)\s*[)\]}>]", cell)
    cell = bracketed[1] if bracketed else cell
    if cell.startswith("mH"):
        return None
    return _UNIT_BY_SPELLING.get(folded(cell))


def doubt_of(unit: str) -> str:
    """Why a unit, bare or in brackets, is not taken though it is one; empty where there is nothing to say."""
    word = unit.strip().strip("()[]{}<>").strip()
    return f"{word} may be degrees or gradians, 400 to the turn" if word.lower() in _DOUBTFUL else ""


def as_german(meaning: Meaning) -> Meaning:
    """Return what a cell means in a German header, where "Grad" is degrees."""
    if meaning.doubt.partition(" ")[0].lower() != _DEGREES_IN_GERMAN:
        return meaning
    return replace(meaning.with_unit(Unit.DEGREE), text=meaning.text, doubt="")


def names_sweeps(text: str) -> bool:
    """Whether a header cell names a column that numbers the sweeps of a file: ``Sweep``, ``run no.``."""
    words = [word for word in _words(_normalised(text)) if word not in {"no", "nr", "number", "index", "id", "num"}]
    return len(words) == 1 and words[0] in _SWEEP_WORDS


def meaning_of(text: str) -> Meaning:
    """Read a header cell such as ``Frequency (Hz)``, ``f / kHz``, ``mag_db``, ``Re(T)``, ``phase [rad]``."""
    meaning = _meaning(text.strip())
    doubt = doubt_of(re.split(r"[\s_/,:;=-]+", meaning.text)[-1]) if meaning.unit is None else ""
    return replace(meaning, doubt=doubt) if doubt else meaning


def _meaning(cell: str) -> Meaning:
    name, unit = _split_unit(_normalised(cell))
    words = _words(name)
    if any(word in _SIDE_WORDS for word in words):
        return Meaning(text=cell)
    quantity = _named(name, words, unit)
    if quantity is not None:
        if unit is None and _ANGULAR_WORDS & set(words):
            unit = Unit.RAD_PER_S
        fitting = UNITS_OF[quantity] or (Unit.LINEAR,)
        if (unit is not None and unit not in fitting) or (not UNITS_OF[quantity] and _SCALED.search(cell)):
            return Meaning(text=cell)  # "phase (Hz)": a contradiction decides nothing
        return Meaning(text=cell, quantity=quantity, unit=unit if UNITS_OF[quantity] else None)
    if unit is None:
        return Meaning(text=cell)
    return Meaning(text=cell, quantity=_MEANT_BY_UNIT.get(unit), unit=unit, weak=not _is_neutral(name))


def _named(name: str, words: list[str], unit: Unit | None) -> Quantity | None:
    """The quantity that the words of a name agree on."""
    if re.fullmatch(r"\s*\|.+\|\s*", name):
        return Quantity.MAGNITUDE
    if words == ["w"] and unit is Unit.RAD_PER_S:
        return Quantity.FREQUENCY
    found = {_QUANTITY_BY_WORD[word] for word in words if word in _QUANTITY_BY_WORD}
    if len(found) > 1 and not {"mag", "magnitude"} & set(words):
        found -= {_QUANTITY_BY_WORD[word] for word in words if word in _TRACE_WORDS}
    if found == {Quantity.MAGNITUDE} and unit in UNITS_OF[Quantity.PHASE] and _TRACE_WORDS & set(words):
        return Quantity.PHASE  # "Loop gain (deg)"
    return found.pop() if len(found) == 1 else None


def _is_neutral(name: str) -> bool:
    return all(word in _NEUTRAL or len(word) == 1 for word in _words(name))


def _words(name: str) -> list[str]:
    apart = re.sub(r"(?<=[a-zω])(?=[A-Z])", " ", name)
    return re.findall(r"[a-zωφ]+", folded(re.sub(r"\b[sS][0-9]{2}\b", " ", apart)))


def _normalised(text: str) -> str:
    for symbol, plain in _SYMBOLS.items():
        text = text.replace(symbol, plain)
    text = unicodedata.normalize("NFKC", text).replace("\N{DIVISION SLASH}", "/")
    if not text.isascii():
        for term, english in JAPANESE.items():
            text = text.replace(term, f" {english} ")
    return text.strip().strip("\"'").strip()


def _split_unit(cell: str) -> tuple[str, Unit | None]:
    """Name and unit of a header cell."""
    whole = unit_of(cell)
    if whole:
        return "", whole
    bracketed = re.fullmatch(r"(.*?)\s*[(\[{<]\s*(?:in\s+)?([^()\[\]{}<>]*)[)\]}>]", cell)
    if bracketed and (unit := unit_of(bracketed[2])):
        return bracketed[1], unit
    for gap in re.finditer(r"[\s_/,:;=-]+", cell):
        if unit := unit_of(cell[gap.end() :]):
            return cell[: gap.start()], unit
    leading = re.match(r"(db(?:20)?|deg)(?=[^a-z]|$)[\s_:]*", cell, re.IGNORECASE)
    if leading and (unit := unit_of(leading[1])):
        return cell[leading.end() :], unit
    glued = re.fullmatch(r"(.*[a-z|])([kMG]?Hz|dB|Deg|Rad)", cell)
    if glued and (unit := unit_of(glued[2])):
        return glued[1], unit
    if re.search(r"20\s*\*?\s*log", cell, re.IGNORECASE):
        return "magnitude", Unit.DB
    return cell, None
