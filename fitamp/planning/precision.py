"""From a covariance of the vector to standard deviations of elements and of what the verdict is made of."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.amplifier import ELEMENT_NAMES
from fitamp.arrays import FloatArray
from fitamp.design import Design
from fitamp.elements import Circuit, informed_shares
from fitamp.elements.circuit import BENCH_DELAY, BENCH_LOAD, MIRROR_POLE, UNITS
from fitamp.elements.intervals import UNDETERMINED_SD
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
from fitamp.planning.campaign import Added, Die
from fitamp.planning.result import Expected

__all__ = [
    "MAY_BE_ZERO",
    "PARASITIC",
    "QUANTITIES",
    "Covariances",
    "Measure",
    "expected",
    "known_before",
    "measures",
    "standard_deviations",
]

PARASITIC = "load_parasitic_f"
# Differences from the design: 0 of a part that is as designed.
MAY_BE_ZERO = frozenset({PARASITIC, "rz_change_ohm"})
# What the plan says of a part beside its elements, with units.
QUANTITIES: Mapping[str, str] = {
    "zero_time_s": "s",
    "gm2_rz": "",
    "pole2_hz": "Hz",
    "gain_bandwidth_hz": "Hz",
    "crossover_hz": "Hz",
    "phase_margin_deg": "deg",
    PARASITIC: "F",
    "rz_change_ohm": "Ω",
}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Measure:
    """One number of a part: value in SI units (None where the part has none) and derivatives by the vector, shape (p,).

    scale : of a number like it: with a standard deviation of twice that it is not known
    """

    name: str
    unit: str
    value: float | None
    slopes: FloatArray
    scale: float


def measures(die: Die, design: Design) -> tuple[Measure, ...]:
    """Elements, numbers of the bench and quantities of a part, in that order; what is held has no slopes."""
    circuit, values = die.circuit, die.values
    physical = circuit.physical(values)
    present = [*ELEMENT_NAMES, *(name for name in ("Cgd", MIRROR_POLE) if physical[name])]
    present += [name for name in (BENCH_LOAD, BENCH_DELAY) if physical[name] or name in circuit.names]
    found = [_single(circuit, values, name) for name in present]
    return (*found, *_quantities(circuit, values, design))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Covariances:
    """Of the vector, shape (p, p); and where CL has no prior, by which a parasitic load is judged.

    What nobody designed has no prior: with the design's spread it would be drawn towards none.
    """

    vector: FloatArray
    without_load_prior: FloatArray

    @classmethod
    def after(cls, die: Die, triangles: Sequence[FloatArray]) -> Covariances:
        """After sweeps with these triangles."""
        covariance = die.covariance(triangles)
        index = die.circuit.index("CL")
        free = covariance if index is None else die.covariance(triangles, without_prior_of=index)
        return cls(vector=covariance, without_load_prior=free)

    def of(self, row: Measure) -> FloatArray:
        """The one that a measure is judged by."""
        return self.without_load_prior if row.name == PARASITIC else self.vector


def standard_deviations(
    rows: Sequence[Measure], die: Die, triangles: Sequence[FloatArray]
) -> tuple[list[float | None], Covariances]:
    """Standard deviation of each measure after sweeps with these triangles, and the covariances behind them."""
    covariances = Covariances.after(die, triangles)
    return [_sd(row, covariances.of(row)) for row in rows], covariances


def known_before(rows: Sequence[Measure], die: Die) -> list[float | None]:
    """Standard deviations before any further sweep: of elements as priors and sweeps taken leave them, of quantities
    over the parts that the plan is for.

    Without a prior for what is under test nothing would be known of the zero; but parts have their spread all the same.
    """
    own = standard_deviations(rows, die, ())[0]
    return [
        _sd(row, die.reach) if row.name in QUANTITIES and row.name != PARASITIC else sd
        for row, sd in zip(rows, own, strict=True)
    ]


def expected(
    rows: Sequence[Measure],
    die: Die,
    sds: Sequence[float | None],
    covariances: Covariances,
    *,
    pulls: Mapping[Added, FloatArray | None],
    before: Sequence[float | None],
    over_parts: Sequence[float | None],
    worst: Sequence[float | None],
) -> tuple[Expected, ...]:
    """The measures with what is to be expected of them; `pulls` as `Die.pull`."""
    shares = dict(zip(die.circuit.names, informed_shares(die.circuit, covariances.vector), strict=True))
    return tuple(
        Expected(
            name=row.name,
            unit=row.unit,
            value=row.value,
            sd=sd,
            before=first,
            informed=float(shares[row.name]) if row.name in shares else None if row.name in QUANTITIES else 0.0,
            over_parts=mean,
            worst=last,
            by_loads=_shift(row, sd, covariances, pulls[Added.LOADS]),
            by_resistances=_shift(row, sd, covariances, pulls[Added.RESISTANCES]),
        )
        for row, sd, first, mean, last in zip(rows, sds, before, over_parts, worst, strict=True)
    )


def _shift(row: Measure, sd: float | None, covariances: Covariances, pull: FloatArray | None) -> float | None:
    return None if sd is None or pull is None else float(row.slopes @ covariances.of(row) @ pull)


def _sd(row: Measure, covariance: FloatArray) -> float | None:
    if row.value is None or not np.isfinite(row.slopes).all():
        return None
    sd = math.sqrt(max(float(row.slopes @ covariance @ row.slopes), 0.0))
    return sd if sd <= UNDETERMINED_SD * row.scale else None


def _single(circuit: Circuit, values: FloatArray, name: str) -> Measure:
    """A number of the vector itself, or one that is held."""
    value, index = circuit.physical(values)[name], circuit.index(name)
    slopes, scale = np.zeros(len(values)), abs(value)
    if index is not None:
        parameter = circuit.parameters[index]
        slopes[index] = parameter.slope(float(values[index]))
        # What a prior says is known, however wide it is.
        scale = parameter.slope(float(values[index])) if parameter.prior_sd is None else math.inf
    return Measure(name=name, unit=UNITS[name], value=value, slopes=slopes, scale=scale)


def _quantities(circuit: Circuit, values: FloatArray, design: Design) -> list[Measure]:
    part = circuit.loaded(values)
    found = quantities_and_slopes(part)
    gm2, Cc, Cgd = part.gm2, part.Cc, part.Cgd
    nothing = {"CL": 0.0}
    zero_time_s, _ = found[Quantity.ZERO_TIME]
    assert zero_time_s is not None
    wanted_s = design.zero_time_s
    index = circuit.index("CL")
    parasitic = np.zeros(len(values))
    if index is not None:
        # The chip's own: the bench's load is told from it by its spread alone.
        parasitic[index] = circuit.parameters[index].slope(float(values[index]))
    parasitic_f = circuit.physical(values)["CL"] - circuit.nominal.CL
    others: dict[str, tuple[float | None, FloatArray, float]] = {
        "gm2_rz": (part.nulling_product, by_vector(circuit, values, nothing | {"gm2": part.Rz, "Rz": gm2}), 1.0),
        PARASITIC: (parasitic_f if index is not None else None, parasitic, part.CL),
        # Rz that puts the zero at the designed place, less the part's own.
        "rz_change_ohm": (
            (wanted_s - zero_time_s) / Cc,
            by_vector(
                circuit,
                values,
                nothing
                | {
                    "Cc": -(wanted_s + Cgd / gm2) / Cc**2,
                    "gm2": -(Cgd / Cc + 1) / gm2**2,
                    "Cgd": 1 / (gm2 * Cc),
                    "Rz": -1.0,
                },
            ),
            1 / gm2,
        ),
    }
    scales = {"zero_time_s": Cc / gm2, "phase_margin_deg": 10.0}
    rows = []
    for name, unit in QUANTITIES.items():
        if name in others:
            value, by_values, scale = others[name]
        else:
            value, slopes = found[Quantity(name)]
            by_values, scale = by_vector(circuit, values, slopes), scales.get(name, abs(value or 1.0))
        rows.append(Measure(name=name, unit=unit, value=value, slopes=by_values, scale=scale))
    return rows
