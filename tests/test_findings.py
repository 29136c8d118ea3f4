"""What an element estimate says, gathered: the wanted margin, the loads and resistors that keep it, and curves."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fitamp.errors import UsageError
from fitamp.findings import ElementFindings, findings_of
from fitamp.margins import margins


def margin_with(findings: ElementFindings, **changes: float) -> float:
    """Phase margin of the estimated part on the bench with something changed."""
    part = replace(findings.estimate.circuit.loaded(findings.estimate.vector), **changes)
    found = margins(part.transfer()).phase_margin_deg
    assert found is not None
    return found


def test_the_wanted_margin_is_the_designs_limit_unless_stated(stepped_example: ElementFindings) -> None:
    assert stepped_example.wanted_deg == 65
    stated = findings_of(stepped_example.estimate, wanted_deg=60.0, curves=False)
    assert stated.wanted_deg == 60
    assert (stated.over_load, stated.over_resistor, stated.resistors) == (None, None, None)
    assert stated.loads is not None
    assert stated.loads.high_f is not None
    assert margin_with(stepped_example, CL=stated.loads.high_f.value or 0.0) == pytest.approx(60, abs=1e-6)
    design = replace(stepped_example.design, limits={})
    without = findings_of(replace(stepped_example.estimate, design=design), curves=False)
    assert (without.wanted_deg, without.loads) == (None, None)


def test_a_margin_that_no_loop_has_is_refused(stepped_example: ElementFindings) -> None:
    with pytest.raises(UsageError, match="a phase margin lies between"):
        findings_of(stepped_example.estimate, wanted_deg=200.0, curves=False)


def test_resistors_that_keep_the_margin_end_where_it_is_met(stepped_example: ElementFindings) -> None:
    found = stepped_example.resistors
    assert found is not None
    assert found.keeps
    assert found.high_ohm is None
    # Straight lines between points 130 Ω apart of a smooth curve.
    assert margin_with(stepped_example, Rz=found.low_ohm or 0.0) == pytest.approx(65, abs=0.05)
    more = findings_of(stepped_example.estimate, wanted_deg=80.0)
    assert more.resistors is not None
    assert not more.resistors.keeps
    assert more.loads is not None
    assert not more.loads.keeps


def test_the_restored_zero_has_the_margin_of_its_resistor(stepped_example: ElementFindings) -> None:
    found, needed = stepped_example.restored_margin_deg, stepped_example.restoring.rz_ohm.value
    assert needed is not None
    assert found.value == pytest.approx(margin_with(stepped_example, Rz=needed))
    # The margin on the bench is known to 0.004 degrees, and this one hardly less.
    assert 0 < (found.stderr or 0.0) < 0.02


def test_curves_hold_both_places_and_the_end_of_the_kept_loads(stepped_example: ElementFindings) -> None:
    over, loads = stepped_example.over_load, stepped_example.loads
    assert over is not None
    assert loads is not None
    assert loads.high_f is not None
    for place in (over.estimated_at, over.designed_at, loads.high_f.value or 0.0):
        assert over.at[0] < place < over.at[-1]
        # On the grid, so that what is read off the curve there is exact.
        index = int(np.searchsorted(over.at, place))
        assert over.at[index] == place
        if place != over.designed_at:
            assert over.phase_margin_deg.value[index] == pytest.approx(margin_with(stepped_example, CL=place))
    assert stepped_example.broken_limits == ("pole2_hz",)
