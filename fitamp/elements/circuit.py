"""The exact circuit as a model of its elements: loop gain of a parameter vector, with derivatives by hand.

A vector holds what is free: for an element ln(value/designed), so that 0 is as designed; for Rz and the bench's delay,
which may be 0, the value over a scale. What has no spread in the design is held. Priors come from the design's spreads;
what is under test has none.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES, Elements
from fitamp.arrays import ComplexArray, FloatArray
from fitamp.design import Design
from fitamp.elements.condition import Condition
from fitamp.elements.response import loop_gain_and_slopes
from fitamp.errors import UsageError

__all__ = ["BENCH_DELAY", "BENCH_LOAD", "MIRROR_POLE", "NOTHING_KNOWN", "UNITS", "Circuit", "Parameter"]

MIRROR_POLE, BENCH_LOAD, BENCH_DELAY = "mirror_pole_hz", "bench_load_f", "bench_delay_s"
# What can be free, in the order of the vector, with its unit.
UNITS: Mapping[str, str] = {
    "gm1": "S",
    "R1": "Ω",
    "C1": "F",
    "gm2": "S",
    "R2": "Ω",
    "CL": "F",
    "Cc": "F",
    "Rz": "Ω",
    "Cgd": "F",
    MIRROR_POLE: "Hz",
    BENCH_LOAD: "F",
    BENCH_DELAY: "s",
}
# Those that may be 0, or pass 0, and have no logarithm there.
LINEAR = frozenset({"Rz", BENCH_DELAY})
STANDARD = Condition()
# Standard deviation of a number without a prior before any sweep is seen: a factor of e^10. It tells nothing, and keeps
# what no sweep shows from running away.
NOTHING_KNOWN = 10.0
FARTHEST_LN = 100.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Parameter:
    """One free number of a circuit.

    name : an element's, or `MIRROR_POLE`, `BENCH_LOAD`, `BENCH_DELAY`
    scale : by which the value is divided, in SI units: the designed value where the logarithm is taken
    prior_mean, prior_sd : in units of the vector; the standard deviation is None where there is no prior
    """

    name: str
    scale: float
    prior_mean: float = 0.0
    prior_sd: float | None = None

    @property
    def is_log(self) -> bool:
        """Whether the vector holds the logarithm."""
        return self.name not in LINEAR

    def to_si(self, number: float) -> float:
        """The value in SI units of its number in the vector."""
        # No iterate may overflow: beyond so many orders of magnitude there is no circuit anyway.
        return self.scale * (math.exp(min(max(number, -FARTHEST_LN), FARTHEST_LN)) if self.is_log else number)

    def from_si(self, value: float) -> float:
        """The number in the vector of a value in SI units."""
        return math.log(value / self.scale) if self.is_log else value / self.scale

    def slope(self, number: float) -> float:
        """Derivative of the value in SI units by its number in the vector."""
        return self.to_si(number) if self.is_log else self.scale


@dataclass(frozen=True, slots=True, kw_only=True)
class Circuit:
    """The two-stage amplifier on its bench, with free and held numbers.

    nominal : designed elements; CL without the bench's load
    bench_load_f, bench_delay_s : as stated, 0 where they are not
    parameters : what is free, in the order of the vector
    """

    nominal: Elements
    bench_load_f: float
    bench_delay_s: float
    parameters: tuple[Parameter, ...]

    @classmethod
    def from_design(cls, design: Design, *, under_test: Iterable[str] = ()) -> Circuit:
        """The circuit of a design, `under_test` in addition to what the design has under test.

        An element is free where it has a spread or is under test. The bench's load is free within its spread, its
        delay likewise, and without a prior where the delay is not stated: unknown is not zero.

        Raises
        ------
        UsageError
            When the design is given by roots, or an element under test is unknown, or is 0 and is not Rz.
        """
        if design.elements is None:
            raise UsageError(
                f"{design.file}: the design gives roots; elements can only be estimated for a design with [elements]"
            )
        elements, bench = design.elements, design.bench
        tested = design.under_test | frozenset(under_test)
        _check_tested(tested, elements)
        parameters = []
        for name in (*ELEMENT_NAMES, "Cgd", MIRROR_POLE):
            value = getattr(elements, name)
            spread = None if name in tested else design.spreads.get(name, 0.0)
            if name == "Rz":
                scale = 1 / elements.gm2
                sd = None if spread is None else spread * value / scale
                free, mean = spread is None or bool(sd), value / scale
            else:
                scale, sd, mean = value, spread, 0.0
                free = bool(value) and (spread is None or bool(spread))
            if free:
                parameters.append(Parameter(name=name, scale=scale, prior_mean=mean, prior_sd=sd))
        if bench.load_f and bench.load_spread:
            parameters.append(Parameter(name=BENCH_LOAD, scale=bench.load_f, prior_sd=bench.load_spread))
        if bench.delay_s is None or bench.delay_spread_s:
            # The zero time without a resistor: what a delay is confused with, and so of its order.
            scale = elements.Cc / elements.gm2
            sd = None if bench.delay_s is None else bench.delay_spread_s / scale
            mean = (bench.delay_s or 0.0) / scale
            parameters.append(Parameter(name=BENCH_DELAY, scale=scale, prior_mean=mean, prior_sd=sd))
        return cls(
            nominal=elements,
            bench_load_f=bench.load_f,
            bench_delay_s=bench.delay_s or 0.0,
            parameters=tuple(parameters),
        )

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the free numbers, in the order of the vector."""
        return tuple(parameter.name for parameter in self.parameters)

    @property
    def designed(self) -> FloatArray:
        """The vector of the design itself, shape (p,)."""
        return np.array([parameter.prior_mean for parameter in self.parameters])

    def index(self, name: str) -> int | None:
        """Place of a name in the vector; None where it is held."""
        return self.names.index(name) if name in self.names else None

    def vector(self, **values: float) -> FloatArray:
        """The vector with these values in SI units, and the rest as designed."""
        return np.array([p.from_si(values[p.name]) if p.name in values else p.prior_mean for p in self.parameters])

    def physical(self, values: FloatArray) -> dict[str, float]:
        """Every number in SI units by name, free or held; Rz may be below 0 in an iterate."""
        found = {name: getattr(self.nominal, name) for name in (*ELEMENT_NAMES, "Cgd", MIRROR_POLE)}
        found |= {BENCH_LOAD: self.bench_load_f, BENCH_DELAY: self.bench_delay_s}
        return found | {p.name: p.to_si(float(number)) for p, number in zip(self.parameters, values, strict=True)}

    def elements(self, values: FloatArray) -> Elements:
        """The amplifier alone, without what the bench adds; an Rz below 0 is taken as 0."""
        found = self.physical(values)
        changes = {name: value for name, value in found.items() if name not in (BENCH_LOAD, BENCH_DELAY)}
        return replace(self.nominal, **(changes | {"Rz": max(changes["Rz"], 0.0)}))

    def loaded(self, values: FloatArray, condition: Condition = STANDARD) -> Elements:
        """The amplifier with the bench's load and what a condition adds, without the bench's delay."""
        elements = self.elements(values)
        load_f = elements.CL + self.physical(values)[BENCH_LOAD] + condition.load_added_f
        return replace(elements, CL=load_f, Rz=max(elements.Rz + condition.rz_added_ohm, 0.0))

    def gain(self, values: FloatArray, freq_hz: FloatArray, condition: Condition = STANDARD) -> ComplexArray:
        """Loop gain as the bench sees it, shape (n,)."""
        return self.gain_and_derivatives(values, freq_hz, condition)[0]

    def gain_and_derivatives(
        self, values: FloatArray, freq_hz: FloatArray, condition: Condition = STANDARD
    ) -> tuple[ComplexArray, ComplexArray]:
        """Loop gain as the bench sees it, shape (n,), and its derivatives by the vector, shape (n, p)."""
        found = self.physical(values)
        seen = found | {
            "CL": found["CL"] + found[BENCH_LOAD] + condition.load_added_f,
            "Rz": found["Rz"] + condition.rz_added_ohm,
            "delay_s": self.nominal.delay_s + found[BENCH_DELAY],
            "beta": self.nominal.beta,
        }
        s = np.asarray(2j * np.pi * freq_hz, dtype=np.complex128)
        gain, slopes = loop_gain_and_slopes(seen, s)
        by_name = slopes | {BENCH_LOAD: slopes["CL"], BENCH_DELAY: slopes["delay_s"]}
        columns = [by_name[p.name] * p.slope(float(number)) for p, number in zip(self.parameters, values, strict=True)]
        return gain, np.stack(columns, axis=1)

    def prior_rows(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Residuals of the priors in standard deviations, shape (p,), and their derivatives, shape (p, p).

        Where there is no prior `NOTHING_KNOWN` stands for it.
        """
        rows = np.array([1 / (NOTHING_KNOWN if p.prior_sd is None else p.prior_sd) for p in self.parameters])
        return (values - self.designed) * rows, np.diag(rows)

    def prior_information(self) -> FloatArray:
        """Inverse covariance of the priors, shape (p, p)."""
        rows = self.prior_rows(self.designed)[1]
        return np.asarray(rows.T @ rows)


def _check_tested(tested: frozenset[str], elements: Elements) -> None:
    known = (*ELEMENT_NAMES, "Cgd", MIRROR_POLE)
    for name in sorted(tested):
        if name not in known:
            raise UsageError(f"no element is named {name}; known are {', '.join(known)}")
        if name != "Rz" and not getattr(elements, name):
            raise UsageError(f"{name} is under test, but the design has none; give it a value to start from")
