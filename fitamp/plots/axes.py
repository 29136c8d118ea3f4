"""Axes in SI units: decades of frequency with their prefixes, and the scale that shows both half planes."""

from __future__ import annotations

import math

from matplotlib.axes import Axes
from matplotlib.axis import Axis, XAxis
from matplotlib.ticker import FixedFormatter, FixedLocator, FuncFormatter, LogLocator, NullFormatter, NullLocator

from fitamp.units import si

__all__ = ["LINEAR_SHARE", "frequency_axis", "hertz", "signed_decades", "signed_decimal"]

# More decades than this and only every second one gets its name.
NAMED_DECADES = 10
# The linear part around 0 is as wide as this share of a decade on each side.
LINEAR_SHARE = 0.8
# No tick but 0 within this share of each half of the axis.
FREE_SHARE = 0.08


def hertz(value_hz: float) -> str:
    """A tick's text, with as many digits as a tick needs: "100 MHz"."""
    return "0" if value_hz == 0 else si(value_hz, "Hz", digits=1)


def frequency_axis(axes: Axes, low_hz: float, high_hz: float, *, labelled: bool = True) -> None:
    """Make x a logarithmic frequency axis; ticks of the panels above a labelled one are the decades alone."""
    decades = math.log10(high_hz / low_hz)
    axes.set_xscale("log")
    axes.set_xlim(low_hz, high_hz)
    subs = (1.0, 2.0, 5.0) if decades < 2.5 else (1.0,)
    axes.xaxis.set_major_locator(LogLocator(subs=subs, numticks=NAMED_DECADES + 2))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: hertz(value)))
    axes.xaxis.set_minor_formatter(NullFormatter())
    axes.tick_params(labelbottom=labelled)
    if not labelled:  # every tick costs drawing time
        axes.xaxis.set_minor_locator(NullLocator())
    elif decades > NAMED_DECADES:
        axes.xaxis.set_minor_locator(LogLocator(subs=(1.0,), numticks=40))


def signed_decades(axis: Axis, linear_hz: float, reach_hz: float) -> None:
    """Decades to both sides of 0, linear within ±`linear_hz`, out to ±`reach_hz`."""
    set_scale = axis.axes.set_xscale if isinstance(axis, XAxis) else axis.axes.set_yscale
    set_scale("symlog", linthresh=linear_hz, linscale=LINEAR_SHARE)
    lowest, highest = round(math.log10(linear_hz)), math.floor(math.log10(reach_hz) + 1e-9)
    step = 1 if highest - lowest <= 4 else math.ceil((highest - lowest) / 4)
    # The lowest ones would stand on the 0 where there are many decades.
    nearest = lowest - LINEAR_SHARE + FREE_SHARE * (highest - lowest + LINEAR_SHARE)
    exponents = [e for e in range(highest, lowest - 1, -step) if e >= nearest]
    ticks = [-(10.0**e) for e in exponents] + [0.0] + [10.0**e for e in reversed(exponents)]
    axis.set_major_locator(FixedLocator(ticks))
    axis.set_major_formatter(FixedFormatter([hertz(tick) for tick in ticks]))
    between = [sign * 10.0**e for e in range(lowest, highest + 1) for sign in (-1, 1)]
    axis.set_minor_locator(FixedLocator(between))
    axis.set_minor_formatter(NullFormatter())


def signed_decimal(axis: Axis) -> None:
    """Linear, in hertz with prefix."""
    axis.set_major_formatter(FuncFormatter(lambda value, _: "0" if value == 0 else si(value, "Hz", digits=3)))
