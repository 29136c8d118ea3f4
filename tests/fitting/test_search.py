"""The search among starts: which noise they are raced under, and what comes of it."""

from __future__ import annotations

import numpy as np
import pytest
from bench_loops import Loop

from fitamp.fitting import ZeroPlace, fit_sweep
from fitamp.sweep import NoiseLevels


@pytest.mark.parametrize("seed", [1, 2, 4])
def test_a_start_that_is_nothing_like_the_sweep_does_not_set_the_noise(seed: int) -> None:
    # A third pole at 22 times pole 2, seen through 0.8 % of gain error; the zero is clearly on the right. Among the
    # starts with a delay some run away, and the scatter about them is as good as none.
    loop = Loop(dc_gain=17700.0, pole1_hz=57.7, pole2_hz=6.14e6, zero_time_s=-17.5e-9, third_s=1.17e-9)
    noise = NoiseLevels(error_channel=7.1e-5, return_channel=3.9e-5, relative=8.1e-3)
    fit = fit_sweep(loop.measured(seed, freq_hz=np.geomspace(10.0, 18e6, 279), noise=noise))
    assert fit.adequacy.adequate
    assert fit.zero.half_plane is ZeroPlace.RIGHT
