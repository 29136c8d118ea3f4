"""What a port of the opened loop sees."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray
from fitamp.errors import UsageError
from fitamp.units import parse_quantity, si

__all__ = ["LOOP", "NO_IMPEDANCE", "Termination"]

_ACROSS = re.compile(r"\|\||∥")
_EXAMPLE = '"50 Ohm", "1 MOhm || 2 pF", open or loop'


@dataclass(frozen=True, slots=True, kw_only=True)
class Termination:
    """What a port of the opened loop sees: a resistance, with a capacitance across it, or the loop itself.

    resistance_ohm : above 0, or infinite for an open port, or 0 for a source without impedance
    capacitance_f : across it, 0 or more
    is_loop : the loop's own other end, in place of both
    """

    resistance_ohm: float = math.inf
    capacitance_f: float = 0.0
    is_loop: bool = False

    def __post_init__(self) -> None:
        if not self.resistance_ohm >= 0 or not 0 <= self.capacitance_f < math.inf:
            raise UsageError(
                f"a termination of {self.resistance_ohm:g} ohm and {self.capacitance_f:g} F is none; give a resistance "
                "and a capacitance of 0 or more"
            )

    @classmethod
    def parse(cls, text: str) -> Termination:
        """Read ``"50 Ohm"``, ``"2 pF"``, ``"1 MOhm || 2 pF"``, ``open`` or ``loop``.

        Raises
        ------
        UsageError
            Saying what was found and what is expected.
        """
        word = text.strip().lower()
        if word in ("open", "loop"):
            return LOOP if word == "loop" else cls()
        found: dict[str, float] = {}
        for part in _ACROSS.split(text):
            unit = "F" if part.strip().endswith(("F", "f")) else "Ω"
            try:
                value = parse_quantity(part.strip(), unit)
            except ValueError as error:
                raise UsageError(f"termination {text!r}: {error}; expected {_EXAMPLE}") from None
            if unit in found:
                raise UsageError(f"termination {text!r} has two parts in {unit}; expected {_EXAMPLE}")
            found[unit] = value
        return cls(resistance_ohm=found.get("Ω", math.inf), capacitance_f=found.get("F", 0.0))

    def reflection(self, freq_hz: ArrayLike, reference_ohm: ArrayLike) -> ComplexArray:
        """Reflection factor, shape (n,), against a reference resistance; nothing of the loop in it."""
        if self.resistance_ohm == 0:
            return np.full(np.shape(freq_hz), -1.0 + 0j)
        admittance = 1 / self.resistance_ohm + 2j * np.pi * np.asarray(freq_hz, dtype=float) * self.capacitance_f
        relative = admittance * np.asarray(reference_ohm)
        return np.asarray((1 - relative) / (1 + relative), dtype=complex)

    def __str__(self) -> str:
        if self.is_loop:
            return "the loop itself"
        if math.isinf(self.resistance_ohm):
            return f"open, {si(self.capacitance_f, 'F')}" if self.capacitance_f else "open"
        across = f" across {si(self.capacitance_f, 'F')}" if self.capacitance_f else ""
        return f"{si(self.resistance_ohm, 'Ω')}{across}"


LOOP = Termination(is_loop=True)
NO_IMPEDANCE = Termination(resistance_ohm=0.0)
