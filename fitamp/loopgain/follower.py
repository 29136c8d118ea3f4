"""A closed-loop response to loop gain."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from fitamp.errors import SweepError, UsageError
from fitamp.sweep import Concern, Sign, Sweep
from fitamp.units import si

__all__ = ["follower_to_loop"]


def follower_to_loop(sweep: Sweep, feedback_gain: float = 1.0) -> Sweep:
    """Loop gain from the response A of an amplifier in closed loop, A = (1/β)·T/(1 + T).

    T = β·A/(1 − β·A) has a difference of near equals in it wherever T is large: there a relative error of A is 1 + T
    times as large in T, and the mean of T over noise is no more that of the loop. The sweep says so; a fit to it is
    biased by what it has at its low end.

    Parameters
    ----------
    sweep
        Closed-loop response A, positive real at DC, its sign as read (`Sign.UNKNOWN` or `Sign.AS_READ`).
    feedback_gain
        β, gain of the feedback network in V/V; 1 for a follower.

    Raises
    ------
    UsageError
        When β is not finite and above 0.
    SweepError
        When β·A is exactly 1 at a point, where T has no bound.
    """
    if not (math.isfinite(feedback_gain) and feedback_gain > 0):
        raise UsageError(f"a feedback gain of {feedback_gain:g} is none; give it in V/V, above 0")
    scaled = feedback_gain * sweep.gain
    if (scaled == 1).any():
        index = int(np.argmax(scaled == 1))
        raise SweepError(
            f"{sweep.origin.file}, point {index + 1} ({si(float(sweep.freq_hz[index]), 'Hz')}): the closed loop has "
            "exactly its ideal gain, which leaves no bound to T; leave the point out or check the feedback gain"
        )
    loop = replace(
        sweep,
        gain=scaled / (1 - scaled),
        noise=None,
        sign=Sign.AS_READ,
        origin=replace(sweep.origin, form="follower"),
        left_out=tuple(replace(point, gain=None) for point in sweep.left_out),
    )
    loop = loop.with_decision(
        "loop gain", "T = β·A/(1 − β·A)", f"closed-loop response, β = {feedback_gain:g}", concern=Concern.RESULT
    )
    largest = float(np.abs(1 + loop.gain).max())
    return loop.with_decision(
        "closed loop",
        f"a relative error of A is up to {largest:.2g} times as large in T",
        "1 − β·A is a difference of near equals where T is large; T is biased there, and its noise is not even",
        concern=Concern.CAUTION,
    )
