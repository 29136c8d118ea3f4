"""The estimated part as a design: silicon becomes the next revision's starting point."""

from __future__ import annotations

import math
import os
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

from fitamp.design import Design, HalfPlane
from fitamp.design.writing import design_text
from fitamp.elements.condition import Condition
from fitamp.elements.result import ElementEstimate, EstimatedElement
from fitamp.errors import UsageError
from fitamp.units import si, si_with_error

__all__ = ["estimated_design", "estimated_design_text", "write_estimated_design"]

# A design's spread is below 1.
LARGEST_SPREAD = 0.99
# The shortest spread that is written: relative errors below this are those of a simulator's export.
SMALLEST_SPREAD = 1e-6


def estimated_design(estimate: ElementEstimate) -> Design:
    """The design with the estimated elements in place of the designed ones.

    Spreads are the relative standard errors, so that the part is known as well as its sweeps tell, and no better;
    values have digits to a hundredth of that. What is undetermined or was held stays as designed, as do limits, bench
    and what is under test. The zero is designed where the part has it.
    """
    design = estimate.design
    assert design.elements is not None
    values: dict[str, float] = {}
    spreads = {name: value for name, value in design.spreads.items() if name not in design.assumed_spreads}
    for one in estimate.elements:
        found = one.estimate
        if one.held or found.value is None or found.stderr is None:
            continue
        spreads.pop(one.name, None)
        values[one.name] = found.value
        if found.value:
            spread = min(max(found.stderr / found.value, SMALLEST_SPREAD), LARGEST_SPREAD)
            # Digits beyond a hundredth of the error would be noise.
            values[one.name] = _rounded(found.value, 3 - math.floor(math.log10(spread)))
            spreads[one.name] = _rounded(spread, 3)
    elements = replace(design.elements, **values)
    common: dict[str, Any] = {
        "spreads": spreads,
        "under_test": design.under_test,
        "limits": design.limits,
        "small_zero_ratio": design.small_zero_ratio,
        "bench": design.bench,
        "name": f"{design.name or 'design'}, as estimated",
        "note": design.note,
    }
    own = Design.from_elements(elements, **common)
    if own.half_plane is HalfPlane.INFINITY and design.half_plane is not HalfPlane.INFINITY:
        # A zero too small to have a side keeps the one it was designed for, which the limits on it need.
        return replace(own, half_plane=design.half_plane)
    return own


def _rounded(value: float, digits: int) -> float:
    return float(f"{value:.{digits - 1}e}")


def estimated_design_text(estimate: ElementEstimate) -> str:
    """The estimated design as the text of a design file, with remarks on where each number comes from."""
    remarks = "\n".join(f"# {line}" for line in _remarks(estimate))
    return f"{remarks}\n\n{design_text(estimated_design(estimate))}"


def write_estimated_design(estimate: ElementEstimate, path: str | os.PathLike[str]) -> None:
    """Write the estimated design as a design file, in place of what is there.

    Raises
    ------
    UsageError
        When the file cannot be written.
    """
    file = os.fspath(path)
    try:
        Path(file).write_text(estimated_design_text(estimate), encoding="utf-8", newline="\n")
    except OSError as error:
        raise UsageError(f"{file}: cannot be written ({error.strerror}); choose another place") from error


def _remarks(estimate: ElementEstimate) -> Iterator[str]:
    yield f"Elements as estimated by fitamp, in place of those of {_plain(estimate.design.file)}, from"
    for check in estimate.checks:
        added = f" with {_added(check.condition)}" if _added(check.condition) else ""
        yield f"  {_plain(check.file)}{added}{', left out: it shows another part' if check.left_out else ''}"
    yield "Spreads are relative standard errors of the estimate. From the sweeps comes this share of what is known:"
    for one in estimate.elements:
        yield f"  {one.name:<14} {_origin(one)}"
    if not estimate.is_trustworthy:
        yield "The estimate is not to be trusted without a look at its notes:"
        yield from (f"  {_plain(note.message)}" for note in estimate.notes)


def _origin(one: EstimatedElement) -> str:
    if one.held:
        return "held as designed, which gives it no spread"
    if one.estimate.value is None:
        return "not told by the sweeps, kept as designed"
    text = si_with_error(one.estimate.value, one.estimate.stderr, one.unit)
    return f"{one.informed:4.0%}   {text}, designed {si(one.designed, one.unit)}"


def _added(condition: Condition) -> str:
    parts = []
    if condition.load_added_f:
        parts.append(f"{si(condition.load_added_f, 'F', digits=3)} added")
    if condition.rz_added_ohm:
        way = "added to" if condition.rz_added_ohm > 0 else "taken from"
        parts.append(f"{si(abs(condition.rz_added_ohm), 'Ω', digits=3)} {way} Rz")
    return ", ".join(parts)


def _plain(text: str) -> str:
    """On one line, and without what a remark must not hold."""
    return "".join(character if character.isprintable() else "?" for character in text)
