"""What a fit may say in words: the half plane of the zero, and the warnings."""

from __future__ import annotations

import math

import numpy as np

from fitamp.arrays import ComplexArray
from fitamp.estimate import Estimate, Known
from fitamp.fitting.adequacy import Adequacy
from fitamp.fitting.result import (
    FittedMargins,
    FittedParameters,
    FitWarning,
    LoopFit,
    Root,
    WarningCode,
    ZeroPlace,
    ZeroSeen,
    text_of,
)
from fitamp.sweep import Sweep
from fitamp.units import si

__all__ = ["place_of_zero", "small_zero_time_s", "warnings_of"]

# Without a design, a zero ten times farther out than both pole 2 and crossover counts as gone.
SMALL_AGAINST_REST = 0.1
# An unknown lag is worth a word when it makes the zero time this many times less certain.
LAG_MATTERS = 3.0
# Length of a complex residual in standard deviations per component: by chance once in 600 000 points.
OUTLYING = 5.2


def place_of_zero(
    parameters: FittedParameters, margins: FittedMargins, strict: Estimate, adequacy: Adequacy
) -> ZeroSeen:
    """State the half plane only where the whole 95 % interval agrees.

    Parameters
    ----------
    strict
        Zero time with third pole and delay free, or under priors. A forgotten lag can only make a zero look farther
        right, so with an adequate model "left" holds without it, while "right" and "infinity" do not. Where the fit
        had to take up one lag, it may have taken too much of it, and "left" needs the strict estimate too.
    """
    plain = parameters.zero_time_s
    lag_free = not (_is_fitted(parameters.delay_s) or _is_fitted(parameters.far_pole_s))
    small_s = small_zero_time_s(parameters, margins)
    if plain.known is Known.UNDETERMINED:
        place = ZeroPlace.UNDECIDED
    elif strict.is_within(-small_s, small_s):
        place = ZeroPlace.INFINITY
    elif (adequacy.adequate and lag_free and plain.is_within(0.0, math.inf)) or strict.is_within(0.0, math.inf):
        place = ZeroPlace.LEFT
    elif strict.is_within(-math.inf, 0.0):
        place = ZeroPlace.RIGHT
    else:
        place = ZeroPlace.UNDECIDED
    return ZeroSeen(
        half_plane=place,
        frequency_hz=_frequency(plain.value),
        ci95_hz=_frequency_interval(plain),
    )


def _is_fitted(lag: Estimate) -> bool:
    """Whether a lag was fitted; one that is held has a value and no error."""
    return lag.value is None or lag.stderr is not None


def small_zero_time_s(parameters: FittedParameters, margins: FittedMargins) -> float:
    """Zero time, in s, below which a zero counts as gone where no design says what it should be; 0 for none."""
    farthest_hz = max(parameters.pole2_hz.value or 0.0, margins.crossover_hz.value or 0.0)
    return SMALL_AGAINST_REST / (2 * math.pi * farthest_hz) if parameters.pole2_hz.value else 0.0


def _frequency(time_s: float | None) -> float | None:
    return 1 / (2 * math.pi * abs(time_s)) if time_s else None


def _frequency_interval(zero_time: Estimate) -> tuple[float | None, float | None]:
    low, high = zero_time.ci95
    if low is None or high is None:
        return None, None
    nearest = _frequency(max(abs(low), abs(high)))
    farthest = None if low <= 0 <= high else _frequency(min(abs(low), abs(high)))
    return nearest, farthest


def warnings_of(fit: LoopFit, with_any_lag: Estimate | None) -> tuple[FitWarning, ...]:
    """Everything a reader has to know before leaning on the numbers.

    with_any_lag : zero time with third pole and delay free; None where priors say what they are
    """
    sweep, parameters, margins, adequacy = fit.sweep, fit.parameters, fit.margins, fit.adequacy
    found: list[FitWarning] = []

    def warn(code: WarningCode, message: str) -> None:
        found.append(FitWarning(code=code, message=message))

    if not adequacy.adequate:
        warn(
            WarningCode.MODEL_INADEQUATE,
            f"two poles and a zero are not the whole story: {adequacy.sentence}; intervals are widened "
            f"{math.sqrt(adequacy.inflation):.2g} times and may still be too narrow",
        )
    found.extend(_outlying(sweep, fit.residuals()))
    found.extend(further_roots(fit))
    found.extend(_range_steps(fit))
    if parameters.pole1_hz.known is not Known.MEASURED:
        warn(
            WarningCode.POLE1_BELOW_BAND,
            f"pole 1 is not determined by a band from {si(sweep.f_min_hz, 'Hz')}; only the gain-bandwidth product is: "
            "start the sweep lower",
        )
    if parameters.pole2_hz.known is not Known.MEASURED:
        split = parameters.zero_pole2_split_s
        warn(
            WarningCode.POLE2_ABOVE_BAND,
            f"pole 2 is not determined by a band up to {si(sweep.f_max_hz, 'Hz')}; only the split "
            f"τz − 1/pole 2 = {si(split.value, 's')} is: sweep higher, or average more",
        )
    if parameters.zero_time_s.known is Known.UNDETERMINED:
        warn(WarningCode.ZERO_UNDETERMINED, "the zero time is not determined by this band and noise")
    if with_any_lag is not None:
        lags = [
            f"a {name}" if lag.value is None else f"a {name} of {si(lag.value, 's', digits=3)}"
            for name, lag in (("path delay", parameters.delay_s), ("third pole's time", parameters.far_pole_s))
            if _is_fitted(lag)
        ]
        if lags:
            warn(
                WarningCode.LAG_FITTED,
                f"the sweep needed {' and '.join(lags)} beside two poles and a zero; a design file says which lag to "
                "expect",
            )
    if with_any_lag is not None and _lag_matters(parameters.zero_time_s, with_any_lag):
        warn(
            WarningCode.LAG_AMBIGUITY,
            "zero time and pole 2 hold only if third pole and path delay are as taken here; more of them passes for "
            "a zero farther right: without a design file only τz − 1/pole 3 − delay is determined",
        )
    crossover_hz = margins.crossover_hz.value
    if crossover_hz is None:
        warn(WarningCode.NO_CROSSOVER, "the fitted loop gain does not cross 1: there is no phase margin to state")
    elif not sweep.f_min_hz <= crossover_hz <= sweep.f_max_hz:
        warn(
            WarningCode.CROSSOVER_OUTSIDE_BAND,
            f"crossover at {si(crossover_hz, 'Hz')} lies outside the band; margins are extrapolated by the model",
        )
    return tuple(found)


def further_roots(fit: LoopFit) -> list[FitWarning]:
    """A warning for every resonance and doublet, and for every unstable pole."""
    found = []
    for pole in (pole for pole in fit.resonant_poles if pole.value_hz.imag > 0):
        quality = abs(pole.value_hz) / abs(2 * pole.value_hz.real)
        message = (
            f"two poles and a zero were not enough: a resonance at {si(abs(pole.value_hz), 'Hz')} (Q = {quality:.2g}) "
            "was fitted beside them; look for it in package, supply or fixture"
        )
        found.append(FitWarning(code=WarningCode.RESONANCE, message=message))
    for pole, zero in zip(fit.doublet_poles, fit.doublet_zeros, strict=True):
        message = (
            f"two poles and a zero were not enough: a pole at {si(abs(pole.value_hz), 'Hz')} with a zero at "
            f"{si(abs(zero.value_hz), 'Hz')} was fitted beside them, as of a current mirror or a second path"
        )
        if fit.solution.model.pole2 is None:
            message += (
                "; without a design file which of the poles is pole 2, and which zero the Miller zero, is a guess"
            )
        found.append(FitWarning(code=WarningCode.DOUBLET, message=message))
    for pole in fit.further_poles:
        message = (
            f"two poles and a zero were not enough: a further pole at {si(abs(pole.value_hz), 'Hz')} was fitted beside "
            "them; look for a node of the chip or fixture that was not designed to be so slow"
        )
        found.append(FitWarning(code=WarningCode.FURTHER_POLE, message=message))
    for name, pole in fit.named_poles:
        if pole.value_hz.real > 0 and pole.value_hz.imag >= 0:
            message = (
                f"unstable: {name} at {si(pole.value_hz.real, 'Hz')} ± j {si(pole.value_hz.imag, 'Hz')} lies in the "
                f"right half plane{_in_doubt(pole)}; the opened loop would run away by itself: check sign and set-up"
            )
            found.append(FitWarning(code=WarningCode.UNSTABLE_ROOT, message=message))
    return found


def _in_doubt(root: Root) -> str:
    if root.covariance is None or root.value_hz.real > 2 * math.sqrt(float(root.covariance[0, 0])):
        return ""
    return ", though not beyond its error"


def _range_steps(fit: LoopFit) -> list[FitWarning]:
    found = []
    for step in fit.range_steps:
        message = (
            f"at {si(step.f_hz, 'Hz')} all that was read jumps by {text_of('size_db', step.size_db)} and "
            f"{text_of('turn_deg', step.turn_deg)}, as where a "
            "receiver changes its range; the jump was fitted, the points below it are taken as right: fix the range, "
            "or calibrate"
        )
        found.append(FitWarning(code=WarningCode.RANGE_STEP, message=message))
    return found


def _outlying(sweep: Sweep, residuals: ComplexArray) -> list[FitWarning]:
    """Points too far from the fit to be noise, the worst named."""
    size = np.abs(residuals)
    bad = np.flatnonzero(size > OUTLYING)
    if not 0 < len(bad) <= len(size) // 20:
        return []
    worst = bad[np.argsort(-size[bad])][:3]
    named = ", ".join(f"{si(float(sweep.freq_hz[i]), 'Hz')} ({size[i]:.0f} σ)" for i in worst)
    rest = f" and {len(bad) - len(worst)} more" if len(bad) > len(worst) else ""
    return [
        FitWarning(
            code=WarningCode.OUTLYING_POINTS,
            message=f"points far off the fit at {named}{rest}: they spoil noise estimate and fit; measure them again "
            "or leave them out",
        )
    ]


def _lag_matters(plain: Estimate, with_any_lag: Estimate) -> bool:
    """Whether an unknown lag leaves the zero time much less certain than the fit without it says."""
    if with_any_lag.stderr is None or plain.stderr is None:
        return True
    return with_any_lag.stderr > LAG_MATTERS * plain.stderr
