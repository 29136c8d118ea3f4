"""Whether a file holds T or −T.

T is the return ratio, positive real at DC for negative feedback. Many set-ups read it with an inversion, 180° at
DC. The magnitude decides which: for a minimum-phase response the phase is 90° times the slope of ln |T| against
ln f where that slope is locally steady (H. W. Bode, *Network Analysis and Feedback Amplifier Design*, 1945, ch. XIV
on relations between attenuation and phase; from memory). Flat: 0°, integrator: −90°, two poles: −180°. A read-out
that is 180° away from this is inverted. Only the part with |T| above 1 is asked. Receiver noise may leave the low end
of the band without meaning; so the longest stretch over which magnitude and phase are steady is taken, and of it the
lower half in log f, because a right-half-plane zero or a delay has the least say there. A flat stretch that the
falling part above it contradicts, as crosstalk into the error receiver makes one, decides nothing.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.errors import SweepError
from fitamp.sweep import Decision, Sign, Sweep
from fitamp.units import si, to_db

__all__ = ["settle_sign"]

# The slope is fitted over this many decades to either side of a point: wide against point noise at ten points a
# decade, narrow against the two or three decades between the poles of a compensated amplifier.
_HALF_WINDOW_DECADES = 0.3
_MIN_WINDOW_POINTS = 3
# Within 60° of one answer and hence 120° or more from the other: decided. In between: ask.
_DECIDED_COSINE = 0.5
# Scatter of ln |T|, and of its phase in radians, about their local lines, beyond which receiver noise leaves nothing
# of the phase; the bend at a pole makes less than 0.1 of it.
_MAX_SCATTER = 0.35
_LEAST_ASKED = 3
_HANDFUL = 5
# This share of the points has to be steady.
_STEADY_SHARE = 0.25
# And this share of those asked has to lie on the side of their median.
_AGREED_SHARE = 0.9
# A stretch this long against the longest has to agree with it; a shorter one may be steady by chance.
_RIVAL_SHARE = 0.5
# |T| from which on a zero or a delay cannot yet turn the phase round, 20 dB.
_FAR_ABOVE = 10.0
# The magnitude falls: nearer to an integrator than to a flat part.
_FALLING_SLOPE = -0.7
_FIRST_FALLING_DECADES = 0.5
# A median needs no more points than this.
_MOST_ASKED = 200
# And a line through its surroundings no more than about this many.
_MOST_FITTED = 1000
_ASK = "give --sign as-read or --sign inverted"


def settle_sign(sweep: Sweep, wanted: Sign | None = None) -> Sweep:
    """Return the sweep with T in it and its sign settled.

    Parameters
    ----------
    sweep
        As read. One whose sign is settled already is turned only when `wanted` says otherwise.
    wanted
        `Sign.AS_READ` or `Sign.INVERTED` where the user knows, None to recognise it from the band,
        `Sign.UNKNOWN` to leave it open.

    Returns
    -------
    Sweep
        With `Sweep.sign` set and a decision saying what was seen; gains (also of points left out) are negated
        for an inverted read-out.

    Raises
    ------
    SweepError
        When the sign is to be recognised and the band does not show it.
    """
    if wanted is Sign.UNKNOWN or (sweep.sign is not Sign.UNKNOWN and wanted in (None, sweep.sign)):
        return sweep
    if wanted is None:
        seen, text = _recognise(sweep)
        if seen is Sign.UNKNOWN:
            raise _undecided(sweep, text)
        return _with_sign(sweep, seen, text)
    seen, text = _recognise(sweep) if sweep.sign is Sign.UNKNOWN else (Sign.UNKNOWN, "settled anew")
    remark = f"as given; the band by itself says {seen}: {text}" if seen not in (wanted, Sign.UNKNOWN) else "as given"
    return _with_sign(sweep, wanted, remark)


def _undecided(sweep: Sweep, text: str) -> SweepError:
    largest = float(np.abs(sweep.gain).max())
    if 0 < largest <= 1:
        trace = f" of {sweep.origin.trace}" if sweep.origin.trace else ""
        return SweepError(
            f"{sweep.origin.file}: the magnitude{trace} never exceeds 1 ({to_db(largest):.1f} dB at most), which loop "
            f"gain does below crossover; is it loop gain? if so, {_ASK}; if not, choose another trace or column"
        )
    return SweepError(f"{sweep.origin.file}: cannot tell whether the sweep holds T or -T: {text}; {_ASK}")


def _with_sign(sweep: Sweep, sign: Sign, reason: str) -> Sweep:
    turned = sign is Sign.INVERTED if sweep.sign is Sign.UNKNOWN else sign is not sweep.sign
    if turned:
        left_out = tuple(replace(p, gain=None if p.gain is None else -p.gain) for p in sweep.left_out)
        sweep = replace(sweep, gain=-sweep.gain, left_out=left_out)
    decision = Decision(topic="sign", choice=sign.value, reason=reason)
    return replace(sweep, sign=sign, decisions=(*sweep.decisions, decision))


@dataclass(frozen=True, slots=True, kw_only=True)
class _Band:
    """The points with |T| above 1 and what their surroundings say; all of shape (n,).

    log_f, log_size, phase : ln f, ln |T|, arg T in rad
    slope : of ln |T| against ln f
    scatter, phase_scatter : of ln |T| and of the phase in rad about their local lines
    width : of the surroundings, in ln f
    """

    log_f: FloatArray
    log_size: FloatArray
    phase: FloatArray
    slope: FloatArray
    scatter: FloatArray
    phase_scatter: FloatArray
    width: FloatArray

    @property
    def cosine(self) -> FloatArray:
        """1 where the phase is what the slope asks for, −1 where it is 180° away."""
        return np.asarray(np.cos(self.phase - np.pi / 2 * self.slope))


def _recognise(sweep: Sweep) -> tuple[Sign, str]:
    """The sign that the band shows, and what was seen."""
    size = np.abs(sweep.gain)
    if (size > 1).sum() < _LEAST_ASKED:
        few = "its magnitude exceeds 1 at fewer than three points; below, a zero or delay may look like an inversion"
        return Sign.UNKNOWN, few
    freq_hz, gain = sweep.freq_hz, sweep.gain
    if not size.all():
        freq_hz, gain, size = freq_hz[size > 0], gain[size > 0], size[size > 0]
    band = _band(freq_hz, gain, np.flatnonzero(size > 1))
    steady = band.scatter < _MAX_SCATTER
    least = max(_LEAST_ASKED, _STEADY_SHARE * len(steady))
    if steady.sum() < least:
        return Sign.UNKNOWN, "its magnitude scatters too much"
    stretches = _stretches(band, steady & (band.phase_scatter < _MAX_SCATTER))
    if sum(map(len, stretches)) < least:
        return Sign.UNKNOWN, "its phase scatters too much"
    lengths = [float(np.ptp(band.log_f[stretch])) for stretch in stretches]
    lower = [stretch[: _lower_half(band.log_f[stretch])] for stretch in stretches]
    asked = lower[int(np.argmax(lengths))]
    agreement = float(np.median(band.cosine[asked]))
    ends = [si(float(np.exp(band.log_f[index])), "Hz") for index in (asked[0], asked[-1])]
    apart_deg = float(np.degrees(np.arccos(np.clip(agreement, -1, 1))))
    seen = (
        f"from {ends[0]} to {ends[1]} the phase is {apart_deg:.0f}° away from what the slope of the magnitude asks for "
        "(median)"
    )
    if abs(agreement) < _DECIDED_COSINE:
        return Sign.UNKNOWN, seen
    rivals = [low for low, length in zip(lower, lengths, strict=True) if length > _RIVAL_SHARE * max(lengths)]
    if any(np.median(band.cosine[rival]) * agreement < 0 for rival in rivals):
        return Sign.UNKNOWN, "its steady stretches contradict each other"
    if np.mean(np.sign(band.cosine[asked]) == np.sign(agreement)) < _AGREED_SHARE:
        return Sign.UNKNOWN, "its phase scatters too much"
    if _falling_cosine(band, int(asked[0])) * agreement < 0:
        return Sign.UNKNOWN, f"{seen}, but where the magnitude begins to fall it is the other way round"
    return (Sign.AS_READ if agreement > 0 else Sign.INVERTED), seen


def _stretches(band: _Band, steady: NDArray[np.bool_]) -> list[NDArray[np.intp]]:
    """Runs of steady points that begin in the lower half of the band, or far enough above crossover."""
    runs = np.split(np.arange(len(steady)), np.flatnonzero(np.diff(steady)) + 1)
    middle = (band.log_f[0] + band.log_f[-1]) / 2
    return [
        run
        for run in runs
        if steady[run[0]]
        and len(run) >= _LEAST_ASKED
        and (band.log_f[run[0]] <= middle or band.log_size[run[0]] > np.log(_FAR_ABOVE))
    ]


def _falling_cosine(band: _Band, first: int) -> float:
    """Median agreement where the magnitude begins to fall, at or after the point `first`; 0 where it does not fall."""
    # Points far apart see a bend where there is no noise.
    allowed = _MAX_SCATTER * np.maximum(1, band.width / (2 * _HALF_WINDOW_DECADES * np.log(10)))
    falls = (band.slope < _FALLING_SLOPE) & (band.scatter < allowed) & (band.phase_scatter < _MAX_SCATTER)
    falling = np.flatnonzero(falls[first:]) + first
    if not len(falling):
        return 0.0
    near = band.log_f[falling] <= band.log_f[falling[0]] + _FIRST_FALLING_DECADES * np.log(10)
    return float(np.median(band.cosine[falling[near]]))


def _lower_half(log_f: FloatArray) -> int:
    """How many points lie in the lower half of their band, but a handful where there are as many."""
    return max(int((log_f <= (log_f[0] + log_f[-1]) / 2).sum()), _HANDFUL)


def _band(freq_hz: FloatArray, gain: ComplexArray, above: NDArray[np.intp]) -> _Band:
    """The points `above` 1, thinned out, each with the lines through its surroundings."""
    above = above[np.unique(np.linspace(0, len(above) - 1, _MOST_ASKED).astype(int))]
    reach = 10**_HALF_WINDOW_DECADES
    local = []
    for index in above.tolist():
        first, last = np.searchsorted(freq_hz, [freq_hz[index] / reach, freq_hz[index] * reach]).tolist()
        first = min(first, max(index - _MIN_WINDOW_POINTS // 2, 0))
        last = max(last, min(index + _MIN_WINDOW_POINTS // 2 + 1, len(freq_hz)))
        window = slice(first, last, max((last - first) // _MOST_FITTED, 1))
        x, t = np.log(freq_hz[window]), gain[window]
        slope, scatter = _line(x, np.log(np.abs(t)))
        local.append((slope, scatter, _line(x, np.unwrap(np.angle(t)))[1], float(np.ptp(x))))
    slopes, scatters, phase_scatters, widths = np.array(local).T
    return _Band(
        log_f=np.log(freq_hz[above]),
        log_size=np.log(np.abs(gain[above])),
        phase=np.angle(gain[above]),
        slope=slopes,
        scatter=scatters,
        phase_scatter=phase_scatters,
        width=widths,
    )


def _line(x: FloatArray, y: FloatArray) -> tuple[float, float]:
    """Slope of a straight line through points, and the scatter about it."""
    x, y = x - x.mean(), y - y.mean()
    slope = float(x @ y / (x @ x))
    return slope, float(np.sqrt(np.sum((y - slope * x) ** 2) / max(len(x) - 2, 1)))
