"""Finding the best solution: several starts, noise and fit in turn, and a lag where the sweep needs one."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.errors import FitError
from fitamp.fitting.adequacy import judge
from fitamp.fitting.start import Start, starts
from fitamp.fitting.two_pole import DelayPrior, FarPolePrior, Solution, TwoPole, solution_at, solve
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = ["Search"]

NOISE_ROUNDS = 3
# A lag below zero by no more than this many standard errors is a lag of about zero.
NEGATIVE_LAG_SIGMA = 3.0
# A logarithm known no better than this is one that the sweep does not see; bringing it nearer may cost no more
# chi-square than this.
UNSEEN_LN = 10.0
FREE_OF_CHARGE = 0.1
# Loop gain, or its inverse, that no loop has.
HUGE_GAIN = 1e20
LN_Q, LN_B = 1, 2
FREE_DELAY, NO_DELAY = DelayPrior(sd_s=np.inf), DelayPrior()
FREE_FAR_POLE, NO_FAR_POLE = FarPolePrior(sd_s=np.inf), FarPolePrior()


@dataclass(frozen=True, slots=True, kw_only=True)
class Search:
    """Searches solutions for one sweep; `noise` None means that it is estimated along the way."""

    sweep: Sweep
    noise: NoiseLevels | None
    known: Transfer | None
    guesses: tuple[Start, ...] = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "guesses", starts(self.sweep))

    def best(self, far_pole: FarPolePrior, delay: DelayPrior, *, also: Solution | None = None) -> Solution:
        """The solution of least chi-square from all starts, and from the solution `also`.

        Raises
        ------
        FitError
            When no start converges.
        """
        model = TwoPole(time_s=self._time_s(), known=self.known, far_pole=far_pole, delay=delay)
        vectors = [
            model.vector(g=guess.g, q=guess.q, b=guess.b, zero_time_s=guess.zero_time_s, far_pole_s=guess.far_pole_s)
            for guess in self.guesses
            # A third pole in the start is of use only where the model has room for it.
            if not guess.far_pole_s or far_pole.sd_s
        ]
        if also is not None:
            # Four numbers in common; by their logarithms, for a q or b that the sweep does not know may be anything.
            lifted = model.vector(g=1.0, q=1.0, b=1.0, zero_time_s=float(also.values[3]) * model.time_s)
            lifted[:4] = also.values[:4]
            vectors.append(lifted)
        vectors = [vector for vector in vectors if self._is_sane(model, vector)]
        ends: list[Solution] = []
        if vectors:
            # One noise for all, or their chi-squares could not be compared.
            common = self.noise or estimate_noise(self.sweep, model.gain(vectors[0], self.sweep.freq_hz))
            ends = [solve(model, self.sweep, common, vector) for vector in vectors]
            ends = [end for end in ends if end.optimum.converged and self._is_sane(model, end.values)]
        if not ends:
            raise FitError(
                f"{self.sweep.origin.file}: no start converged to two poles and a zero; look at the sweep with "
                "`fitamp read`"
            )
        return _in_sight(self._settled(min(ends, key=lambda end: end.optimum.chi_square)), self.sweep)

    def plain_or_with_lag(self) -> tuple[Solution, Solution | None]:
        """The solution without lag, or, where that is not adequate, with the simplest lag that makes it so.

        The second solution has third pole and delay both free: what it says of the zero holds whatever they are. It is
        None where the sweep does not determine them at all.
        """
        plain = self.best(NO_FAR_POLE, NO_DELAY)
        any_lag = self._best_or_none(FREE_FAR_POLE, FREE_DELAY, also=plain)
        if judge(plain).adequate:
            return plain, any_lag
        for far_pole, delay in ((NO_FAR_POLE, FREE_DELAY), (FREE_FAR_POLE, NO_DELAY)):
            with_lag = self._best_or_none(far_pole, delay, also=plain)
            if with_lag is not None and judge(with_lag).adequate and _is_lag(with_lag):
                return with_lag, any_lag
        if any_lag is not None and judge(any_lag).adequate and _is_lag(any_lag):
            return any_lag, any_lag
        return plain, any_lag

    def _best_or_none(self, far_pole: FarPolePrior, delay: DelayPrior, *, also: Solution) -> Solution | None:
        try:
            return self.best(far_pole, delay, also=also)
        except FitError:
            return None

    def _settled(self, solution: Solution) -> Solution:
        """Alternate noise and fit until both stand, or leave it where the noise is given."""
        if self.noise is not None:
            return solution
        for _ in range(NOISE_ROUNDS - 1):
            noise = estimate_noise(self.sweep, solution.model.gain(solution.values, self.sweep.freq_hz))
            again = solve(solution.model, self.sweep, noise, solution.values)
            if not (again.optimum.converged and self._is_sane(again.model, again.values)):
                break
            solution = again
        return solution

    def _is_sane(self, model: TwoPole, values: FloatArray) -> bool:
        """Whether the response is a loop gain: a runaway one makes its own variance huge, its misfit small."""
        size = np.abs(model.gain(values, self.sweep.freq_hz))
        return bool(((size > 1 / HUGE_GAIN) & (size < HUGE_GAIN)).all())

    def _time_s(self) -> float:
        """Time by which τz is scaled: 1/pole 2 of the first start, kept within sight of the band."""
        top = 1 / (2 * np.pi * self.sweep.f_max_hz)
        return float(np.clip(self.guesses[0].b, 0.01 * top, 1 / (2 * np.pi * self.sweep.f_min_hz)))


def _in_sight(solution: Solution, sweep: Sweep) -> Solution:
    """The same solution with a pole 1 or 2 that the sweep does not see brought back to four decades from the band.

    The optimum of a pole far outside the band is anywhere, as far away as a float goes; neither a profile nor a refit
    would find back from there.
    """
    for index, edge in ((LN_Q, 2 * np.pi * sweep.f_min_hz), (LN_B, 1 / (2 * np.pi * sweep.f_max_hz))):
        variance = solution.covariance[index, index]
        if variance < UNSEEN_LN**2:
            continue
        for decades in range(4, 20):
            hold = (index, float(np.log(edge * 10.0**-decades)))
            held = solve(solution.model, sweep, solution.noise, solution.values, hold=hold)
            if held.optimum.converged and held.optimum.chi_square < solution.optimum.chi_square + FREE_OF_CHARGE:
                solution = solution_at(solution.model, sweep, solution.noise, held.values)
                break
    return solution


def _is_lag(solution: Solution) -> bool:
    """Whether the fitted third pole and delay are lags, or zero within their errors."""
    model, values = solution.model, solution.values
    stderr: FloatArray = np.sqrt(np.diag(solution.covariance))
    return all(
        values[index] > -NEGATIVE_LAG_SIGMA * stderr[index]
        for index, name in enumerate(model.names)
        if name in {"far_pole", "delay"}
    )
