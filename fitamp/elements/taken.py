"""What a sweep shows beside the amplifier, taken over from its fit of two poles and a zero as it was found there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from fitamp.arrays import ComplexArray
from fitamp.elements.solving import CircuitSolution, solve
from fitamp.fitting import LoopFit
from fitamp.fitting.adequacy import judge
from fitamp.transfer import Transfer

__all__ = ["with_resonances"]


def with_resonances(solution: CircuitSolution, fits: Sequence[LoopFit]) -> CircuitSolution:
    """Let a sweep that no circuit describes have the resonances that its fit found, where it is better for them.

    What a circuit can describe is left to it: to two poles and a zero a mirror's pole may look like a resonance.
    """
    sweeps = []
    for which, (one, fit) in enumerate(zip(solution.sweeps, fits, strict=True)):
        factor = _resonances(fit)
        if factor is None or judge(solution.residuals_of(which)).adequate:
            sweeps.append(one)
            continue
        alone, resonant = (
            solve(solution.circuit, [variant], solution.values) for variant in (one, replace(one, factor=factor))
        )
        is_better = resonant.optimum.chi_square < alone.optimum.chi_square
        sweeps.append(resonant.sweeps[0] if is_better and not judge(alone.residuals_of(0)).adequate else one)
    if all(one.factor is None for one in sweeps):
        return solution
    return solve(solution.circuit, sweeps, solution.values)


def _resonances(fit: LoopFit) -> ComplexArray | None:
    """Resonances of package or supply at the sweep's frequencies, shape (n,); None without any."""
    poles = tuple(root.value_hz for root in fit.resonant_poles)
    if not any(pole.imag for pole in poles):
        return None
    zeros = tuple(root.value_hz for root in fit.resonant_zeros)
    return Transfer(dc_gain=1.0, poles_hz=poles, zeros_hz=zeros).evaluate(fit.sweep.freq_hz)
