"""What a sweep shows beside the amplifier, taken over from its fit of two poles and a zero as it was found there."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fitamp.arrays import ComplexArray
from fitamp.elements.solving import CircuitSolution, solve
from fitamp.fitting import LoopFit
from fitamp.fitting.adequacy import judge
from fitamp.transfer import Transfer

__all__ = ["with_what_is_beside"]


def with_what_is_beside(solution: CircuitSolution, fits: Sequence[LoopFit]) -> CircuitSolution:
    """Let a sweep that no circuit describes have what its fit found beside two poles and a zero, where that is better.

    What a circuit can describe is left to it: to two poles and a zero a mirror's pole may look like a resonance.
    """
    sweeps = []
    for which, (one, fit) in enumerate(zip(solution.sweeps, fits, strict=True)):
        sweeps.append(one)
        factor = _beside(fit)
        if factor is None or judge(solution.residuals_of(which)).adequate:
            continue
        without, having = (
            solve(solution.circuit, [seen], solution.values) for seen in (one, replace(one, factor=factor))
        )
        if judge(without.residuals_of(0)).adequate:
            continue
        if having.optimum.chi_square < without.optimum.chi_square:
            sweeps[which] = having.sweeps[0]
    if all(one.factor is None for one in sweeps):
        return solution
    return solve(solution.circuit, sweeps, solution.values)


def _beside(fit: LoopFit) -> ComplexArray | None:
    """Resonances, doublets and range steps of a fit at the sweep's frequencies, shape (n,); None without any."""
    poles = tuple(root.value_hz for root in (*fit.resonant_poles, *fit.doublet_poles))
    if not poles and not fit.range_steps:
        return None
    zeros = tuple(root.value_hz for root in (*fit.resonant_zeros, *fit.doublet_zeros))
    factor = Transfer(dc_gain=1.0, poles_hz=poles, zeros_hz=zeros).evaluate(fit.sweep.freq_hz)
    for step in fit.range_steps:
        size, turn = 10 ** ((step.size_db.value or 0.0) / 20), math.radians(step.turn_deg.value or 0.0)
        factor = factor * np.where(fit.sweep.freq_hz > step.f_hz, size * np.exp(1j * turn), 1.0)
    return factor
