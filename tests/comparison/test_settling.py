"""Which measurement would settle an open verdict, by the circuit: of several causes the one that weighs most."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from simulated_parts import BENCH, NOMINAL, SPREADS, measured

from fitamp.comparison.circuit_zero import CircuitZero, zero_by_circuit
from fitamp.comparison.expectation import fit_with_design
from fitamp.comparison.settling import what_settles_circuit
from fitamp.design import Bench, Design

SURE = dict.fromkeys(SPREADS, 0.001)
EXACT = replace(BENCH, delay_spread_s=1e-13)


@pytest.mark.parametrize(
    ("changes", "spreads", "bench", "f_max_hz", "words"),
    [
        (
            {"mirror_pole_hz": 300e6},
            SPREADS | {"mirror_pole_hz": 0.3},
            BENCH,
            100e6,
            "the mirror pole decides: state a",
        ),
        ({"Cgd": 100e-15}, SURE | {"Cgd": 0.5}, EXACT, 60e6, "the overlap capacitor decides: state a tighter spread"),
        ({}, SPREADS, replace(BENCH, delay_spread_s=1e-9), 20e6, "the path delay decides: measure it with a through"),
        ({}, SURE | {"C1": 0.4}, EXACT, 60e6, "the third pole decides: state tighter spreads for C1, Cc and gm2"),
        ({}, SURE, EXACT, 3e6, "the load decides, whatever its spread: sweep up to a few times pole 2, about 120 MHz"),
        ({}, SPREADS, BENCH, 0.3e6, "the band does not determine pole 2: sweep up to a few times pole 2, about 120"),
        ({}, SURE, EXACT, 100e6, "the noise decides: average more"),
    ],
)
def test_what_weighs_most_is_named(
    changes: dict[str, float], spreads: dict[str, float], bench: Bench, f_max_hz: float, words: str
) -> None:
    nominal = NOMINAL.with_changes(**changes)
    design = Design.from_elements(nominal, spreads=spreads, bench=bench)
    fit = fit_with_design(measured(nominal, 91, freq_hz=np.geomspace(10, f_max_hz, 121)), design)
    found = zero_by_circuit(fit, design)
    assert isinstance(found, CircuitZero)
    assert what_settles_circuit(found, fit, design).startswith(words)


def test_a_zero_in_either_half_plane_is_a_matter_of_the_delay() -> None:
    design = Design.from_elements(NOMINAL, spreads=SPREADS, bench=BENCH)
    fit = fit_with_design(measured(NOMINAL, 92), design)
    found = zero_by_circuit(fit, design)
    assert isinstance(found, CircuitZero)
    assert what_settles_circuit(replace(found, is_split=True), fit, design).startswith("the path delay decides")
