"""Double injection: loop gain from one record with a voltage and one with a current put in at the same cut.

A voltage in series reads Tv = T(1 + z) + z, a current across reads Ti = T(1 + 1/z) + 1/z, with z = Z2/Z1 the impedance
seen back into the driving side over that seen into the driven one. Neither is T unless z is 0 or infinite; together

    T = (Tv·Ti − 1)/(Tv + Ti + 2),    1 + T = (1 + Tv)(1 + Ti)/(2 + Tv + Ti),    z = (1 + Tv)/(1 + Ti)

hold for any z (R. D. Middlebrook, "Measurement of loop gain in feedback systems", Int. J. Electronics 38, 1975).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray, frozen_complex, frozen_float
from fitamp.errors import SweepError
from fitamp.loopgain.pairs import paired
from fitamp.loopgain.scatter import MIN_POINTS, combined_levels, relative_scatter, running_mean
from fitamp.sweep import Concern, NoiseLevels, Origin, Sign, Sweep
from fitamp.units import si, to_db

__all__ = ["DoubleInjection", "Injection", "InjectionAlone", "double_injection"]

# Neighbours over which the impedance ratio is averaged before a departure is held against the noise of one point.
_NEIGHBOURS = 9
# Where its relative standard deviation is larger, a point says next to nothing of the impedance ratio, and a mean of
# such quotients is biased.
_KNOWN = 0.3


class Injection(StrEnum):
    """What was put into the loop."""

    VOLTAGE = "voltage"
    CURRENT = "current"


@dataclass(frozen=True, slots=True, kw_only=True)
class InjectionAlone:
    """How far one record alone, taken as the loop gain, would have been off beyond its own noise.

    f_min_hz, f_max_hz : from where to where along the band that is so
    worst_hz : where it is worst with \\|T\\| at least 1, or anywhere if nowhere beyond noise T is so large
    magnitude_db, phase_deg : by how much too large there, and too far ahead
    """

    injection: Injection
    f_min_hz: float
    f_max_hz: float
    worst_hz: float
    magnitude_db: float
    phase_deg: float

    def __str__(self) -> str:
        size = f"{self.magnitude_db:+.2g} dB and {self.phase_deg:+.2g}°".replace("-", "−")
        return (
            f"{self.injection.value} injection alone would have been off by {size} at {si(self.worst_hz, 'Hz')}, "
            f"and by more than its noise from {si(self.f_min_hz, 'Hz')} to {si(self.f_max_hz, 'Hz')}"
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DoubleInjection:
    """Loop gain from two injections.

    sweep : the loop gain T; its noise is known where that of both records is
    stderr : complex standard deviation of T, shape (n,), from the scatter of both records along the band
    impedance_ratio : z = Z2/Z1 at the cut, shape (n,), complex
    ratio_stderr : its complex standard deviation, shape (n,)
    alone : what one injection alone would have got wrong; empty where neither is off by more than its noise
    """

    sweep: Sweep
    stderr: FloatArray
    impedance_ratio: ComplexArray
    ratio_stderr: FloatArray
    alone: tuple[InjectionAlone, ...]

    @property
    def impedance_range(self) -> tuple[float, float] | None:
        """Smallest and largest \\|Z2/Z1\\| along the band, averaged over neighbours; None where noise hides it."""
        known = self.ratio_stderr <= _KNOWN * np.abs(self.impedance_ratio)
        if not known.any():
            return None
        sizes = np.abs(_averaged(self.impedance_ratio, known))[known]
        return float(sizes.min()), float(sizes.max())


def double_injection(voltage: Sweep, current: Sweep) -> DoubleInjection:
    """Loop gain from a record with voltage and one with current injection at the same cut.

    Parameters
    ----------
    voltage, current
        Tv and Ti as each injection reads them: the ratio of returned to forward voltage, and of returned to forward
        current, both positive real at DC for negative feedback. On the same frequencies, at least 8 of them; signs
        settled.

    Returns
    -------
    DoubleInjection

    Raises
    ------
    SweepError
        When the frequencies differ, there are too few, a sign is open, or the records contradict each other
        (Tv + Ti = −2).
    """
    for sweep in (voltage, current):
        if sweep.sign is Sign.UNKNOWN:
            raise SweepError(f"{sweep.origin.file}: its sign is open; settle it before two injections are put together")
    tv, ti, left_out = paired(voltage, current)
    if len(tv) < MIN_POINTS:
        raise SweepError(f"{tv.origin.file}: {len(tv)} points, double injection needs {MIN_POINTS} or more")
    total = tv.gain + ti.gain + 2
    broken = (total == 0) | (tv.gain == -1) | (ti.gain == -1)
    if broken.any():
        index = int(np.argmax(broken))
        raise SweepError(
            f"{tv.origin.file}, point {index + 1} ({si(float(tv.freq_hz[index]), 'Hz')}): with {ti.origin.file} it "
            "gives no loop gain; check the signs of both records"
        )
    gain = (tv.gain * ti.gain - 1) / total
    ratio = (1 + tv.gain) / (1 + ti.gain)
    scatter = relative_scatter(tv.gain), relative_scatter(ti.gain)
    sweep = Sweep(
        freq_hz=tv.freq_hz,
        gain=gain,
        noise=_noise(tv, ti),
        origin=_origin(tv, ti),
        sign=Sign.AS_READ,
        decisions=tuple(dict.fromkeys((*tv.decisions, *ti.decisions))),
        left_out=left_out,
    )
    sweep = sweep.with_decision(
        "loop gain",
        "T = (Tv·Ti − 1)/(Tv + Ti + 2)",
        f"double injection: voltage {tv.origin.file}, current {ti.origin.file}",
        concern=Concern.RESULT,
    )
    known = np.hypot(*scatter) <= _KNOWN
    alone = [
        _alone(Injection.VOLTAGE, sweep, scatter[0], _averaged(ratio, known), known),
        _alone(Injection.CURRENT, sweep, scatter[1], _averaged(1 / ratio, known), known),
    ]
    result = DoubleInjection(
        sweep=sweep,
        stderr=frozen_float(_stderr(tv, ti, scatter, gain)),
        impedance_ratio=frozen_complex(ratio),
        ratio_stderr=frozen_float(np.abs(ratio) * np.hypot(*scatter)),
        alone=tuple(found for found in alone if found is not None),
    )
    return _with_findings(result)


def _stderr(tv: Sweep, ti: Sweep, scatter: tuple[FloatArray, FloatArray], gain: ComplexArray) -> FloatArray:
    """δT = (1 + T)²·δe, with δe = δe_v + δe_i of independent records."""
    errors = [own / np.abs(1 + record.gain) for own, record in zip(scatter, (tv, ti), strict=True)]
    return np.asarray(np.hypot(*errors) * np.abs(1 + gain) ** 2, dtype=float)


def _noise(tv: Sweep, ti: Sweep) -> NoiseLevels | None:
    if tv.noise is None or ti.noise is None:
        return None
    return combined_levels(tv.gain, ti.gain, (tv.noise, ti.noise))


def _origin(tv: Sweep, ti: Sweep) -> Origin:
    notes = [
        f"{kind.value} injection: {record.origin.file}"
        + (f", {record.origin.trace}" if record.origin.trace else "")
        + (f", sha256 {record.origin.sha256}" if record.origin.sha256 else "")
        for kind, record in ((Injection.VOLTAGE, tv), (Injection.CURRENT, ti))
    ]
    return Origin(
        file=f"{tv.origin.file} and {ti.origin.file}",
        form="double injection",
        notes=(*notes, *dict.fromkeys((*tv.origin.notes, *ti.origin.notes))),
    )


def _averaged(ratio: ComplexArray, known: NDArray[np.bool_]) -> ComplexArray:
    """Mean over neighbours where it is known, shape (n,); 0 where none is."""
    share = running_mean(known.astype(float), _NEIGHBOURS)
    mean = running_mean(np.where(known, ratio, 0), _NEIGHBOURS)
    return np.asarray(np.divide(mean, share, out=np.zeros_like(mean), where=share > 0), dtype=complex)


def _alone(
    kind: Injection, sweep: Sweep, scatter: FloatArray, ratio: ComplexArray, known: NDArray[np.bool_]
) -> InjectionAlone | None:
    """Where ln((1 + Tx)/(1 + T)) = ln(1 + ratio) exceeds the noise of a point; Tx = T(1 + ratio) + ratio."""
    beyond = known & (np.abs(ratio) > scatter * np.abs(1 + ratio)) & (sweep.gain != 0) & (ratio != -1)
    if not beyond.any():
        return None
    counted = beyond & (np.abs(sweep.gain) >= 1)
    counted = counted if counted.any() else beyond
    quotient = 1 + ratio[counted] + ratio[counted] / sweep.gain[counted]
    worst = int(np.argmax(np.abs(quotient - 1)))
    freq_hz = sweep.freq_hz[beyond]
    return InjectionAlone(
        injection=kind,
        f_min_hz=float(freq_hz[0]),
        f_max_hz=float(freq_hz[-1]),
        worst_hz=float(sweep.freq_hz[counted][worst]),
        magnitude_db=to_db(max(float(np.abs(quotient[worst])), 1e-15)),
        phase_deg=float(np.degrees(np.angle(quotient[worst]))),
    )


def _with_findings(result: DoubleInjection) -> DoubleInjection:
    sweep = result.sweep
    if result.impedance_range is None:
        reason = "one of the records is nothing but noise, and the loop gain rests on the other"
        sweep = sweep.with_decision("impedance ratio", "not to be seen", reason, concern=Concern.CAUTION)
        return replace(result, sweep=sweep)
    low, high = result.impedance_range
    sweep = sweep.with_decision(
        "impedance ratio",
        f"|Z2/Z1| from {low:.3g} to {high:.3g} along the band",
        "(1 + Tv)/(1 + Ti) at the cut",
        concern=Concern.RESULT,
    )
    for found in result.alone:
        reason = "the impedance ratio at the cut is neither 0 nor infinite; both records together are right"
        sweep = sweep.with_decision("one injection", str(found), reason, concern=Concern.CAUTION)
    if not result.alone:
        reason = "neither departs by more than its noise"
        sweep = sweep.with_decision("one injection", "either alone would have done", reason, concern=Concern.RESULT)
    return replace(result, sweep=sweep)
