"""Sweeps that could be taken: what is added for each, its band, its points and its averages."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from itertools import product

import numpy as np

from fitamp.arrays import FloatArray
from fitamp.design import Design
from fitamp.elements import Condition
from fitamp.errors import UsageError
from fitamp.sweep import NoiseLevels
from fitamp.units import si, si_exact

__all__ = ["DEFAULT_NOISE", "PlannedSweep", "affordable_sweeps", "averaged", "usual_band_hz", "usual_loads_f"]

# A usual bench: receivers 94 dB below the drive, gain errors of 0.1 % (common practice).
DEFAULT_NOISE = NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3, source="assumed")
LEAST_POINTS, MOST_POINTS = 6, 100_000
# So many sweeps are more than anybody chooses from, and a slip of the list.
MOST_SWEEPS = 200
# Where no band is stated: from a decade below pole 1 to a few times pole 2.
BELOW_POLE1, ABOVE_POLE2 = 0.1, 4.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PlannedSweep:
    """One sweep that could be taken, with frequencies at equal steps of their logarithm.

    Parameters
    ----------
    condition
        What is added for it.
    f_min_hz, f_max_hz, points
        Its band, ends included.
    averages
        How many sweeps of it are averaged: all noise levels fall by the root of their number.

    Raises
    ------
    UsageError
        When a number is out of range.
    """

    condition: Condition = field(default_factory=Condition)
    f_min_hz: float
    f_max_hz: float
    points: int = 281
    averages: int = 1

    def __post_init__(self) -> None:
        if not (math.isfinite(self.f_max_hz) and 0 < self.f_min_hz < self.f_max_hz):
            raise UsageError(
                f"a band must rise from above 0 Hz, but is {si(self.f_min_hz, 'Hz')} to {si(self.f_max_hz, 'Hz')}"
            )
        if not LEAST_POINTS <= self.points <= MOST_POINTS:
            raise UsageError(f"a sweep has {LEAST_POINTS} to {MOST_POINTS} points, but {self.points} are asked for")
        if self.averages < 1:
            raise UsageError(f"a sweep is averaged once or more, but {self.averages} is asked for")

    @property
    def freq_hz(self) -> FloatArray:
        """Frequencies in Hz, shape (points,)."""
        return np.geomspace(self.f_min_hz, self.f_max_hz, self.points)

    @property
    def added(self) -> str:
        """What is added, in words: "nothing added", "+5 pF", "+5 pF with −400 Ω"."""
        load_f, rz_ohm = self.condition.load_added_f, self.condition.rz_added_ohm
        parts = [_signed(load_f, "F")] if load_f else []
        parts += [_signed(rz_ohm, "Ω")] if rz_ohm else []
        return " with ".join(parts) or "nothing added"

    @property
    def band(self) -> str:
        """The band in words: "1 kHz to 200 MHz"."""
        return f"{_short(self.f_min_hz, 'Hz')} to {_short(self.f_max_hz, 'Hz')}"


def affordable_sweeps(
    design: Design,
    *,
    loads_f: Sequence[float] | None = None,
    resistances_ohm: Sequence[float] = (0.0,),
    bands_hz: Sequence[tuple[float, float]] | None = None,
    points: int = 281,
    averages: int = 1,
) -> tuple[PlannedSweep, ...]:
    """Every added load with every added resistance in every band.

    Parameters
    ----------
    loads_f, resistances_ohm
        Added capacitances in F and added series resistances in Ω, 0 for none. Loads where None: `usual_loads_f`.
    bands_hz
        (lowest, highest) frequency in Hz; where None `usual_band_hz`.

    Raises
    ------
    UsageError
        When a number is out of range, or there are too many sweeps to choose from.
    """
    loads = usual_loads_f(design) if loads_f is None else tuple(loads_f)
    bands = (usual_band_hz(design),) if bands_hz is None else tuple(bands_hz)
    together = len(loads) * len(resistances_ohm) * len(bands)
    if not 1 <= together <= MOST_SWEEPS:
        raise UsageError(
            f"there are {together} sweeps to choose from, every load with every resistance in every band; expected 1 "
            f"to {MOST_SWEEPS}"
        )
    sweeps = (
        PlannedSweep(
            condition=Condition(load_added_f=load_f, rz_added_ohm=rz_ohm),
            f_min_hz=f_min_hz,
            f_max_hz=f_max_hz,
            points=points,
            averages=averages,
        )
        for (f_min_hz, f_max_hz), rz_ohm, load_f in product(bands, resistances_ohm, loads)
    )
    return tuple(dict.fromkeys(sweeps))


def usual_band_hz(design: Design) -> tuple[float, float]:
    """A band that shows both poles: from a tenth of pole 1 to four times pole 2 as designed, rounded to 1, 2 or 5."""
    poles_hz = sorted(abs(pole) for pole in design.on_bench().poles_hz)
    return _round_number(BELOW_POLE1 * poles_hz[0]), _round_number(ABOVE_POLE2 * poles_hz[1])


def usual_loads_f(design: Design) -> tuple[float, ...]:
    """Loads that move pole 2 plainly: none, and about once, twice and four times what is at the output anyway."""
    if design.elements is None:
        return (0.0,)
    own_f = design.elements.CL + design.bench.load_f
    return tuple(dict.fromkeys((0.0, *(_round_number(share * own_f) for share in (1, 2, 4)))))


def averaged(noise: NoiseLevels, averages: int) -> NoiseLevels:
    """Noise levels of the average of so many sweeps."""
    share = averages**-0.5
    return replace(
        noise,
        error_channel=noise.error_channel * share,
        return_channel=noise.return_channel * share,
        relative=noise.relative * share,
        ratio=noise.ratio * share,
    )


def _round_number(value: float) -> float:
    """The nearest of 1, 2, 5, 10 … on a logarithmic scale."""
    decade = math.floor(math.log10(value))
    # Read from digits, so that 5e-12 is the number that "5 pF" is.
    choices = [float(f"{digit}e{decade}") for digit in (1, 2, 5, 10)]
    return min(choices, key=lambda choice: abs(math.log(choice / value)))


def _signed(value: float, unit: str) -> str:
    return f"{'+' if value > 0 else '−'}{_short(abs(value), unit)}"


def _short(value: float, unit: str) -> str:
    """Six digits, without zeros at their end."""
    return si_exact(float(f"{value:.6g}"), unit)
