"""Two fits of one sweep are the same to the last bit, whatever the memory held before."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from bench_loops import STANDARD

from fitamp.fitting import fit_sweep
from fitamp.sweep import Sweep

ON_POLE2_S = 1 / (2 * np.pi * 58e6)
LOOPS = {
    "as it should be": STANDARD,
    "a delay that the starts have to find": replace(STANDARD, delay_s=0.5e-9),
    "a zero on pole 2, along whose valley the fit creeps": replace(STANDARD, zero_time_s=ON_POLE2_S),
}


def fingerprint(sweep: Sweep) -> tuple[object, ...]:
    fit = fit_sweep(sweep)
    numbers = [(name, found.value, found.stderr, found.ci95) for name, found in fit.parameters.items()]
    numbers += [(name, found.value, found.stderr, found.ci95) for name, found in fit.margins.items()]
    solution = fit.solution
    return (repr(numbers), str(fit), solution.values.tobytes(), solution.covariance.tobytes())


@pytest.mark.parametrize("name", LOOPS)
def test_a_fit_does_not_depend_on_what_ran_before(name: str) -> None:
    sweep = LOOPS[name].measured(0)
    rng = np.random.default_rng(1)
    found = set()
    for _ in range(4):
        # Numbers of all sizes are left behind where the next fit will find its memory.
        litter = [rng.standard_normal(int(size)) for size in rng.integers(1, 3000, 200)]
        del litter
        found.add(fingerprint(sweep))
    assert len(found) == 1
