"""Which measurement would settle an open verdict: the one that shrinks the larger part of the zero time's variance."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.comparison.circuit_zero import CircuitZero
from fitamp.comparison.expectation import far_pole_time
from fitamp.comparison.mirror import mirror_moved
from fitamp.comparison.other_side import zero_time_of
from fitamp.comparison.rows import designed_poles_hz
from fitamp.design import Design
from fitamp.elements.circuit import BENCH_DELAY, MIRROR_POLE
from fitamp.estimate import Known
from fitamp.fitting import LoopFit
from fitamp.fitting.intervals import gradient
from fitamp.units import si

__all__ = ["hidden_pole", "what_settles", "what_settles_circuit"]

NOISE = "the noise decides: average more, or use a denser sweep with the top of the band a few times above pole 2"
DELAY = "the path delay decides: measure it with a through sweep and state it under [bench]"
MIRROR = "the mirror pole decides: state a tighter spread for mirror_pole, or end the sweep farther below it"
OVERLAP = "the overlap capacitor decides: state a tighter spread for Cgd"
THIRD_POLE = (
    "the third pole decides: state tighter spreads for C1, CL, Cc and gm2 (or pole3), or sweep up to where the third "
    "pole shows"
)
# The circuit's load is free, whatever its spread.
CIRCUITS_THIRD_POLE = (
    "the third pole decides: state tighter spreads for C1, Cc and gm2, or sweep up to where the third pole shows"
)
# What has at least this share of the variance decides.
DECIDES = 0.5


def hidden_pole(fit: LoopFit, design: Design) -> str:
    """That pole 2 is not believed, and what shows where it is."""
    found, designed = si(fit.parameters.pole2_hz.value, "Hz"), si(designed_poles_hz(design)[1], "Hz")
    return (
        f"pole 2 shows at {found}, designed was {designed}: it moved that far, or the zero lies on it and hides it, "
        "and what shows is the third pole; repeat the sweep with a known extra load, which parts pole 2 from the zero"
    )


def what_settles(fit: LoopFit, design: Design) -> str:
    """The measurement, by the covariance of two poles and a zero."""
    if fit.parameters.pole2_hz.known is not Known.MEASURED:
        return _wider_band(design)
    model, zero_time = fit.solution.model, fit.parameters.zero_time_s
    without_mirror = float(fit.covariance[3, 3]) * model.time_s**2
    if mirror_moved(design) and zero_time.stderr is not None and zero_time.stderr**2 > 2 * without_mirror:
        return MIRROR
    names = model.names
    information = np.linalg.pinv(fit.covariance)
    total = float(fit.covariance[3, 3])

    def share(name: str) -> float:
        if name not in names:
            return 0.0
        kept = [index for index, other in enumerate(names) if other != name]
        left = np.linalg.pinv(information[np.ix_(kept, kept)])
        return 1 - float(left[kept.index(3), kept.index(3)]) / total

    return _decider({DELAY: share("delay"), THIRD_POLE: share("far_pole")})


def what_settles_circuit(found: CircuitZero, fit: LoopFit, design: Design) -> str:
    """The measurement, by the covariance of the circuit's elements."""
    if fit.parameters.pole2_hz.known is not Known.MEASURED:
        return _wider_band(design)
    if found.is_split:
        return DELAY
    circuit, values = found.solution.circuit, found.solution.values
    zero_time_s = zero_time_of(circuit, values)

    def far_pole_s(vector: FloatArray) -> float:
        # At this very zero time: through Rz the third pole follows the zero, whatever makes that uncertain.
        return far_pole_time(circuit.loaded(vector), zero_time_s)

    slopes, third = gradient(lambda vector: (zero_time_of(circuit, vector), far_pole_s(vector)), values)
    # What has a sentence of its own is not asked for twice.
    third[[index for index, name in enumerate(circuit.names) if name in ("Cgd", "CL")]] = 0.0
    along = found.solution.covariance @ slopes
    total = float(along @ slopes)

    def share_of(other: FloatArray) -> float:
        """Share of the zero time's variance that goes if a number with these slopes were known: by regression."""
        variance = float(other @ found.solution.covariance @ other)
        return float(along @ other) ** 2 / (variance * total) if variance and total else 0.0

    def share(name: str) -> float:
        return share_of(np.array([float(other == name) for other in circuit.names]))

    return _decider(
        {
            _wider_band(design, "the load decides, whatever its spread"): share("CL"),
            MIRROR: share(MIRROR_POLE),
            OVERLAP: share("Cgd"),
            DELAY: share(BENCH_DELAY),
            CIRCUITS_THIRD_POLE: share_of(third),
        }
    )


def _wider_band(design: Design, why: str = "the band does not determine pole 2") -> str:
    wanted = si(3 * designed_poles_hz(design)[1], "Hz", digits=2)
    return f"{why}: sweep up to a few times pole 2, about {wanted}"


def _decider(shares: Mapping[str, float]) -> str:
    """What has the largest share, of equals the first; the noise where none has half."""
    largest = max(shares, key=lambda sentence: shares[sentence])
    return largest if shares[largest] >= DECIDES else NOISE
