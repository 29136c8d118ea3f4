"""Whether a file holds T or −T.

T is the return ratio, positive real at DC for negative feedback. Many set-ups read it with an inversion, 180° at
DC. The magnitude decides which: for a minimum-phase response the phase is 90° times the slope of ln |T| against
ln f where that slope is locally steady (H. W. Bode, *Network Analysis and Feedback Amplifier Design*, 1945, ch. XIV
on relations between attenuation and phase; from memory). Flat: 0°, integrator: −90°, two poles: −180°. A read-out
that is 180° away from this is inverted. Only the part with |T| above 1 is asked, and of that the lower half in
log f, because a right-half-plane zero, a delay or receiver noise has the least say there.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fitamp.arrays import FloatArray
from fitamp.errors import SweepError
from fitamp.sweep import Sign, Sweep
from fitamp.units import si

__all__ = ["settle_sign"]

# The slope is fitted over this many decades to either side of a point: wide against point noise at ten points a
# decade, narrow against the two or three decades between the poles of a compensated amplifier.
_HALF_WINDOW_DECADES = 0.3
_MIN_WINDOW_POINTS = 3
# Within 60° of one answer and hence 120° or more from the other: decided. In between: ask.
_DECIDED_COSINE = 0.5
# Scatter of ln |T| about its local line, beyond which receiver noise leaves nothing of the phase; the bend of the
# magnitude at a pole makes less than 0.1 of it.
_MAX_SCATTER = 0.35
_LEAST_ASKED = 3
_HANDFUL = 5
# This share of the points has to be steady.
_STEADY_SHARE = 0.25
# And this share of those asked has to lie on the side of their median.
_AGREED_SHARE = 0.9
# A median needs no more points than this.
_MOST_ASKED = 200
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
            raise SweepError(f"{sweep.origin.file}: cannot tell whether the sweep holds T or -T: {text}; {_ASK}")
        return _with_sign(sweep, seen, text)
    seen, text = _recognise(sweep) if sweep.sign is Sign.UNKNOWN else (Sign.UNKNOWN, "settled anew")
    remark = f"as given; the band by itself says {seen}: {text}" if seen not in (wanted, Sign.UNKNOWN) else "as given"
    return _with_sign(sweep, wanted, remark)


def _with_sign(sweep: Sweep, sign: Sign, reason: str) -> Sweep:
    turned = sign is Sign.INVERTED if sweep.sign is Sign.UNKNOWN else sign is not sweep.sign
    if turned:
        left_out = tuple(replace(point, gain=-point.gain) for point in sweep.left_out)
        sweep = replace(sweep, gain=-sweep.gain, left_out=left_out)
    return replace(sweep, sign=sign).with_decision("sign", sign.value, reason)


def _recognise(sweep: Sweep) -> tuple[Sign, str]:
    """The sign that the band shows, and what was seen."""
    size = np.abs(sweep.gain)
    usable = size > 0
    log_f, log_size, phase = np.log(sweep.freq_hz[usable]), np.log(size[usable]), np.angle(sweep.gain[usable])
    above = np.flatnonzero(log_size > 0)
    if len(above) < _LEAST_ASKED:
        few = "its magnitude exceeds 1 at fewer than three points; below, a zero or delay may look like an inversion"
        return Sign.UNKNOWN, few
    above = above[np.unique(np.linspace(0, len(above) - 1, _MOST_ASKED).astype(int))]
    slope, scatter = _local_line(log_f, log_size, above)
    steady = scatter < _MAX_SCATTER
    if steady.sum() < max(_LEAST_ASKED, _STEADY_SHARE * len(above)):
        return Sign.UNKNOWN, "its magnitude scatters too much"
    low = _lower_half(log_f[above[steady]])
    asked, slope = above[steady][:low], slope[steady][:low]
    cosine = np.cos(phase[asked] - np.pi / 2 * slope)
    agreement = float(np.median(cosine))
    apart_deg = float(np.degrees(np.arccos(np.clip(agreement, -1, 1))))
    band = f"from {si(float(np.exp(log_f[asked[0]])), 'Hz')} to {si(float(np.exp(log_f[asked[-1]])), 'Hz')}"
    seen = f"{band} the phase is {apart_deg:.0f}° away from what the slope of the magnitude asks for (median)"
    if abs(agreement) < _DECIDED_COSINE:
        return Sign.UNKNOWN, seen
    if np.mean(np.sign(cosine) == np.sign(agreement)) < _AGREED_SHARE:
        return Sign.UNKNOWN, "its phase scatters too much"
    return (Sign.AS_READ if agreement > 0 else Sign.INVERTED), seen


def _lower_half(log_f: FloatArray) -> int:
    """How many points lie in the lower half of their band, but a handful where there are as many."""
    return max(int((log_f <= (log_f[0] + log_f[-1]) / 2).sum()), _HANDFUL)


def _local_line(log_f: FloatArray, log_size: FloatArray, at: NDArray[np.intp]) -> tuple[FloatArray, FloatArray]:
    """Slope of ln |T| against ln f around the points `at`, and the scatter about that line (both dimensionless)."""
    half = _HALF_WINDOW_DECADES * np.log(10)
    slopes, scatters = [], []
    for index in at.tolist():
        first, last = np.searchsorted(log_f, [log_f[index] - half, log_f[index] + half]).tolist()
        first = min(first, max(index - _MIN_WINDOW_POINTS // 2, 0))
        last = max(last, min(index + _MIN_WINDOW_POINTS // 2 + 1, len(log_f)))
        x = log_f[first:last] - log_f[first:last].mean()
        y = log_size[first:last] - log_size[first:last].mean()
        slopes.append(float(x @ y / (x @ x)))
        scatters.append(float(np.sqrt(np.sum((y - slopes[-1] * x) ** 2) / max(len(x) - 2, 1))))
    return np.array(slopes), np.array(scatters)
