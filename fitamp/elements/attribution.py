"""Which element's deviation explains what moved: signed contributions that add up to the whole.

From designed to estimated elements all deviations are run through together in a straight line of the logarithms (of Rz
itself), and each step of a quantity is shared among the elements by its derivatives (R. J. Aumann and L. S. Shapley,
Values of Non-Atomic Games, 1974). So no order of the elements has to be chosen, and what two of them do together is
shared between them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from fitamp.arrays import FloatArray, frozen_float
from fitamp.elements.circuit import BENCH_DELAY, Circuit
from fitamp.elements.quantities import Quantity, by_vector, quantities_and_slopes
from fitamp.elements.result import MOSTLY_INFORMED, ElementEstimate
from fitamp.estimate import Estimate

__all__ = ["Blame", "Contribution", "QuantityBlame", "blame"]

# Nodes of Gauss's rule in each piece of the path. A piece is halved, so many times at most, while the sum of its shares
# misses its whole by more than this share of their sizes: where a second pole meets the third, it has a kink.
NODES = 12
SUM_RTOL = 1e-10
MOST_HALVINGS = 14
# What a last piece misses is shared out in proportion to its shares, unless they nearly cancel.
CANCELLING = 0.1
# Nodes and step for the derivatives of the contributions, which only make their errors.
ERROR_NODES = 4
DIFFERENCE_STEP = 1e-5


@dataclass(frozen=True, slots=True, kw_only=True)
class Contribution:
    """What one element's deviation from the design does to a quantity.

    name : element, or "bench_load_f"
    designed, estimated : its values in SI units
    share : signed contribution in the quantity's unit, with the error that the estimate's covariance gives
    informed : share of what is known of the element that came from the data
    """

    name: str
    designed: float
    estimated: float
    share: Estimate
    informed: float

    @property
    def is_informed(self) -> bool:
        """Whether the element's value came from the data more than from the design."""
        return self.informed >= MOSTLY_INFORMED


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class QuantityBlame:
    """One quantity, designed and estimated, and the contributions whose values add up to the difference.

    designed, estimated : both with the bench's load, without its delay
    change : estimated − designed
    contributions : largest first
    covariance : of their shares, in their order, shape (k, k): of elements that only a combination is known of, single
        shares are far less certain than their sum
    quadrature_error : by which the integrals missed the whole before that was shared out, in the quantity's unit
    """

    quantity: Quantity
    designed: float
    estimated: float
    change: Estimate
    contributions: tuple[Contribution, ...]
    covariance: FloatArray
    quadrature_error: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Blame:
    """Contributions to every quantity; one that designed or estimated part does not have (no crossover) is missing."""

    quantities: tuple[QuantityBlame, ...]

    def of(self, quantity: Quantity) -> QuantityBlame | None:
        """The contributions to one quantity; None where it is missing."""
        return next((one for one in self.quantities if one.quantity is quantity), None)


def blame(estimate: ElementEstimate) -> Blame:
    """Share what zero time, second pole, phase margin, crossover and gain-bandwidth moved among the elements."""
    circuit = estimate.circuit
    start, end = circuit.designed, estimate.vector
    shares, missing = _shares(circuit, start, end)
    errors = _slopes_of_shares(circuit, start, end)
    before, after = (quantities_and_slopes(circuit.loaded(values)) for values in (start, end))
    found = []
    for row, quantity in enumerate(Quantity):
        designed, (estimated, slopes) = before[quantity][0], after[quantity]
        if designed is None or estimated is None or not np.isfinite(shares[row]).all():
            continue
        by_end = by_vector(circuit, end, slopes)
        found.append(
            QuantityBlame(
                quantity=quantity,
                designed=designed,
                estimated=estimated,
                change=_gaussian(estimate, estimated - designed, float(by_end @ estimate.covariance @ by_end)),
                quadrature_error=float(missing[row]),
                **_contributions(estimate, shares[row], errors[row]),
            )
        )
    return Blame(quantities=tuple(found))


def _shares(circuit: Circuit, start: FloatArray, end: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Shares of every number of the vector in every quantity, shape (q, p), and what was missing, shape (q,).

    NaN for a quantity that does not exist all along the path.
    """
    total = np.zeros((len(Quantity), len(start)))
    missing = np.zeros(len(Quantity))
    sizes = np.zeros(len(Quantity))
    pieces = [(0.0, 1.0, 0)]
    while pieces:
        first, last, halvings = pieces.pop()
        before, after = (start + at * (end - start) for at in (first, last))
        mean = sum(weight * _quantities(circuit, before + at * (after - before))[1] for at, weight in _nodes(NODES))
        shares = mean * (after - before)
        whole = _quantities(circuit, after)[0] - _quantities(circuit, before)[0]
        sizes = np.fmax(sizes, np.abs(shares).sum(axis=1))
        misses = whole - shares.sum(axis=1)
        if halvings < MOST_HALVINGS and (np.abs(misses) > SUM_RTOL * sizes).any():
            middle = (first + last) / 2
            pieces += [(first, middle, halvings + 1), (middle, last, halvings + 1)]
            continue
        total += shares + _shared_out(shares, misses)
        missing += misses
    return total, missing


def _shared_out(shares: FloatArray, misses: FloatArray) -> FloatArray:
    """What is missing of each quantity, shape (q,), as additions to its shares, shape (q, p)."""
    sizes, sums = np.abs(shares), shares.sum(axis=1)
    size = np.maximum(sizes.sum(axis=1), np.finfo(float).tiny)
    # Near a kink only the size of the derivatives is wrong, not their proportion.
    cancels = np.abs(sums) < CANCELLING * size
    weights = np.where(
        cancels[:, np.newaxis], sizes / size[:, np.newaxis], shares / np.where(cancels, 1.0, sums)[:, np.newaxis]
    )
    return np.asarray(weights * misses[:, np.newaxis])


def _slopes_of_shares(circuit: Circuit, start: FloatArray, end: FloatArray) -> FloatArray:
    """Derivatives of every share by the end of the path, shape (q, shares, p)."""
    count = len(start)
    change = end - start
    mean = np.zeros((len(Quantity), count))
    bend = np.zeros((len(Quantity), count, count))
    for at, weight in _nodes(ERROR_NODES):
        here = start + at * change
        mean += weight * _quantities(circuit, here)[1]
        for index in range(count):
            shift = np.zeros(count)
            shift[index] = DIFFERENCE_STEP
            above, below = (_quantities(circuit, here + sign * shift)[1] for sign in (1, -1))
            bend[:, :, index] += weight * at * (above - below) / (2 * DIFFERENCE_STEP)
    return np.asarray(mean[:, :, np.newaxis] * np.eye(count) + change[:, np.newaxis] * bend)


def _quantities(circuit: Circuit, values: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Every quantity, shape (q,), and its derivatives by the vector, shape (q, p); NaN where there is none."""
    found = quantities_and_slopes(circuit.loaded(values))
    numbers = [np.nan if found[quantity][0] is None else found[quantity][0] for quantity in Quantity]
    slopes = [by_vector(circuit, values, found[quantity][1]) for quantity in Quantity]
    return np.array(numbers, dtype=float), np.array(slopes)


def _nodes(count: int) -> list[tuple[float, float]]:
    """Nodes and weights of Gauss's rule on 0 to 1."""
    points, weights = np.polynomial.legendre.leggauss(count)
    return [((point + 1) / 2, weight / 2) for point, weight in zip(points, weights, strict=True)]


def _contributions(estimate: ElementEstimate, shares: FloatArray, slopes: FloatArray) -> dict[str, Any]:
    """Contributions and their covariance, largest first."""
    circuit = estimate.circuit
    covariance = slopes @ estimate.covariance @ slopes.T
    order = sorted(
        (index for index, name in enumerate(circuit.names) if name != BENCH_DELAY),
        key=lambda index: -abs(shares[index]),
    )
    contributions = []
    for index in order:
        name = circuit.names[index]
        contributions.append(
            Contribution(
                name=name,
                designed=circuit.parameters[index].to_si(circuit.parameters[index].prior_mean),
                estimated=circuit.physical(estimate.vector)[name],
                share=_gaussian(estimate, float(shares[index]) + 0.0, float(covariance[index, index])),  # no -0.0
                informed=estimate.element(name).informed,
            )
        )
    return {"contributions": tuple(contributions), "covariance": frozen_float(covariance[np.ix_(order, order)])}


def _gaussian(estimate: ElementEstimate, value: float, variance: float) -> Estimate:
    return Estimate.gaussian(value, float(np.sqrt(max(variance, 0.0))), quantile=estimate.quantile)
