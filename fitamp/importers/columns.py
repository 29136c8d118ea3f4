"""Which columns of a text table make the loop gain: as the header says without doubt, or as the user chose."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType

from fitamp.errors import SweepError
from fitamp.importers.cells import show
from fitamp.importers.choice import FORMS, ColumnChoice, ColumnRef, example_choice
from fitamp.importers.header import Header
from fitamp.importers.quantity import UNITS_OF, Meaning, Quantity, Unit
from fitamp.sweep import Decision

__all__ = ["Column", "Columns", "chosen_columns", "told_columns"]

_NONE: Mapping[int, Unit] = MappingProxyType({})


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column in use: its index from 0, its header, what it holds, and its unit (None for V/V)."""

    index: int
    name: str
    quantity: Quantity
    unit: Unit | None

    @property
    def label(self) -> str:
        """The column as messages name it, counted from 1."""
        return f"column {self.index + 1}" + (f" ({show(self.name)})" if self.name else "")


@dataclass(frozen=True, slots=True, kw_only=True)
class Columns:
    """Frequency and the one or two columns of the gain, with `check` columns that have to agree with them."""

    frequency: Column
    gain: tuple[Column, ...]
    check: tuple[Column, ...] = ()
    decisions: tuple[Decision, ...] = ()

    @property
    def trace(self) -> str:
        """The gain's columns by name."""
        return ", ".join(column.name or f"column {column.index + 1}" for column in self.gain)


def chosen_columns(
    file: str, choice: ColumnChoice, header: Header, *, units_in_cells: Mapping[int, Unit] = _NONE
) -> Columns:
    """Look up the columns of a choice.

    Parameters
    ----------
    units_in_cells
        Units that stand behind the digits of a column's cells, by the column's index.

    Raises
    ------
    SweepError
        When a column is not in the file, or neither choice nor header gives a unit that is needed.
    """
    header, units = _with_units_in_cells(header, units_in_cells)
    found = {quantity: _look_up(file, quantity, ref, header) for quantity, ref in choice.columns.items()}
    form = next(form for form in FORMS if set(form) <= set(found))
    gain = tuple(found[quantity] for quantity in form)
    frequency = found[Quantity.FREQUENCY]
    decisions = (*units, *_decisions((frequency, *gain), "as given by --columns"))
    return Columns(frequency=frequency, gain=gain, decisions=decisions)


def told_columns(
    file: str, header: Header, complex_columns: Sequence[int], *, units_in_cells: Mapping[int, Unit] = _NONE
) -> Columns:
    """Take the columns that the header names without doubt.

    Parameters
    ----------
    complex_columns
        Indices of columns whose cells are complex numbers.
    units_in_cells
        Units that stand behind the digits of a column's cells, by the column's index.

    Raises
    ------
    SweepError
        When the header leaves a doubt; the message names ``--columns`` with an example for this file.
    """
    header, units = _with_units_in_cells(header, units_in_cells)
    meanings = [_with_content(m, index in complex_columns) for index, m in enumerate(header.meanings)]
    remedy = f"say which columns to use, as in {example_choice(meanings)}"
    if header.line is None:
        raise SweepError(f"{file}: no header names the {len(meanings)} columns; {remedy}")
    if header.others:
        *first, last = map(str, header.others)
        others = f"lines {', '.join(first)} and {last} may be headers" if first else f"line {last} may be a header"
        remedy = f"{others} as well: keep one header, or {remedy}"
    place = f"{file}, line {header.line}"
    frequency = _the_one(place, Quantity.FREQUENCY, meanings, remedy)
    form = _form(place, meanings, remedy)
    gain = tuple(_the_one(place, quantity, meanings, remedy) for quantity in form)
    check: tuple[Column, ...] = ()
    if form == FORMS[0] and _is_determined(meanings, FORMS[1]):
        check = tuple(_the_one(place, quantity, meanings, remedy) for quantity in FORMS[1])
    decisions = (*units, *_decisions((frequency, *gain), f"named by the header on line {header.line}"))
    return Columns(frequency=frequency, gain=gain, check=check, decisions=decisions)


def _with_units_in_cells(header: Header, units: Mapping[int, Unit]) -> tuple[Header, tuple[Decision, ...]]:
    """The header with the units that only the cells say."""
    meanings, decisions = list(header.meanings), []
    for index, unit in units.items():
        meaning = meanings[index]
        if meaning.unit is not None or (meaning.quantity and unit not in UNITS_OF[meaning.quantity]):
            continue
        meanings[index] = replace(meaning.with_unit(unit), text=meaning.text, doubt="")
        reason = f"every cell of column {index + 1} has it behind the digits"
        decisions.append(Decision(topic="unit in the cells", choice=unit.value, reason=reason))
    return replace(header, meanings=tuple(meanings)), tuple(decisions)


def _with_content(meaning: Meaning, is_complex: bool) -> Meaning:
    if not is_complex:
        # Complex in name only ("complex loop gain") is no complex column.
        return Meaning(text=meaning.text) if meaning.quantity is Quantity.COMPLEX else meaning
    return Meaning(text=meaning.text, quantity=Quantity.COMPLEX)


def _form(place: str, meanings: Sequence[Meaning], remedy: str) -> tuple[Quantity, ...]:
    """Which quantities give the gain."""
    present = {meaning.quantity for meaning in meanings}
    forms = [form for form in FORMS if set(form) <= present]
    if not forms:
        lacking = {
            Quantity.MAGNITUDE: "a magnitude but no phase",
            Quantity.PHASE: "a phase but no magnitude",
            Quantity.REAL: "a real part but no imaginary part",
            Quantity.IMAGINARY: "an imaginary part but no real part",
        }
        remedy = remedy if any(meaning.quantity is None for meaning in meanings) else "export what is missing"
        found = next((text for quantity, text in lacking.items() if quantity in present), "no loop gain")
        raise SweepError(
            f"{place}: the header names {found}; a complex loop gain needs real and imaginary part, magnitude and "
            f"phase, or complex numbers; {remedy}"
        )
    if len(forms) > 1 and Quantity.COMPLEX in present:
        raise SweepError(f"{place}: the header names a complex column and parts of a gain as well; {remedy}")
    return forms[0]


def _is_determined(meanings: Sequence[Meaning], form: Sequence[Quantity]) -> bool:
    return all(len([m for m in meanings if m.quantity is quantity and m.unit is not None]) == 1 for quantity in form)


def _the_one(place: str, quantity: Quantity, meanings: Sequence[Meaning], remedy: str) -> Column:
    """The one column that holds a quantity in a known unit."""
    held = [(index, m) for index, m in enumerate(meanings) if m.quantity is quantity]
    held = [(index, m) for index, m in held if not m.weak] or held
    if not held:
        raise SweepError(f"{place}: no column is named as {_WORDS[quantity]}; {remedy}")
    units = UNITS_OF[quantity]
    determined = [(index, m) for index, m in held if m.unit is not None or not units]
    if len(determined) > 1 or (not determined and len(held) > 1):
        names = ", ".join(show(m.text) for _, m in determined or held)
        raise SweepError(f"{place}: {names} may each be the {_WORDS[quantity]}; {remedy}")
    if not determined:
        index, meaning = held[0]
        wanted = " or ".join([", ".join(units[:-1]), units[-1]])
        raise SweepError(
            f"{place}, column {index + 1}: {show(meaning.text)} does not say whether the {_WORDS[quantity]} is in "
            f"{wanted}{f' ({meaning.doubt})' if meaning.doubt else ''}; {remedy}"
        )
    index, meaning = determined[0]
    return Column(index=index, name=meaning.text, quantity=quantity, unit=meaning.unit)


def _look_up(file: str, quantity: Quantity, ref: ColumnRef, header: Header) -> Column:
    names = [meaning.text for meaning in header.meanings]
    if isinstance(ref.column, int):
        if ref.column > len(names):
            raise SweepError(
                f"{file}: --columns gives {quantity} column {ref.column}, but the file has {len(names)} columns"
            )
        index = ref.column - 1
    else:
        hits = [i for i, name in enumerate(names) if name == ref.column]
        if len(hits) != 1:
            has = ", ".join(map(show, names)) if header.line is not None else "no header"
            fault = "more than once" if hits else "not at all"
            raise SweepError(
                f"{file}: --columns asks for {show(ref.column)}, which is there {fault} (the file has {has}); "
                "name the column by its number from 1"
            )
        index = hits[0]
    units = UNITS_OF[quantity]
    unit = ref.unit
    if unit is None and header.meanings[index].unit in units:
        unit = header.meanings[index].unit
    if unit is None and units:
        raise SweepError(
            f"{file}: neither --columns nor the header says whether {quantity} is in {' or '.join(units)}; "
            f"write {quantity}={index + 1}:{units[0]} or the like"
        )
    return Column(index=index, name=names[index], quantity=quantity, unit=unit)


def _decisions(columns: Sequence[Column], reason: str) -> tuple[Decision, ...]:
    return tuple(
        Decision(
            topic=_WORDS[column.quantity],
            choice=f"{column.label} in {column.unit or 'V/V'}",
            reason=reason + ("; omega is angular frequency" if column.unit is Unit.RAD_PER_S else ""),
        )
        for column in columns
    )


_WORDS = {
    Quantity.FREQUENCY: "frequency",
    Quantity.MAGNITUDE: "magnitude",
    Quantity.PHASE: "phase",
    Quantity.REAL: "real part",
    Quantity.IMAGINARY: "imaginary part",
    Quantity.COMPLEX: "complex gain",
}
