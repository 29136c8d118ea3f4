"""What sets of sweeps are worth by each criterion, against the promises of the sets themselves."""

from __future__ import annotations

import numpy as np
import pytest
from planned_parts import OWN_SPREADS, added

from fitamp.planning import DEFAULT_NOISE, Criterion, expected_precision
from fitamp.planning.campaign import designed_die
from fitamp.planning.outcomes import Outcomes

LIST = (added(), added(10.0), added(0.0, -400.0))
DIE = designed_die(OWN_SPREADS, DEFAULT_NOISE)


def _outcomes(parts_drawn: int = 0) -> Outcomes:
    return Outcomes(DIE, OWN_SPREADS, LIST, parts_drawn=parts_drawn, seed=3)


def test_the_determinant_is_of_the_elements_with_the_bench_marginalised() -> None:
    (worth,) = _outcomes().worth(Criterion.DETERMINANT, {})((0, 1))
    covariance = DIE.covariance([DIE.triangle(sweep) for sweep in LIST[:2]])
    names = DIE.circuit.names
    assert names[-2:] == ("bench_load_f", "bench_delay_s")
    assert worth == pytest.approx(np.linalg.slogdet(covariance[:8, :8])[1])


def test_the_mean_variance_is_of_shares() -> None:
    (worth,) = _outcomes().worth(Criterion.VARIANCE, {})((0, 1, 2))
    shares = [one.relative for one in expected_precision(OWN_SPREADS, LIST).elements]
    assert worth == pytest.approx(np.mean(np.square(np.array(shares, dtype=float))), rel=1e-9)


def test_what_is_wanted_counts_until_it_is_met() -> None:
    sd = expected_precision(OWN_SPREADS, LIST[:2]).of("gm2").sd
    assert sd is not None
    outcomes = _outcomes()
    assert outcomes.worth(Criterion.WANTED, {"gm2": sd / 4})((1, 0))[0] == pytest.approx(4.0)
    assert outcomes.worth(Criterion.WANTED, {"gm2": sd * 4})((0, 1))[0] == 1.0
    # Before any sweep nothing is known of what is under test.
    assert outcomes.worth(Criterion.WANTED, {"Rz": 1.0})(())[0] == np.inf


def test_parts_are_looked_at_where_they_are_asked_for() -> None:
    outcomes = _outcomes(parts_drawn=4)
    with_parts, without = outcomes.stage((0, 1)), outcomes.stage((0, 1), over_parts=False)
    assert with_parts.of("gm2").over_parts is not None
    assert without.of("gm2").over_parts is None
    assert with_parts.of("gm2").sd == without.of("gm2").sd
    # Before any sweep what is under test is unknown in every part.
    assert outcomes.stage(()).of("Rz").over_parts is None
