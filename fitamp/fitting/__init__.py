"""Fitting a two-pole, one-zero loop gain to a sweep. One door: `fit_sweep`."""

from fitamp.fitting.fit import MIN_POINTS, fit_sweep
from fitamp.fitting.result import (
    FittedMargins,
    FittedParameters,
    FitWarning,
    LoopFit,
    Root,
    WarningCode,
    ZeroPlace,
    ZeroSeen,
)
from fitamp.fitting.two_pole import DelayPrior, FarPoleCurve, FarPolePrior, Pole2Prior

__all__ = [
    "MIN_POINTS",
    "DelayPrior",
    "FarPoleCurve",
    "FarPolePrior",
    "FitWarning",
    "FittedMargins",
    "FittedParameters",
    "LoopFit",
    "Pole2Prior",
    "Root",
    "WarningCode",
    "ZeroPlace",
    "ZeroSeen",
    "fit_sweep",
]
