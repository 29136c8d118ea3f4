"""Which of the fitted poles is pole 2, which zero is the zero, and which of them are a doublet beside them."""

from __future__ import annotations

from itertools import permutations, product

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.fitting.factors import Doublet, FurtherPole
from fitamp.fitting.two_pole import Solution, TwoPole, solve
from fitamp.sweep import Sweep

__all__ = ["named"]

# With other names the response is the same, and chi-square changes by the priors only.
AS_GOOD = 10.0


def named(solution: Solution, sweep: Sweep) -> Solution:
    """The same response with the doublet made of the pole and the zero that belong together.

    The likelihood does not tell which pole is pole 2. A design expects pole 2 and the third pole somewhere; without
    one, the pole and the zero that are closest together are taken for what was added.
    """
    solution = _swapped(solution, sweep)
    model = solution.model
    doublets = [index for index, factor in enumerate(model.factors) if isinstance(factor, Doublet)]
    times_s = _pole_times(model, solution.values)
    if not doublets or times_s is None:
        return solution
    index = doublets[-1]
    doublet = model.factors[index]
    assert isinstance(doublet, Doublet)
    own = list(model.factor_values(solution.values))
    zero_s, pole_s = own[index] * doublet.time_s
    g, q, _, zero_time_s, _, delay_s = model.physical(solution.values)
    choices: list[tuple[float, FloatArray]] = []
    for (second_s, *third_s, paired_s), (left_s, partner_s) in product(
        permutations((*times_s[1:], pole_s)), permutations((zero_time_s, zero_s))
    ):
        if not paired_s * partner_s > 0 or (third_s and third_s[0] > second_s):
            continue
        denominator = np.polynomial.polynomial.polyfromroots([-1 / t for t in (times_s[0], second_s, *third_s)])
        a1, a2 = denominator[1:3] / denominator[0]
        far_s = float(denominator[3] / denominator[2]) if third_s else None
        base = model.vector(g=g / q / a1, q=1 / a1, b=a2 / a1, zero_time_s=left_s, far_pole_s=far_s, delay_s=delay_s)
        own[index] = np.array([partner_s, paired_s]) / doublet.time_s
        values = np.concatenate([base, *own])
        unlikely = np.log(partner_s / paired_s) ** 2 + (model.prior_rows(values)[0] ** 2).sum()
        choices.append((float(unlikely), values))
    if not choices:
        return solution
    renamed = solve(model, sweep, solution.noise, min(choices, key=lambda choice: choice[0])[1])
    as_good = renamed.optimum.chi_square < solution.optimum.chi_square + AS_GOOD
    return renamed if as_good and renamed.optimum.converged else solution


def _swapped(solution: Solution, sweep: Sweep) -> Solution:
    """The same response with pole 2 and a single further pole exchanged, where the design expects it so."""
    model = solution.model
    singles = [index for index, factor in enumerate(model.factors) if isinstance(factor, FurtherPole)]
    times_s = _pole_times(model, solution.values)
    if model.pole2 is None or not singles or times_s is None or len(times_s) < 2:
        return solution
    index = singles[-1]
    factor = model.factors[index]
    assert isinstance(factor, FurtherPole)
    own = list(model.factor_values(solution.values))
    further_s = float(own[index][0]) * factor.time_s
    second_s = float(times_s[1])
    if not 0 < further_s < times_s[0] or abs(np.log(further_s / model.pole2.time_s)) >= abs(
        np.log(second_s / model.pole2.time_s)
    ):
        return solution
    g, q, _, zero_time_s, far_pole_s, delay_s = model.physical(solution.values)
    new_q = 1 / (float(times_s[0]) + further_s)
    base = model.vector(
        g=g / q * new_q,
        q=new_q,
        b=float(times_s[0]) * further_s * new_q,
        zero_time_s=zero_time_s,
        far_pole_s=far_pole_s,
        delay_s=delay_s,
    )
    own[index] = np.array([second_s / factor.time_s])
    swapped = solve(model, sweep, solution.noise, np.concatenate([base, *own]))
    as_good = swapped.optimum.chi_square < solution.optimum.chi_square + AS_GOOD
    return swapped if as_good and swapped.optimum.converged else solution


def _pole_times(model: TwoPole, values: FloatArray) -> FloatArray | None:
    """Times of the two or three poles of the model's denominator, the longest first; None unless all are real."""
    _, q, b, _, far_pole_s, _ = model.physical(values)
    denominator = [b * far_pole_s, b, 1.0, q] if far_pole_s > 0 and model.far_pole.sd_s else [b, 1.0, q]
    with np.errstate(all="ignore"):
        roots = np.roots(denominator)
        times_s = -1 / roots.real
    if len(roots) < len(denominator) - 1 or roots.imag.any() or not (np.isfinite(times_s) & (times_s > 0)).all():
        return None
    return np.sort(times_s)[::-1]
