"""Margins and step of loop gains near one: for differences by whatever a loop gain was computed from.

From a gain whose crossings, peak and settling are known, one Newton step leads to a neighbour's, exact to the square of
the distance. It costs a tenth of finding them anew, and always follows the same crossing, peak and departure from the
band, where a search of its own could come upon another.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from fitamp.closed_loop import StepResponse, closed_loop_step, step_error
from fitamp.margins import Margins, log_gain, margins
from fitamp.transfer import Transfer

__all__ = ["Figures", "Vicinity"]

DB_PER_NEPER = 20 / math.log(10)


@dataclass(frozen=True, slots=True, kw_only=True)
class Figures:
    """What `fitamp.margins` says of a loop gain and its step; None where there is no such thing."""

    crossover_hz: float | None
    phase_margin_deg: float | None
    gain_margin_db: float | None
    overshoot: float | None
    settling_s: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Vicinity:
    """The loop gains near `response`."""

    response: Transfer
    margins: Margins = field(init=False)
    step: StepResponse = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "margins", margins(self.response))
        object.__setattr__(self, "step", closed_loop_step(self.response))

    def figures(self, other: Transfer) -> Figures:
        """Figures of a loop gain near; what `response` has not, it has not either."""
        crossover_hz, phase_margin_deg = self._crossover(other)
        overshoot, settling_s = self._step(other)
        return Figures(
            crossover_hz=crossover_hz,
            phase_margin_deg=phase_margin_deg,
            gain_margin_db=self._gain_margin(other),
            overshoot=overshoot,
            settling_s=settling_s,
        )

    def _crossover(self, other: Transfer) -> tuple[float | None, float | None]:
        at_hz, margin_deg = self.margins.crossover_hz, self.margins.phase_margin_deg
        if at_hz is None or margin_deg is None:
            return None, None
        value, slope = log_gain(other, at_hz)
        if not slope.real:
            return None, None
        move = -value.real / slope.real
        phase = value.imag + slope.imag * move - log_gain(self.response, at_hz)[0].imag
        return at_hz * math.exp(move), margin_deg + math.degrees(phase)

    def _gain_margin(self, other: Transfer) -> float | None:
        at_hz = self.margins.phase_crossover_hz
        if at_hz is None:
            return None
        value, slope = log_gain(other, at_hz)
        if not slope.imag:
            return None
        return -DB_PER_NEPER * (value.real - slope.real * (value.imag + math.pi) / slope.imag)

    def _step(self, other: Transfer) -> tuple[float | None, float | None]:
        """At its peak the error does not move with time; where it settles it is the band, on its own side of 0."""
        peak_s, settling_s = self.step.peak_s, self.step.settling_s
        if not self.step.stable or settling_s is None:
            return None, None
        (height, _), (error, rate) = step_error(other, (peak_s or 0.0, settling_s))
        overshoot = 0.0 if peak_s is None else height
        if not settling_s or not rate:
            return overshoot, settling_s
        return overshoot, settling_s - (error - math.copysign(self.step.band, error)) / rate
