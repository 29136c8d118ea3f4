"""The part and every sweep that could be taken of it: what any set of them will tell, and what it is worth."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.design import Design
from fitamp.elements.circuit import BENCH_DELAY, BENCH_LOAD
from fitamp.planning.campaign import Added, Die
from fitamp.planning.choice import Worth
from fitamp.planning.outlook import outlook_of
from fitamp.planning.precision import QUANTITIES, Measure, expected, known_before, measures, standard_deviations
from fitamp.planning.result import Criterion, Stage
from fitamp.planning.sweeps import PlannedSweep

__all__ = ["Outcomes"]

ON_BENCH = (BENCH_LOAD, BENCH_DELAY)


class Outcomes:
    """A part and the sweeps that could be taken of it, each looked at once; a set is its indices.

    parts_drawn, seed : other parts over which precision is averaged and the worst is sought
    """

    def __init__(
        self, die: Die, design: Design, sweeps: tuple[PlannedSweep, ...], *, parts_drawn: int = 0, seed: int = 1
    ) -> None:
        self.die, self.design, self.sweeps = die, design, sweeps
        self.rows = measures(die, design)
        self._triangles = [die.triangle(sweep) for sweep in sweeps]
        self._before = known_before(self.rows, die)
        rng = np.random.default_rng(seed)
        least_rz_ohm = max([0.0, *(-sweep.condition.rz_added_ohm for sweep in sweeps)])
        parts = (die.drawn(rng, least_rz_ohm=least_rz_ohm) for _ in range(parts_drawn))
        # Of a part drawn only the sweeps that are chosen are looked at, when they are.
        self._drawn: list[tuple[Die, tuple[Measure, ...], dict[int, FloatArray]]] = [
            (part, measures(part, design), {}) for part in parts
        ]

    def stage(self, indices: tuple[int, ...], *, over_parts: bool = True) -> Stage:
        """What is to be expected after the sweeps with these indices, with or without the parts drawn."""
        triangles = [self._triangles[index] for index in indices]
        sweeps = tuple(self.sweeps[index] for index in indices)
        sds, covariances = standard_deviations(self.rows, self.die, triangles)
        pulls = {added: self.die.pull(added, sweeps, triangles) for added in Added}
        mean, worst = self._over_parts(indices, self._drawn if over_parts else [])
        found = expected(
            self.rows,
            self.die,
            sds,
            covariances,
            pulls=pulls,
            before=self._before,
            over_parts=mean,
            worst=worst,
        )
        by_name = {one.name: one for one in found}
        zero = next(row for row in self.rows if row.name == "zero_time_s")
        return Stage(
            sweeps=sweeps,
            elements=tuple(one for one in found if one.name not in QUANTITIES and one.name not in ON_BENCH),
            bench=tuple(one for one in found if one.name in ON_BENCH),
            quantities=tuple(one for one in found if one.name in QUANTITIES),
            outlook=outlook_of(
                self.design, by_name, reach_s=float(np.sqrt(zero.slopes @ self.die.reach @ zero.slopes))
            ),
        )

    def worth(self, criterion: Criterion, wanted: Mapping[str, float]) -> Worth:
        """What a set of sweeps is worth by a criterion; smaller is better."""
        names = self.die.circuit.names
        block = [index for index, name in enumerate(names) if name not in ON_BENCH]
        known: dict[tuple[int, ...], tuple[float, ...]] = {}

        def log_determinant(covariance: FloatArray) -> float:
            return float(np.linalg.slogdet(covariance[np.ix_(block, block)])[1])

        def of(indices: tuple[int, ...]) -> tuple[float, ...]:
            key = tuple(sorted(indices))
            if key not in known:
                known[key] = fresh([self._triangles[index] for index in key])
            return known[key]

        def fresh(triangles: list[FloatArray]) -> tuple[float, ...]:
            if criterion is Criterion.WANTED:
                sds, covariances = standard_deviations(self.rows, self.die, triangles)
                by_name = {row.name: np.inf if sd is None else sd for row, sd in zip(self.rows, sds, strict=True)}
                ratios = (by_name[name] / sd for name, sd in wanted.items())
                return (max(1.0, *ratios), log_determinant(covariances.vector))
            covariance = self.die.covariance(triangles)
            if criterion is Criterion.VARIANCE:
                return (float((np.diag(covariance)[block] / self._squares(block)).mean()),)
            return (log_determinant(covariance),)

        return of

    def _squares(self, block: list[int]) -> FloatArray:
        """By which variances of the vector are those of relative numbers."""
        parameters = [self.die.circuit.parameters[index] for index in block]
        return np.array([1.0 if one.is_log else (one.prior_mean or 1.0) ** 2 for one in parameters])

    def _over_parts(
        self, indices: tuple[int, ...], drawn: Sequence[tuple[Die, tuple[Measure, ...], dict[int, FloatArray]]]
    ) -> tuple[list[float | None], list[float | None]]:
        """Root mean square and largest standard deviation over the parts drawn.

        Of a logarithm relative to the part's own value.
        """
        is_log = {one.name for one in self.die.circuit.parameters if one.is_log}
        parts = []
        for part, rows, triangles in drawn:
            for index in indices:
                if index not in triangles:
                    triangles[index] = part.triangle(self.sweeps[index])
            sds = standard_deviations(rows, part, [triangles[index] for index in indices])[0]
            at_mine = [
                (mine.value or 0.0) / (other.value or 1.0) if mine.name in is_log else 1.0
                for mine, other in zip(self.rows, rows, strict=True)
            ]
            parts.append([np.nan if sd is None else sd * share for sd, share in zip(sds, at_mine, strict=True)])
        if not parts:
            return [None] * len(self.rows), [None] * len(self.rows)
        found = np.array(parts)
        return _or_none(np.sqrt((found**2).mean(axis=0))), _or_none(found.max(axis=0))


def _or_none(values: FloatArray) -> list[float | None]:
    return [None if np.isnan(value) else float(value) for value in values]
