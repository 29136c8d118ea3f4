"""One design as a value: what was designed, exactly, and what follows from it.

Reading and writing its file: `fitamp.design.file`.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.design.parts import ROOT_NAMES, Bench, HalfPlane, Limit, Roots, checked_spreads, filled_spreads
from fitamp.errors import DesignError
from fitamp.transfer import Transfer

__all__ = ["LIMITED_QUANTITIES", "SMALL_ZERO_RATIO", "Design"]

# A zero time up to this share of Cc/gm2, the one of the stage without a resistor, neither harms nor helps.
SMALL_ZERO_RATIO = 0.10
# What a limit can be put on, with the unit of its numbers; poles and zero as distances, counted positive.
LIMITED_QUANTITIES: Mapping[str, str] = {
    "dc_gain": "V/V",
    "gain_bandwidth_hz": "Hz",
    "pole1_hz": "Hz",
    "pole2_hz": "Hz",
    "zero_hz": "Hz",
    "crossover_hz": "Hz",
    "phase_margin_deg": "deg",
    "gain_margin_db": "dB",
}
_SPREADABLE = (*ELEMENT_NAMES, "Cgd", "mirror_pole_hz")


@dataclass(frozen=True, slots=True, kw_only=True)
class Design:
    """What one amplifier was designed to be. Built by `read_design`, `from_elements` or `from_roots`.

    Parameters
    ----------
    file, name, note, sha256
        Where it comes from, what it is called, a remark, and the SHA-256 of the file's bytes.
    elements, roots
        The nominal design: exactly one of the two.
    spreads
        For every element that there is, one standard deviation, relative. Empty for a design given by roots,
        which carries its own.
    assumed_spreads
        Names of the values whose spread was not stated, so that ``DEFAULT_SPREAD`` stands in for it.
    under_test
        Elements that are to be judged: what the design says of them must not enter the judgement as a prior.
    limits
        By quantity, of those in `LIMITED_QUANTITIES`.
    half_plane
        Where the zero is meant to lie.
    small_zero_ratio
        Share of Cc/gm2 up to which a zero time counts as small.
    bench
        What the bench adds.

    Raises
    ------
    DesignError
        When there are elements and roots or neither, or a limit is on an unknown quantity.
    """

    file: str
    name: str = ""
    note: str = ""
    elements: Elements | None = None
    roots: Roots | None = None
    spreads: Mapping[str, float] = field(default_factory=dict)
    assumed_spreads: tuple[str, ...] = ()
    under_test: frozenset[str] = frozenset({"Rz"})
    limits: Mapping[str, Limit] = field(default_factory=dict)
    half_plane: HalfPlane
    small_zero_ratio: float = SMALL_ZERO_RATIO
    bench: Bench = field(default_factory=Bench)
    sha256: str | None = None

    def __post_init__(self) -> None:
        if (self.elements is None) == (self.roots is None):
            raise DesignError("a design needs element values or roots, and not both")
        if not 0 <= self.small_zero_ratio < 1:
            raise DesignError(f"small_zero_ratio must be from 0 to below 1, but is {self.small_zero_ratio:g}")
        for name in self.limits:
            if name not in LIMITED_QUANTITIES:
                raise DesignError(f"no limit can be put on {name}; known are {', '.join(LIMITED_QUANTITIES)}")
        if self.roots is not None and self.bench.load_f:
            raise DesignError(
                "a bench load cannot be added to a design given by roots; give the roots with the load, or elements"
            )
        object.__setattr__(self, "spreads", checked_spreads(self.spreads, _SPREADABLE))
        object.__setattr__(self, "limits", dict(self.limits))

    @classmethod
    def from_elements(
        cls,
        elements: Elements,
        *,
        spreads: Mapping[str, float] | None = None,
        under_test: Iterable[str] = ("Rz",),
        limits: Mapping[str, Limit] | None = None,
        half_plane: HalfPlane | None = None,
        small_zero_ratio: float = SMALL_ZERO_RATIO,
        bench: Bench | None = None,
        file: str = "(elements)",
        name: str = "",
        note: str = "",
        sha256: str | None = None,
    ) -> Design:
        """Build from element values; the half plane follows from them unless it is stated.

        Raises
        ------
        DesignError
            When the stated half plane is not where the elements put a zero that is not small, or a name of an
            element is unknown.
        """
        tested = frozenset(under_test)
        for element in sorted(tested - set(_SPREADABLE)):
            raise DesignError(f"no element is named {element}; known are {', '.join(_SPREADABLE)}")
        present = [name for name in _SPREADABLE if name in ELEMENT_NAMES or getattr(elements, name)]
        filled, assumed = filled_spreads(spreads or {}, present)
        zero_time_s = _miller_zero_time(elements)
        own = _half_plane_of(zero_time_s, small_zero_ratio * elements.Cc / elements.gm2)
        if half_plane is not None and own is not HalfPlane.INFINITY and half_plane is not own:
            raise DesignError(
                f"the zero shall lie {half_plane.phrase}, but the elements put it {own.phrase} "
                f"(gm2·Rz = {elements.nulling_product:.3g}); change the elements or the half plane"
            )
        return cls(
            file=file,
            name=name,
            note=note,
            elements=elements,
            spreads=filled,
            assumed_spreads=assumed,
            under_test=tested,
            limits=limits or {},
            half_plane=half_plane or own,
            small_zero_ratio=small_zero_ratio,
            bench=bench or Bench(),
            sha256=sha256,
        )

    @classmethod
    def from_roots(
        cls,
        roots: Roots,
        *,
        limits: Mapping[str, Limit] | None = None,
        small_zero_ratio: float = SMALL_ZERO_RATIO,
        bench: Bench | None = None,
        file: str = "(roots)",
        name: str = "",
        note: str = "",
        sha256: str | None = None,
    ) -> Design:
        """Build from gain, poles and zero; spreads that `roots` does not state are filled in."""
        present = [name for name in ROOT_NAMES if getattr(roots, name) is not None]
        filled, assumed = filled_spreads(roots.spreads, present)
        return cls(
            file=file,
            name=name,
            note=note,
            roots=replace(roots, spreads=filled),
            assumed_spreads=assumed,
            under_test=frozenset(),
            limits=limits or {},
            half_plane=roots.half_plane,
            small_zero_ratio=small_zero_ratio,
            bench=bench or Bench(),
            sha256=sha256,
        )

    def transfer(self) -> Transfer:
        """The designed loop gain, exact, without what the bench adds."""
        return self._given.transfer()

    def on_bench(self) -> Transfer:
        """The designed loop gain with the bench's load across the output and its delay, where stated, in the loop."""
        delay_s = self._given.delay_s + (self.bench.delay_s or 0.0)
        if self.elements is not None:
            loaded = self.elements.CL + self.bench.load_f
            return self.elements.with_changes(CL=loaded, delay_s=delay_s).transfer()
        return replace(self.transfer(), delay_s=delay_s)

    @property
    def zero_time_s(self) -> float:
        """Designed zero time of the compensation in s, Cc·(Rz − 1/gm2) − Cgd/gm2: without mirror, without bench."""
        return self.roots.zero_time_s if self.roots is not None else _miller_zero_time(self._own_elements)

    @property
    def small_zero_time_s(self) -> float:
        """Zero time in s up to which a zero counts as gone.

        It is `small_zero_ratio` times Cc/gm2; of a design given by roots, times |τz|, or times 1/pole 2 where
        the zero is designed at infinity.
        """
        if self.roots is not None:
            reference_s = abs(self.roots.zero_time_s) or 1 / (2 * math.pi * self.roots.pole2_hz)
            return self.small_zero_ratio * reference_s
        return self.small_zero_ratio * self._own_elements.Cc / self._own_elements.gm2

    @property
    def _given(self) -> Elements | Roots:
        return self.roots if self.roots is not None else self._own_elements

    @property
    def _own_elements(self) -> Elements:
        if self.elements is None:
            raise DesignError(f"{self.file}: the design is given by roots and has no element values")
        return self.elements


def _miller_zero_time(elements: Elements) -> float:
    return elements.zero_time_s - elements.Cgd / elements.gm2


def _half_plane_of(zero_time_s: float, small_s: float) -> HalfPlane:
    if abs(zero_time_s) <= small_s:
        return HalfPlane.INFINITY
    return HalfPlane.LEFT if zero_time_s > 0 else HalfPlane.RIGHT
