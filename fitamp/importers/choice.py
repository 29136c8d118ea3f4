"""A choice of columns, written as text on the command line or in a call.

Items apart by spaces, each ``key=column`` or ``key=column:unit``:

* key: ``f`` frequency, ``mag`` magnitude, ``phase``, ``re`` real part, ``im`` imaginary part, ``complex``;
* column: its number from 1, or its header in quotes (bare where it has no space, colon or quote);
* unit: ``Hz kHz MHz GHz rad/s`` for f, ``dB linear`` for mag, ``deg rad`` for phase; may be left out where the
  header says it. Real, imaginary and complex columns are V/V and take none.

One of three sets is needed: f, mag, phase; or f, re, im; or f, complex.

>>> choice = ColumnChoice.parse("f='Frequency':MHz mag=2:dB phase=3:deg")
>>> choice.columns[Quantity.FREQUENCY]
ColumnRef(column='Frequency', unit=<Unit.MHZ: 'MHz'>)
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from fitamp.errors import UsageError
from fitamp.importers.quantity import UNITS_OF, Meaning, Quantity, Unit, unit_of

__all__ = ["ColumnChoice", "ColumnRef", "example_choice"]

# The sets of quantities that make a complex loop gain, frequency apart.
FORMS = (
    (Quantity.REAL, Quantity.IMAGINARY),
    (Quantity.MAGNITUDE, Quantity.PHASE),
    (Quantity.COMPLEX,),
)
_ITEM = re.compile(
    r"""\s*(?P<key>[A-Za-z]+)\s*=\s*(?:'(?P<single>[^']*)'|"(?P<double>[^"]*)"|(?P<bare>[^\s:'"]+))(?::(?P<unit>\S+))?(?=\s|$)"""
)
_EXAMPLE = "f=1:Hz mag=2:dB phase=3:deg"


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnRef:
    """One chosen column: its number from 1 or its header, and its unit (None: the header has to say)."""

    column: int | str
    unit: Unit | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ColumnChoice:
    """Which column holds which quantity; `columns` maps each to its `ColumnRef`.

    Raises
    ------
    UsageError
        When the quantities do not make a loop gain, or a unit does not fit its quantity.
    """

    columns: Mapping[Quantity, ColumnRef]

    def __post_init__(self) -> None:
        object.__setattr__(self, "columns", MappingProxyType(dict(self.columns)))
        keys = set(self.columns)
        if keys not in [{Quantity.FREQUENCY, *form} for form in FORMS]:
            named = " ".join(sorted(keys)) or "nothing"
            raise UsageError(
                f"--columns names {named}; expected f with re and im, f with mag and phase, or f with complex, "
                f'as in --columns "{_EXAMPLE}"'
            )
        for quantity, ref in self.columns.items():
            if ref.unit is not None and ref.unit not in UNITS_OF[quantity]:
                raise UsageError(f"--columns gives {quantity} the unit {ref.unit}; {_units_text(quantity)}")
            if isinstance(ref.column, int) and ref.column < 1:
                raise UsageError(f"--columns gives {quantity} column {ref.column}; columns count from 1")

    @classmethod
    def parse(cls, text: str) -> ColumnChoice:
        """Read a choice from text; the module's docstring has the syntax.

        Raises
        ------
        UsageError
            Naming the item that cannot be read.
        """
        columns: dict[Quantity, ColumnRef] = {}
        position = 0
        while text[position:].strip():
            item = _ITEM.match(text, position)
            if item is None:
                raise UsageError(
                    f"--columns: cannot read {text[position:].strip()!r}; expected key=column:unit, "
                    f'as in --columns "{_EXAMPLE}"'
                )
            quantity = _quantity(item["key"])
            if quantity in columns:
                raise UsageError(f"--columns names {quantity} twice; name each quantity once")
            columns[quantity] = ColumnRef(column=_column(item), unit=_unit(quantity, item["unit"]))
            position = item.end()
        return cls(columns=columns)


def example_choice(meanings: Sequence[Meaning]) -> str:
    """A choice to paste and complete, made of the columns of a file, with what is left to be chosen.

    A unit that the header lacks is shown as all that it may be, ``mag=2:dB-or-linear``, which `ColumnChoice.parse`
    refuses: a guess of ours must not be pasted unread.
    """
    places = {meaning.quantity: index for index, meaning in reversed(list(enumerate(meanings)))}
    form = next((form for form in FORMS if all(q in places for q in form)), None)
    if form is None:
        form = FORMS[1] if len(meanings) > 2 else FORMS[2]
    taken: set[int] = {places[q] for q in (Quantity.FREQUENCY, *form) if q in places}
    items, unsettled = [], []
    for quantity in (Quantity.FREQUENCY, *form):
        index = places.get(quantity)
        if index is None:
            index = next((i for i in range(len(meanings)) if i not in taken), len(meanings) - 1)
            taken.add(index)
        unit, units = meanings[index].unit, UNITS_OF[quantity]
        if units and unit not in units:
            unsettled.append(quantity)
        text = unit if unit in units else "-or-".join(units)
        items.append(f"{quantity}={_reference(meanings, index)}" + (f":{text}" if text else ""))
    choose = f" (choose the unit of {', '.join(unsettled)})" if unsettled else ""
    return f'--columns "{" ".join(items)}"{choose}'


def _reference(meanings: Sequence[Meaning], index: int) -> str:
    name = meanings[index].text
    unique = sum(meaning.text == name for meaning in meanings) == 1
    return f"'{name}'" if name and unique and not re.search(r"['\"$`\\\r\n]", name) else str(index + 1)


def _quantity(key: str) -> Quantity:
    try:
        return Quantity(key.lower())
    except ValueError:
        keys = ", ".join(Quantity)
        raise UsageError(f"--columns: key {key!r} is not known; expected one of {keys}") from None


def _column(item: re.Match[str]) -> int | str:
    if item["bare"] is not None:
        return int(item["bare"]) if re.fullmatch(r"[0-9]{1,6}", item["bare"]) else item["bare"]
    return item["single"] if item["single"] is not None else item["double"]


def _unit(quantity: Quantity, text: str | None) -> Unit | None:
    if text is None:
        return None
    unit = unit_of(text)
    if unit is None or unit not in UNITS_OF[quantity]:
        raise UsageError(f"--columns gives {quantity} the unit {text!r}; {_units_text(quantity)}")
    return unit


def _units_text(quantity: Quantity) -> str:
    units = ", ".join(UNITS_OF[quantity])
    return f"expected one of {units}" if units else f"{quantity} is V/V and takes no unit"
