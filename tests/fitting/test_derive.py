"""From a solution to estimates, where parameters run out of the range of floats."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from bench_loops import FREQ_HZ, NOISE, STANDARD

from fitamp.estimate import Known
from fitamp.fitting import fit_sweep
from fitamp.noise import simulate_bench
from fitamp.sweep import Sweep


@pytest.mark.parametrize("seed", [0, 3, 6])
def test_a_zero_on_pole_2_leaves_bounds_however_far_out_they_lie(seed: int) -> None:
    # Both act by their difference alone; on the profile of one the other runs through hundreds of decades.
    on_pole2 = replace(STANDARD, zero_time_s=1 / (2 * np.pi * 58e6))
    gain = simulate_bench(on_pole2.gain(), NOISE, np.random.default_rng([7, seed]))
    found = fit_sweep(Sweep(freq_hz=FREQ_HZ, gain=gain)).parameters
    assert found.pole2_hz.known is not Known.MEASURED
    assert found.zero_time_s.known is not Known.MEASURED
    split = found.zero_pole2_split_s
    assert split.value is not None
    assert split.stderr is not None
    # a2/a1 is 1/(ω1 + ω2), a little less than 1/ω2.
    true_s = on_pole2.zero_time_s - 1 / (2 * np.pi * (1.2e3 + 58e6))
    assert split.value == pytest.approx(true_s, abs=5 * split.stderr)
    assert split.stderr < 1e-3 * on_pole2.zero_time_s
