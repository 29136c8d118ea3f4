"""What sweeps tell about a part before they are taken: information of each, covariance of a set.

Information is kept as triangles R with R'R = J'J, and a set's is that of the stacked ones: squared, what sweeps tell
well and what they do not tell at all would not fit into one matrix of doubles.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from enum import Enum

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.design import Design
from fitamp.elements import Circuit, Condition, ElementEstimate
from fitamp.elements.circuit import BENCH_LOAD
from fitamp.elements.residual import loop_equation, stacked
from fitamp.elements.search import floored
from fitamp.errors import UsageError
from fitamp.fitting.leastsq import covariance_of, interleaved, triangle_of
from fitamp.planning.sweeps import PlannedSweep, averaged
from fitamp.sweep import NoiseLevels
from fitamp.units import si

__all__ = ["Added", "Die", "designed_die", "measured_die"]


class Added(Enum):
    """What is added to a part for a sweep."""

    LOADS = "loads"
    RESISTANCES = "resistances"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Die:
    """A part whose precision is asked for, and what is known of it already.

    circuit, values : the model and its vector, shape (p,)
    noise : levels of one sweep that is yet to be taken
    taken : triangle of the sweeps already taken, shape (r, p); no rows where there are none
    taken_pulls : of those sweeps, as `pull`; none where there are none
    reach : covariance of where such parts lie, shape (p, p): the design's spreads, also of what is under test, or the
        covariance of an estimate
    """

    circuit: Circuit
    values: FloatArray
    noise: NoiseLevels
    taken: FloatArray
    taken_pulls: Mapping[Added, FloatArray]
    reach: FloatArray

    def triangle(self, sweep: PlannedSweep) -> FloatArray:
        """Triangle of the information that a sweep will hold, shape (p, p).

        Raises
        ------
        UsageError
            When the sweep would take away more resistance than there is.
        """
        rz_ohm = self.circuit.physical(self.values)["Rz"] + sweep.condition.rz_added_ohm
        if rz_ohm < 0:
            raise UsageError(
                f"{sweep.added} leaves {si(rz_ohm, 'Ω', digits=3)} in series with Cc, less than none; take it off the "
                "list"
            )
        gain, slopes = self.circuit.gain_and_derivatives(self.values, sweep.freq_hz, sweep.condition)
        noise = floored(averaged(self.noise, sweep.averages))
        return triangle_of(interleaved(loop_equation(gain, slopes, gain, noise)[1]))

    def pull(self, added: Added, sweeps: Sequence[PlannedSweep], triangles: Sequence[FloatArray]) -> FloatArray | None:
        """What pulls the vector, shape (p,), where all that is added is larger than stated by its own size.

        Times the covariance and a relative error it is the shift of the vector. What is added moves the loop gain as
        the element beside it does, so the pull of a sweep is a column of its information. None where that is held.
        """
        index = _beside(self.circuit, added)
        if index is None:
            return None
        total = self.taken_pulls.get(added, np.zeros(len(self.values)))
        for sweep, triangle in zip(sweeps, triangles, strict=True):
            total = total + _pull(self.circuit, self.values, index, _amount(added, sweep.condition), triangle)
        return total

    def covariance(self, triangles: Sequence[FloatArray] = (), *, without_prior_of: int | None = None) -> FloatArray:
        """Covariance of the vector to be expected after sweeps with these triangles, shape (p, p).

        The inverse of the sum of all information, that of the priors included (Cramér and Rao's bound; M. G. Kendall
        and A. Stuart, The Advanced Theory of Statistics, vol. 2).

        without_prior_of : a number of the vector whose prior plays no part
        """
        priors = self.circuit.prior_rows(self.values)[1]
        if without_prior_of is not None:
            parameters = list(self.circuit.parameters)
            parameters[without_prior_of] = replace(parameters[without_prior_of], prior_sd=None)
            priors = replace(self.circuit, parameters=tuple(parameters)).prior_rows(self.values)[1]
        return covariance_of(np.vstack([*triangles, self.taken, priors]))

    def drawn(self, rng: np.random.Generator, *, least_rz_ohm: float) -> Die:
        """Another part from where such parts lie; its Rz is `least_rz_ohm` at the least."""
        values = rng.multivariate_normal(self.values, self.reach, method="eigh")
        index = self.circuit.index("Rz")
        if index is not None:
            values[index] = max(values[index], self.circuit.parameters[index].from_si(least_rz_ohm))
        return replace(self, values=values)


def designed_die(design: Design, noise: NoiseLevels, *, under_test: Sequence[str] = ()) -> Die:
    """The part at the design's centre, of which nothing is measured yet.

    Raises
    ------
    UsageError
        When the design gives roots or no spreads, or an element under test is unknown.
    """
    circuit = Circuit.from_design(design, under_test=under_test)
    if not circuit.names:
        raise UsageError(
            f"{design.file}: every element is held by a spread of 0, so that sweeps have nothing to tell; give spreads"
        )
    return Die(
        circuit=circuit,
        values=circuit.designed,
        noise=noise,
        taken=np.zeros((0, len(circuit.names))),
        taken_pulls={},
        reach=np.diag(_spreads(circuit, design) ** 2),
    )


def measured_die(estimate: ElementEstimate, noise: NoiseLevels) -> Die:
    """The part of which sweeps were taken already, where they put it."""
    solution = estimate.solution
    circuit, values = solution.circuit, solution.values
    rows = stacked(circuit, values, solution.sweeps)[1]
    pulls = {}
    for added in Added:
        index = _beside(circuit, added)
        if index is not None:
            pulls[added] = sum(
                (
                    _pull(circuit, values, index, _amount(added, one.condition), rows[solution.rows_of(which)])
                    for which, one in enumerate(solution.sweeps)
                ),
                np.zeros(len(values)),
            )
    return Die(
        circuit=circuit,
        values=values,
        noise=noise,
        taken=triangle_of(rows[: 2 * solution.points]),
        taken_pulls=pulls,
        reach=estimate.covariance,
    )


def _beside(circuit: Circuit, added: Added) -> int | None:
    """The number of the vector that acts as what is added does."""
    names = ("CL", BENCH_LOAD) if added is Added.LOADS else ("Rz",)
    return next((index for name in names if (index := circuit.index(name)) is not None), None)


def _amount(added: Added, condition: Condition) -> float:
    return condition.load_added_f if added is Added.LOADS else condition.rz_added_ohm


def _pull(circuit: Circuit, values: FloatArray, index: int, amount: float, rows: FloatArray) -> FloatArray:
    return np.asarray(rows.T @ rows[:, index] * (amount / circuit.parameters[index].slope(float(values[index]))))


def _spreads(circuit: Circuit, design: Design) -> FloatArray:
    """Standard deviation of each number over the parts of a design; 0 where the design says nothing of it."""
    found = []
    for one in circuit.parameters:
        sd = one.prior_sd
        if sd is None:
            # Under test: no prior for it, but parts have their spread all the same.
            sd = design.spreads.get(one.name, 0.0) * (1.0 if one.is_log else one.prior_mean)
        found.append(sd)
    return np.array(found)
