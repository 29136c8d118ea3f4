"""What was measured, as the command line names it: repeats to one sweep; a delay stated or from a through sweep."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from fitamp.conditioning.repeats import average_repeats
from fitamp.conditioning.through import ThroughDelay, through_delay
from fitamp.design import Design
from fitamp.errors import UsageError
from fitamp.fitting import DelayPrior, FarPolePrior
from fitamp.importers import read_sweep, read_sweeps
from fitamp.options import StatedDelay, parse_delay, parse_noise
from fitamp.sweep import Concern, Sign, Sweep
from fitamp.units import si_with_error

__all__ = ["Measured", "Reading", "measured"]

# So many standard deviations between stated and measured delay are a contradiction.
CLEARLY = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """How files are read: the options that `read_sweep` takes, and whether all sweeps are repeats of one.

    Raises
    ------
    UsageError
        When one sweep of a file is chosen and all are to be repeats.
    """

    columns: str | None = None
    trace: str | None = None
    sign: Sign | None = None
    are_repeats: bool = False
    sweep: int | None = None

    def __post_init__(self) -> None:
        if self.are_repeats and self.sweep is not None:
            raise UsageError("--sweep chooses one sweep of a file, --repeats takes all of them; give one of the two")

    def sweeps(self, files: Sequence[str]) -> tuple[Sweep, ...]:
        """The sweeps of all files, in their order; of a file with several, all are taken as repeats only."""
        if self.are_repeats:
            return tuple(
                sweep
                for file in files
                for sweep in read_sweeps(file, columns=self.columns, trace=self.trace, sign=self.sign)
            )
        return tuple(
            read_sweep(file, columns=self.columns, trace=self.trace, sign=self.sign, sweep=self.sweep) for file in files
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Measured:
    """The sweep to be fitted, and what is known of the path delay in it.

    delay : stated or measured; None where neither
    through : the through sweep by which it was measured
    """

    sweep: Sweep
    delay: StatedDelay | None
    through: ThroughDelay | None

    @property
    def priors(self) -> dict[str, Any]:
        """Arguments of `fit_sweep`: beside a known delay a third pole is free, or its lag would pass for delay."""
        if self.delay is None or self.delay.is_free:
            return {}
        return {
            "delay": DelayPrior(mean_s=self.delay.delay_s, sd_s=self.delay.sd_s),
            "far_pole": FarPolePrior(sd_s=math.inf),
        }

    def on_bench_of(self, design: Design) -> tuple[Sweep, Design]:
        """The sweep, and the design with this delay in place of what its file states of the bench's."""
        if self.delay is None:
            return self.sweep, design
        known = {"delay_s": self.delay.delay_s, "delay_spread_s": self.delay.sd_s}
        bench = replace(design.bench, **({"delay_s": None, "delay_spread_s": 0.0} if self.delay.is_free else known))
        sweep, stated_s = self.sweep, design.bench.delay_s
        if self.through is not None and stated_s is not None:
            spread_s = design.bench.delay_spread_s
            apart = abs(self.through.delay_s - stated_s) / max(math.hypot(spread_s, self.through.stderr_s), 1e-30)
            if apart > CLEARLY:
                sweep = sweep.with_decision(
                    "stated delay",
                    "not used",
                    f"{design.file} states {si_with_error(stated_s, spread_s, 's')}, {apart:.0f} standard deviations "
                    "from what the through sweep shows",
                    concern=Concern.CAUTION,
                )
        return sweep, replace(design, bench=bench)


def measured(
    files: Sequence[str],
    reading: Reading,
    *,
    noise: str | None = None,
    delay: str | None = None,
    through: str | None = None,
    keep_all: bool = False,
) -> Measured:
    """Read the files, average them where they are several, and find what is known of the delay.

    Parameters
    ----------
    files
        One, or several that are repeats of one sweep.
    noise, delay
        As `parse_noise` and `parse_delay` take them; the noise is that of one sweep.
    through
        File of a through sweep, read in the same way but for its sign.

    Raises
    ------
    UsageError
        When the delay is stated and measured both, or an option is malformed.
    SweepError
        When a file cannot be used.
    """
    if delay is not None and through is not None:
        raise UsageError("--delay states what --through measures; give one of them")
    levels = None if noise is None else parse_noise(noise)
    stated = None if delay is None else parse_delay(delay)
    if through is None:
        return Measured(
            sweep=average_repeats(reading.sweeps(files), noise=levels, keep_all=keep_all), delay=stated, through=None
        )
    found = through_delay(replace(reading, sign=Sign.UNKNOWN, are_repeats=False, sweep=None).sweeps([through])[0])
    sweep = average_repeats(reading.sweeps(files), noise=levels, keep_all=keep_all)
    return _with_measured_delay(sweep, found)


def _with_measured_delay(sweep: Sweep, through: ThroughDelay) -> Measured:
    """The delay as a prior; one below 0, which no loop has, is taken out of the sweep, and its error alone remains."""
    size, reason = (
        si_with_error(through.delay_s, through.stderr_s, "s"),
        f"measured with a through sweep {through.file}",
    )
    delay_s = through.delay_s
    if delay_s < 0:
        turn = np.exp(2j * np.pi * sweep.freq_hz * delay_s)
        left_out = tuple(
            point
            if point.gain is None
            else replace(point, gain=complex(point.gain * np.exp(2j * np.pi * point.f_hz * delay_s)))
            for point in sweep.left_out
        )
        sweep = replace(sweep, gain=sweep.gain * turn, left_out=left_out)
        delay_s, reason = 0.0, f"{reason}, and taken out of the sweep"
    sweep = sweep.with_decision("delay", size, reason, concern=Concern.RESULT)
    if not through.is_pure_delay:
        sweep = sweep.with_decision("through sweep", through.file, through.sentence, concern=Concern.CAUTION)
    return Measured(sweep=sweep, delay=StatedDelay(delay_s=delay_s, sd_s=through.stderr_s), through=through)
