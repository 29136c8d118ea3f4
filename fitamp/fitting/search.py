"""Finding the best solution: several starts, noise and fit in turn, and a lag where the sweep needs one."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from operator import itemgetter

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.errors import FitError
from fitamp.fitting.adequacy import judge
from fitamp.fitting.leastsq import TOLERANCE
from fitamp.fitting.start import Start, excess_delay, more_starts, starts
from fitamp.fitting.two_pole import (
    DelayPrior,
    FarPoleCurve,
    FarPolePrior,
    Pole2Prior,
    Solution,
    TwoPole,
    solution_at,
    solve,
)
from fitamp.noise import estimate_noise
from fitamp.sweep import NoiseLevels, Sweep
from fitamp.transfer import Transfer

__all__ = [
    "FREE_DELAY",
    "FREE_FAR_POLE",
    "NO_DELAY",
    "NO_FAR_POLE",
    "RACE_STEPS",
    "RACE_TOLERANCE",
    "Search",
    "is_lag",
    "lifted",
]

NOISE_ROUNDS = 3
CURVE_ROUNDS = 3
# To tell which start ends lowest, chi-square to seven digits is enough, and who is still far off after so many steps
# does not win.
RACE_TOLERANCE = 1e-7
# Before the noise is estimated once more, nothing is gained by more digits than this.
ON_THE_WAY = 1e-9
RACE_STEPS = 100
# Relative distance from a sweep at nearly all points within which a solution is near enough to tell its noise.
NEAR, NEARLY_ALL = 0.2, 0.9
# A lag below zero by no more than this many standard errors is a lag of about zero.
NEGATIVE_LAG_SIGMA = 3.0
# A logarithm known no better than this is one that the sweep does not see.
UNSEEN_LN = 10.0
# Difference in chi-square that says nothing.
FREE_OF_CHARGE = 0.1
# A delay that turns the top of the band by less than this part of a turn needs no start of its own; one so many
# standard deviations from what is expected is not looked for.
VISIBLE_TURN = 0.02
REACH_OF_PRIOR = 5.0
# Loop gain, or its inverse, that no loop has.
HUGE_GAIN = 1e20
# A pole 2 inside the band that lowers chi-square by less than this against one at the band's top was drawn there by
# noise: with a zero beside it, noise has some ten places to choose from.
UNPLACED = 10.0
PLACED_LN = 0.1
LN_Q, LN_B = 1, 2
FREE_DELAY, NO_DELAY = DelayPrior(sd_s=np.inf), DelayPrior()
FREE_FAR_POLE, NO_FAR_POLE = FarPolePrior(sd_s=np.inf), FarPolePrior()


@dataclass(frozen=True, slots=True, kw_only=True)
class Search:
    """Searches solutions for one sweep; `noise` None means that it is estimated along the way.

    delay_s : path delay that is expected, by which the first starts are turned back
    """

    sweep: Sweep
    noise: NoiseLevels | None
    known: Transfer | None
    delay_s: float = 0.0
    pole2: Pole2Prior | None = None
    guesses: tuple[Start, ...] = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "guesses", starts(self.bare, self.delay_s))

    @property
    def bare(self) -> Sweep:
        """The sweep without what is known."""
        if self.known is None:
            return self.sweep
        gain = self.sweep.gain / self.known.evaluate(self.sweep.freq_hz)
        return Sweep(freq_hz=self.sweep.freq_hz, gain=gain, origin=self.sweep.origin)

    def _guesses_for(self, delay: DelayPrior) -> tuple[Start, ...]:
        """The first starts, and where the delay is open also those with the delay that the phase shows."""
        if not delay.sd_s:
            return self.guesses
        bare = self.bare
        seen_s = excess_delay(bare)
        offset_s = abs(seen_s - self.delay_s)
        if offset_s * self.sweep.f_max_hz < VISIBLE_TURN or offset_s > REACH_OF_PRIOR * delay.sd_s:
            return self.guesses
        return (*self.guesses, *starts(bare, seen_s), *starts(bare, (seen_s + self.delay_s) / 2))

    def best(self, far_pole: FarPolePrior, delay: DelayPrior, *, also: Solution | None = None) -> Solution:
        """The solution of least chi-square from all starts and from the solution `also`.

        Raises
        ------
        FitError
            When no start converges.
        """
        model = TwoPole(time_s=self._time_s(), known=self.known, far_pole=far_pole, delay=delay, pole2=self.pole2)
        vectors = self.vectors(model)
        if also is not None:
            vectors.insert(0, lifted(also, model))
        vectors = [vector for vector in vectors if self.is_sane(model, vector)]
        ends: list[Solution] = []
        if vectors:
            # One noise for all, or their chi-squares could not be compared.
            common = self.noise or (also.noise if also is not None and self._is_near(also) else None)
            if common is None:
                common = min((self._noise_about(model, vector) for vector in vectors), key=itemgetter(0))[1]
            ends = [
                solve(model, self.sweep, common, vector, tolerance=RACE_TOLERANCE, max_steps=RACE_STEPS)
                for vector in vectors
            ]
            ends = [end for end in ends if np.isfinite(end.optimum.chi_square) and self.is_sane(model, end.values)]
        if not ends:
            raise FitError(
                f"{self.sweep.origin.file}: no start converged to two poles and a zero; look at the sweep with "
                "`fitamp read`"
            )
        # By any difference: with a noise taken for too large at the start, as on exact data, all differences are small.
        winner = min(ends, key=lambda end: end.optimum.chi_square)
        return _in_sight(_at_the_top(self.settled(winner), self.sweep), self.sweep)

    def vectors(self, model: TwoPole) -> list[FloatArray]:
        """The guesses as parameter vectors of a model without further factors."""
        return [
            model.vector(
                g=guess.g,
                q=guess.q,
                b=guess.b,
                zero_time_s=guess.zero_time_s,
                far_pole_s=guess.far_pole_s,
                delay_s=guess.delay_s,
            )
            for guess in self._guesses_for(model.delay)
            # A third pole in the start is of use only where the model has room for it.
            if not guess.far_pole_s or model.far_pole.sd_s
        ]

    def with_far_pole(self, far_pole: FarPolePrior | FarPoleCurve, delay: DelayPrior) -> Solution:
        """The best solution under what is known of the lag; a curve is followed to where the zero is found."""
        if isinstance(far_pole, FarPolePrior):
            return self.best(far_pole, delay)
        at_s, solution = far_pole.zero_time_s, None
        for _ in range(CURVE_ROUNDS):
            solution = self.best(far_pole.at(at_s), delay, also=solution)
            found_s = solution.model.physical(solution.values)[3]
            if abs(found_s - at_s) <= far_pole.settled_s:
                break
            at_s = found_s
        assert solution is not None
        return solution

    def plain(self) -> Solution:
        """The best solution without lag; where that is not adequate, from more starts than vector fitting gives."""
        plain = self.best(NO_FAR_POLE, NO_DELAY)
        if judge(plain).adequate:
            return plain
        ends = [plain]
        model = plain.model
        for guess in more_starts(self.bare):
            vector = model.vector(g=guess.g, q=guess.q, b=guess.b, zero_time_s=guess.zero_time_s)
            end = solve(model, self.sweep, plain.noise, vector, tolerance=RACE_TOLERANCE, max_steps=RACE_STEPS)
            if np.isfinite(end.optimum.chi_square) and self.is_sane(model, end.values):
                ends.append(end)
        winner = min(ends, key=lambda end: end.optimum.chi_square)
        return plain if winner is plain else _in_sight(_at_the_top(self.settled(winner), self.sweep), self.sweep)

    def plain_or_with_lag(self, plain: Solution) -> tuple[Solution, Solution | None]:
        """The solution `plain` without lag, or, where that is not adequate, with the simplest lag that makes it so.

        The second solution has third pole and delay both free: what it says of the zero holds whatever they are. It is
        None where the sweep does not determine them at all.
        """
        if judge(plain).adequate:
            return plain, self._with_any_lag(plain)
        any_lag = self._best_or_none(FREE_FAR_POLE, FREE_DELAY, also=plain)
        for far_pole, delay in ((NO_FAR_POLE, FREE_DELAY), (FREE_FAR_POLE, NO_DELAY)):
            with_lag = self._best_or_none(far_pole, delay, also=plain)
            if with_lag is not None and judge(with_lag).adequate and is_lag(with_lag):
                return with_lag, any_lag
        if any_lag is not None and judge(any_lag).adequate and is_lag(any_lag):
            return any_lag, any_lag
        return plain, any_lag

    def _with_any_lag(self, plain: Solution) -> Solution | None:
        """An adequate solution with third pole and delay set free under the same noise; None where that leads astray.

        Only from there: elsewhere the two more parameters would find a doublet in the noise. What comes of it is an
        interval, for which seven digits of chi-square will do.
        """
        model = replace(plain.model, far_pole=FREE_FAR_POLE, delay=FREE_DELAY)
        end = solve(model, self.sweep, plain.noise, lifted(plain, model), tolerance=RACE_TOLERANCE)
        if not (np.isfinite(end.optimum.chi_square) and self.is_sane(model, end.values)):
            return None
        return _in_sight(_at_the_top(end, self.sweep), self.sweep)

    def _best_or_none(self, far_pole: FarPolePrior, delay: DelayPrior, *, also: Solution) -> Solution | None:
        try:
            return self.best(far_pole, delay, also=also)
        except FitError:
            return None

    def settled(self, solution: Solution) -> Solution:
        """Finish what won the race: alternate noise and fit until both stand, or fit once where the noise is given."""
        rounds = 1 if self.noise else NOISE_ROUNDS - 1
        for left in reversed(range(rounds)):
            noise = self.noise or estimate_noise(self.sweep, solution.model.gain(solution.values, self.sweep.freq_hz))
            again = solve(
                solution.model, self.sweep, noise, solution.values, tolerance=ON_THE_WAY if left else TOLERANCE
            )
            if not again.optimum.converged:
                # Down an endless valley of a parameter that the sweep does not see, seven digits have to do.
                again = solve(solution.model, self.sweep, noise, again.values, tolerance=RACE_TOLERANCE)
            if not (again.optimum.converged and self.is_sane(again.model, again.values)):
                break
            solution = again
        return solution

    def _is_near(self, solution: Solution) -> bool:
        """Whether a solution runs along the sweep, so that the scatter about it is the sweep's own."""
        miss = np.abs(solution.model.gain(solution.values, self.sweep.freq_hz) - self.sweep.gain)
        return bool(np.quantile(miss / np.abs(self.sweep.gain), NEARLY_ALL) < NEAR)

    def _noise_about(self, model: TwoPole, values: FloatArray) -> tuple[float, NoiseLevels]:
        """Noise of the scatter about a start, before it minus twice the logarithm of the start's likelihood with it.

        The quietest noise would not do: about a start that is nothing like the sweep it may come out as small as it
        likes.
        """
        gain = model.gain(values, self.sweep.freq_hz)
        noise = estimate_noise(self.sweep, gain, set_aside=False)
        measured = self.sweep.gain
        through = np.abs(1 + measured) ** 2
        variance = noise.return_channel**2 + np.abs(gain * noise.error_channel) ** 2
        variance = variance + (np.abs(measured * noise.relative) ** 2 + noise.ratio**2) / through
        return 2 * float((np.abs(measured - gain) ** 2 / through / variance + np.log(variance)).sum()), noise

    def is_sane(self, model: TwoPole, values: FloatArray) -> bool:
        """Whether this can be a loop: in size, and without a far pole on the right nearer than pole 2.

        A runaway gain makes its own variance huge and its misfit small; such a far pole only cancels a zero that is not
        there. A third pole of positive time is never mistaken for one, and noise moves it below 0 by far less.
        """
        size = np.abs(model.gain(values, self.sweep.freq_hz))
        _, _, b, _, far_pole_s, _ = model.physical(values)
        return bool(((size > 1 / HUGE_GAIN) & (size < HUGE_GAIN)).all() and far_pole_s >= -b)

    def _time_s(self) -> float:
        """Time by which τz is scaled: 1/pole 2 of the first start, kept within sight of the band."""
        top = 1 / (2 * np.pi * self.sweep.f_max_hz)
        return float(np.clip(self.guesses[0].b, 0.01 * top, 1 / (2 * np.pi * self.sweep.f_min_hz)))


def lifted(solution: Solution, model: TwoPole) -> FloatArray:
    """The parameter vector of a solution for a model with more freedom and the same scale of time.

    ln q and ln b are taken as they are: of what the sweep does not know, the exponential may be no number.
    """
    *_, far_pole_s, delay_s = solution.model.physical(solution.values)
    lags = {"far_pole": far_pole_s / model.time_s, "delay": delay_s / model.time_s}
    further = np.concatenate([[], *solution.model.factor_values(solution.values)])
    return np.array([*solution.values[:4], *(lags[name] for name in model.names[4:] if name in lags), *further])


def _in_sight(solution: Solution, sweep: Sweep) -> Solution:
    """The same solution with a pole 1 or 2 that the sweep does not see brought back to four decades from the band.

    The optimum of a pole far outside the band is anywhere, as far away as a float goes; neither a profile nor a refit
    would find back from there.
    """
    for index, edge in ((LN_Q, 2 * np.pi * sweep.f_min_hz), (LN_B, 1 / (2 * np.pi * sweep.f_max_hz))):
        if solution.covariance[index, index] < UNSEEN_LN**2:
            continue
        for decades in range(4, 20):
            hold = (index, float(np.log(edge * 10.0**-decades)))
            if hold[1] < solution.values[index]:
                break
            held = solve(solution.model, sweep, solution.noise, solution.values, hold=hold)
            if held.optimum.converged and held.optimum.chi_square < solution.optimum.chi_square + FREE_OF_CHARGE:
                solution = solution_at(solution.model, sweep, solution.noise, held.values)
                break
    return solution


def _at_the_top(solution: Solution, sweep: Sweep) -> Solution:
    """The same solution with a pole 2 that noise alone has drawn into the band put back to the band's top.

    A zero on pole 2 makes them both invisible: such a pair may be found anywhere, and looks measured there.
    """
    model = solution.model
    top = float(np.log(1 / (2 * np.pi * sweep.f_max_hz)))
    if model.pole2 is not None or model.factors or solution.values[LN_B] <= top:
        return solution
    # What is seen at three standard deviations is not placed to a tenth.
    if solution.covariance[LN_B, LN_B] < PLACED_LN**2:
        return solution
    held = solve(model, sweep, solution.noise, solution.values, hold=(LN_B, top), tolerance=RACE_TOLERANCE)
    if held.optimum.converged and held.optimum.chi_square < solution.optimum.chi_square + UNPLACED:
        return solution_at(model, sweep, solution.noise, held.values)
    return solution


def is_lag(solution: Solution) -> bool:
    """Whether the fitted third pole and delay are lags, or zero within their errors."""
    model, values = solution.model, solution.values
    stderr: FloatArray = np.sqrt(np.diag(solution.covariance))
    return all(
        values[index] > -NEGATIVE_LAG_SIGMA * stderr[index]
        for index, name in enumerate(model.names)
        if name in {"far_pole", "delay"}
    )
