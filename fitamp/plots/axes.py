"""Axes in SI units: decades of frequency with their prefixes, and the scale that shows both half planes."""

from __future__ import annotations

import math

import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.ticker import FixedFormatter, FixedLocator, FuncFormatter, LogLocator, NullFormatter

from fitamp.units import si

__all__ = ["frequency_axis", "hertz", "signed_decades", "signed_decimal"]

# More decades than this and only every second one gets its name.
NAMED_DECADES = 10


def hertz(value_hz: float) -> str:
    """A tick's text, with as many digits as a tick needs: "100 MHz"."""
    return "0" if value_hz == 0 else si(value_hz, "Hz", digits=1)


def frequency_axis(axes: Axes, low_hz: float, high_hz: float) -> None:
    """Make x a logarithmic frequency axis from `low_hz` to `high_hz`."""
    decades = math.log10(high_hz / low_hz)
    axes.set_xscale("log")
    axes.set_xlim(low_hz, high_hz)
    axes.xaxis.set_major_locator(
        LogLocator(subs=(1.0, 2.0, 5.0) if decades < 2.5 else (1.0,), numticks=NAMED_DECADES + 2)
    )
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: hertz(value)))
    axes.xaxis.set_minor_formatter(NullFormatter())
    if decades > NAMED_DECADES:
        axes.xaxis.set_minor_locator(LogLocator(subs=(1.0,), numticks=40))


def signed_decades(axis: Axis, linear_hz: float, reach_hz: float) -> None:
    """Decades to both sides of 0, linear within ±`linear_hz`, out to ±`reach_hz`."""
    axis._set_axes_scale("symlog", linthresh=linear_hz, linscale=0.5)  # type: ignore[attr-defined]  # set_xscale for either axis
    lowest, highest = round(math.log10(linear_hz)), math.floor(math.log10(reach_hz) + 1e-9)
    step = 1 if highest - lowest <= 4 else 2
    exponents = range(highest, lowest - 1, -step)
    ticks = [-(10.0**e) for e in exponents] + [0.0] + [10.0**e for e in reversed(exponents)]
    axis.set_major_locator(FixedLocator(ticks))
    axis.set_major_formatter(FixedFormatter([hertz(tick) for tick in ticks]))
    between = [sign * 10.0**e for e in range(lowest, highest + 1) for sign in (-1, 1)]
    axis.set_minor_locator(FixedLocator(np.array(between)))
    axis.set_minor_formatter(NullFormatter())


def signed_decimal(axis: Axis) -> None:
    """Linear, in hertz with prefix."""
    axis.set_major_formatter(FuncFormatter(lambda value, _: "0" if value == 0 else si(value, "Hz", digits=3)))
