"""Contributions of elements to what moved: they add up, and say what hand calculation says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose
from stepped_parts import BASE, DESIGN, NOMINAL, STEPS, drawn, swept

from fitamp.amplifier import Elements
from fitamp.design import Bench
from fitamp.elements import ElementEstimate, Quantity, blame, estimate_elements
from fitamp.elements.attribution import QuantityBlame

BARE = replace(DESIGN, bench=Bench(delay_s=0.0))


def stepped(die: Elements, seed: int = 1) -> ElementEstimate:
    return estimate_elements(swept(die, STEPS, seed, bench_load_f=0.0), BARE, conditions=STEPS)


def at(estimate: ElementEstimate, **values: float) -> ElementEstimate:
    """The estimate as if it had come out with these very elements."""
    vector = estimate.circuit.vector(**values)
    optimum = replace(estimate.solution.optimum, values=vector)
    return replace(estimate, solution=replace(estimate.solution, optimum=optimum))


@pytest.fixture(scope="module")
def estimate() -> ElementEstimate:
    return stepped(drawn(1))


def shares(one: QuantityBlame | None) -> dict[str, float]:
    assert one is not None
    return {part.name: part.share.value or 0.0 for part in one.contributions}


def test_contributions_add_up_to_the_whole(estimate: ElementEstimate) -> None:
    for die in (
        estimate,
        at(estimate, Rz=0.0, gm2=0.8e-3),
        at(estimate, Rz=3500.0, CL=12e-12, Cc=0.9e-12),
        # Pole 2 and pole 3 are a pair here, and real in the design.
        at(estimate, Rz=5000.0, C1=1.5e-12, CL=5e-12),
    ):
        found = blame(die)
        assert [one.quantity for one in found.quantities] == list(Quantity)
        for one in found.quantities:
            whole = one.estimated - one.designed
            total = sum(shares(one).values())
            size = sum(abs(share) for share in shares(one).values())
            assert abs(total - whole) <= 1e-9 * size
            assert one.change.value == pytest.approx(whole, rel=1e-12)
            # What had to be shared out beyond the integrals is small.
            assert abs(one.quadrature_error) <= 0.02 * size


def test_smooth_paths_need_nothing_shared_out(estimate: ElementEstimate) -> None:
    for one in blame(estimate).quantities:
        assert abs(one.quadrature_error) <= 1e-9 * sum(abs(share) for share in shares(one).values())


def test_the_zero_is_shared_as_by_hand(estimate: ElementEstimate) -> None:
    # Only Rz off: its share is the whole, Cc·ΔRz. Rz and Cc off: τz + Cc/gm2 = Cc·Rz is a product, its change shared
    # along the path. With Rz = R0 + t·ΔR and Cc = C0·exp(t·λ): the share of Rz is ∫ΔR·C0·exp(tλ)dt = ΔR·C0·(e^λ − 1)/λ.
    alone = blame(at(estimate, Rz=1600.0)).of(Quantity.ZERO_TIME)
    assert shares(alone)["Rz"] == pytest.approx(NOMINAL.Cc * 300.0)
    assert sum(abs(share) for name, share in shares(alone).items() if name != "Rz") < 1e-20
    both = blame(at(estimate, Rz=1600.0, Cc=2.2e-12)).of(Quantity.ZERO_TIME)
    ln_ratio = np.log(2.2 / 1.8)
    assert shares(both)["Rz"] == pytest.approx(300.0 * NOMINAL.Cc * (2.2 / 1.8 - 1) / ln_ratio, rel=1e-9)
    assert set(shares(both)) == {"gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz"}
    assert shares(both)["gm1"] == 0.0


def test_the_element_that_moved_is_blamed() -> None:
    estimate = stepped(NOMINAL.with_changes(Rz=650.0, CL=4.8e-12))
    found = blame(estimate)
    zero, pole2 = found.of(Quantity.ZERO_TIME), found.of(Quantity.POLE2)
    assert zero is not None
    assert pole2 is not None
    assert zero.contributions[0].name == "Rz"
    assert zero.contributions[0].share.value == pytest.approx(-650.0 * NOMINAL.Cc, rel=0.01)
    assert zero.contributions[0].is_informed
    assert pole2.contributions[0].name == "CL"
    sizes = [abs(part.share.value or 0.0) for part in pole2.contributions]
    assert sizes == sorted(sizes, reverse=True)


def test_errors_of_contributions_are_those_of_differences(estimate: ElementEstimate) -> None:
    found = blame(estimate)
    base = {one.quantity: shares(one) for one in found.quantities}
    circuit = estimate.circuit
    slopes: dict[tuple[Quantity, str], list[float]] = {}
    for index in range(len(circuit.names)):
        step = np.zeros(len(circuit.names))
        step[index] = 1e-4
        moved = []
        for sign in (1, -1):
            optimum = replace(estimate.solution.optimum, values=estimate.vector + sign * step)
            other = blame(replace(estimate, solution=replace(estimate.solution, optimum=optimum)))
            moved.append({one.quantity: shares(one) for one in other.quantities})
        for quantity, names in base.items():
            for name in names:
                slopes.setdefault((quantity, name), []).append(
                    (moved[0][quantity][name] - moved[1][quantity][name]) / 2e-4
                )
    for one in found.quantities:
        for part, variance in zip(one.contributions, np.diag(one.covariance), strict=True):
            row = np.array(slopes[one.quantity, part.name])
            expected = float(np.sqrt(row @ estimate.covariance @ row))
            assert part.share.stderr == pytest.approx(expected, rel=1e-3, abs=1e-30)
            assert variance == pytest.approx(expected**2, rel=2e-3, abs=1e-60)


def test_the_error_of_the_whole_is_that_of_all_shares_together() -> None:
    # One sweep: single shares are far less certain than what they add up to.
    single = estimate_elements(swept(drawn(1), [BASE], 1, bench_load_f=0.0), BARE)
    margin = blame(single).of(Quantity.PHASE_MARGIN)
    assert margin is not None
    together = float(np.sqrt(margin.covariance.sum()))
    assert margin.change.stderr == pytest.approx(together, rel=1e-2)
    largest = max(part.share.stderr or 0.0 for part in margin.contributions)
    assert largest > 20 * together
    uninformed = [part.name for part in margin.contributions if not part.is_informed]
    assert {"R1", "R2"} <= set(uninformed)


def test_without_a_crossover_margins_are_left_out(estimate: ElementEstimate) -> None:
    low = replace(estimate.circuit, nominal=replace(NOMINAL, beta=1e-5))
    found = blame(replace(estimate, solution=replace(estimate.solution, circuit=low)))
    assert [one.quantity for one in found.quantities] == [
        Quantity.ZERO_TIME,
        Quantity.POLE2,
        Quantity.GAIN_BANDWIDTH,
    ]
    assert found.of(Quantity.CROSSOVER) is None


def test_bench_load_has_a_share_and_bench_delay_none() -> None:
    bench = Bench(load_f=2e-12, load_spread=0.05, delay_s=0.0, delay_spread_s=0.02e-9)
    design = replace(DESIGN, bench=bench)
    found = blame(estimate_elements(swept(drawn(2), [BASE], 1), design)).of(Quantity.POLE2)
    names = set(shares(found))
    assert "bench_load_f" in names
    assert "bench_delay_s" not in names
    assert_allclose(sum(shares(found).values()), (found.estimated - found.designed) if found else 0.0, rtol=1e-9)
