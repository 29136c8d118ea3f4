"""Starting values: vector fitting of the closed-loop pair, with straight-line estimates beside it.

T/(1+T) and 1/(1+T) share their poles, are bounded by about 1 and carry receiver noise as it is, so scikit-rf's
unweighted vector fitting is dependable on them. The zeros of the first are the zeros of T, the zeros of the second the
poles of T. (Vector fitting: B. Gustavsen and A. Semlyen, IEEE Trans. Power Delivery 14, 1999.)
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass, replace

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.sweep import Sweep

__all__ = ["Start", "excess_delay", "more_starts", "starts", "vector_fit_roots"]


# So many points are enough for a start; with more, the linear algebra would wake its threads, which take longer.
ENOUGH = 300
# A common factor of the pair changes no root; with this one scikit-rf's guard against the trivial solution is light.
PAIR_SIZE = 10.0
# Vector fitting moves its poles until they stand, relatively, or so often: a pole too many wanders about in the noise.
POLES_SETTLED, RELOCATIONS, RELOCATIONS_FROM_NEAR, MOST_RELOCATIONS = 1e-3, 10, 5, 100


@dataclass(frozen=True, slots=True, kw_only=True)
class Start:
    """A guess of the loop: g = T(0)/a1, q = 1/a1 (1/s), b = a2/a1, zero time, far-pole time a3/a2, delay (s)."""

    g: float
    q: float
    b: float
    zero_time_s: float
    far_pole_s: float = 0.0
    delay_s: float = 0.0


def starts(sweep: Sweep, delay_s: float = 0.0) -> tuple[Start, ...]:
    """Candidate starting values with a path delay of `delay_s` taken off, the likelier first."""
    sweep = _thinned(sweep)
    if delay_s:
        turned_back = sweep.gain * np.exp(2j * np.pi * sweep.freq_hz * delay_s)
        sweep = Sweep(freq_hz=sweep.freq_hz, gain=turned_back, origin=sweep.origin)
    two = _fit_pair(sweep, 2)
    three = None if two is None else _fit_pair(sweep, 3, near=two[0], relocations=RELOCATIONS_FROM_NEAR)
    found = (*_from_pair_fit(two), *_from_pair_fit(three), _from_straight_lines(sweep))
    return tuple(replace(guess, delay_s=delay_s) for guess in found)


def excess_delay(sweep: Sweep) -> float:
    """Delay that the phase shows beyond what the magnitude asks for, in seconds, 0 or more; a rough guess.

    A minimum-phase response turns by 90° for each decade per decade of its slope (H. W. Bode, Network Analysis and
    Feedback Amplifier Design, 1945). What is left falls in proportion to frequency for a delay.
    """
    sweep = _thinned(sweep)
    log_f = np.log(sweep.freq_hz)
    slope = np.gradient(np.log(np.maximum(np.abs(sweep.gain), 1e-300)), log_f)
    width = max(len(slope) // 12, 1)
    smooth = np.convolve(np.pad(slope, width, mode="edge"), np.full(2 * width + 1, 1 / (2 * width + 1)), mode="valid")
    excess = np.unwrap(np.angle(sweep.gain)) - np.pi / 2 * smooth
    delay_s = -float(excess @ sweep.freq_hz) / (2 * np.pi * float(sweep.freq_hz @ sweep.freq_hz))
    return max(delay_s, 0.0)


def _thinned(sweep: Sweep) -> Sweep:
    """The sweep, or of a dense one the points nearest to `ENOUGH` frequencies spaced by their logarithm."""
    if len(sweep) <= ENOUGH:
        return sweep
    wanted_hz = np.geomspace(sweep.f_min_hz, sweep.f_max_hz, ENOUGH)
    chosen = np.unique(np.searchsorted(sweep.freq_hz, wanted_hz).clip(max=len(sweep) - 1))
    return Sweep(freq_hz=sweep.freq_hz[chosen], gain=sweep.gain[chosen], origin=sweep.origin)


def _from_straight_lines(sweep: Sweep) -> Start:
    """Integrator slope and the ends of the band; needs nothing to be visible but a falling stretch."""
    omega = 2 * np.pi * sweep.freq_hz
    magnitude = np.abs(sweep.gain)
    near_one = int(np.argmin(np.abs(np.log(np.maximum(magnitude, 1e-300)))))
    g = omega[near_one] * max(magnitude[near_one], 1e-12)
    q = g / max(float(magnitude.max()), 1e-12)
    return Start(g=float(g), q=float(q), b=float(0.3 / g), zero_time_s=0.0)


def more_starts(sweep: Sweep) -> tuple[Start, ...]:
    """Starts by straight lines, pole 2 above and below crossover, the zero on either side: where vector fitting fails.

    It mirrors unstable poles, and so misses the roots of a loop that would not be stable when closed.
    """
    line = _from_straight_lines(sweep)
    return tuple(
        replace(line, b=share / line.g, zero_time_s=part * share / line.g)
        for share in (0.1, 0.4, 1.5, 6.0)
        for part in (-0.6, 0.6)
    )


def vector_fit_roots(sweep: Sweep, real: int, pairs: int) -> tuple[ComplexArray, ComplexArray] | None:
    """Poles and zeros of the loop gain (rad/s) from a pair fit with so many real poles and complex pole pairs.

    None where the fit failed. They are guesses: unweighted, some fitted to noise, unstable closed-loop poles mirrored.
    """
    model = _fit_pair(sweep, real, pairs, relocations=MOST_RELOCATIONS)
    if model is None:
        return None
    pole_matrix, residues, constant = model
    zeros, poles = (_zeros(pole_matrix, residues[i], constant[i]) for i in range(2))
    return poles, zeros


def _from_pair_fit(pair_fit: PairFit | None) -> tuple[Start, ...]:
    """Guesses from a pair fit: its two lowest poles, and its three lowest where there are three."""
    if pair_fit is None:
        return ()
    pole_matrix, residues, constant = pair_fit
    loop_zeros, loop_poles = (_zeros(pole_matrix, residues[i], constant[i]) for i in range(2))
    loop_poles = loop_poles[np.argsort(np.abs(loop_poles))]
    dc = _dc_gain(pole_matrix, residues, constant)
    if len(loop_poles) < 2 or not (np.isfinite(dc) and dc > 0):
        return ()
    zero_time_s = 0.0
    if len(loop_zeros):
        nearest = loop_zeros[np.argmin(np.abs(loop_zeros))]
        zero_time_s = float(-(1 / nearest).real)
    guesses = [_guess(dc, loop_poles[:count], zero_time_s) for count in (2, 3) if count <= len(loop_poles)]
    return tuple(guess for guess in guesses if guess is not None)


def _guess(dc_gain: float, poles: ComplexArray, zero_time_s: float) -> Start | None:
    """Denominator 1 + a1 s + a2 s² (+ a3 s³); signs that the model cannot hold are mirrored: it is only a start."""
    coefficients = np.abs(np.poly(1 / poles).real[1:])
    if not (np.isfinite(coefficients).all() and (coefficients > 0).all()):
        return None
    a1, a2 = coefficients[:2]
    far_pole_s = float(coefficients[2] / a2) if len(coefficients) > 2 else 0.0
    return Start(
        g=float(dc_gain / a1), q=float(1 / a1), b=float(a2 / a1), zero_time_s=zero_time_s, far_pole_s=far_pole_s
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class _Pair:
    """What vector fitting asks of a network; a real one takes as long to build as to fit.

    s : shape (n, 2, 2)
    """

    f: FloatArray
    s: ComplexArray
    nports: int = 2

    def is_passive(self) -> bool:
        """A start need not be passive, and is not tested for it."""
        return False


PairFit = tuple[ComplexArray, ComplexArray, FloatArray]  # poles (p,), residues (2, p), constants (2,)


def _fit_pair(
    sweep: Sweep,
    real: int,
    pairs: int = 0,
    *,
    near: ComplexArray | None = None,
    relocations: int = RELOCATIONS,
) -> PairFit | None:
    """Pair fit with so many real poles and complex pairs; or from the poles `near`, and one at the top of the band."""
    from skrf.vectorFitting import VectorFitting

    through = 1 + sweep.gain
    pair = np.zeros((len(sweep), 2, 2), dtype=complex)
    pair[:, 0, 0] = pair[:, 1, 1] = PAIR_SIZE * sweep.gain / through
    pair[:, 0, 1] = pair[:, 1, 0] = PAIR_SIZE / through
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        # scikit-rf warns where the fit is poor or not passive; a start may be either, and the end is judged later.
        warnings.simplefilter("ignore")
        fit = VectorFitting(_Pair(f=sweep.freq_hz, s=pair))
        fit.max_tol, fit.max_iterations = POLES_SETTLED, relocations
        if near is not None:
            fit.poles = np.append(near[near.imag >= 0], -2 * np.pi * sweep.f_max_hz)
        try:
            fit.vector_fit(
                n_poles_real=real,
                n_poles_cmplx=pairs,
                init_pole_spacing="log" if near is None else "custom",
                fit_constant=True,
                fit_proportional=False,
                enforce_dc=False,
            )
        except (np.linalg.LinAlgError, ValueError, RuntimeError, ZeroDivisionError, IndexError):
            return None
    roots = np.asarray(fit.poles, dtype=complex)
    residues = np.asarray(fit.residues, dtype=complex)[:2]
    constant = np.asarray(fit.constant_coeff, dtype=float)[:2]
    if not (np.isfinite(roots).all() and np.isfinite(residues).all() and np.isfinite(constant).all()):
        return None
    return *_with_conjugates(roots, residues), constant


def _with_conjugates(poles: ComplexArray, residues: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    """scikit-rf stores a complex pair once; here both halves stand."""
    paired = poles.imag != 0
    return (
        np.concatenate([poles, np.conj(poles[paired])]),
        np.concatenate([residues, np.conj(residues[:, paired])], axis=1),
    )


def _zeros(poles: ComplexArray, residues: ComplexArray, constant: float) -> ComplexArray:
    """Finite zeros of constant + Σ residue/(s − pole), by the generalised eigenvalues of its state space."""
    from scipy.linalg import eigvals

    order = len(poles)
    # Time scaled by the fastest pole, so that the eigenvalues are of order 1.
    scale = float(np.abs(poles).max())
    system = np.zeros((order + 1, order + 1), dtype=complex)
    system[:order, :order] = np.diag(poles / scale)
    system[:order, order] = 1.0
    system[order, :order] = residues / scale
    system[order, order] = constant
    roots = eigvals(system, np.diag([1.0] * order + [0.0]).astype(complex))
    with np.errstate(all="ignore"):
        finite = np.isfinite(roots) & (np.abs(roots) < 1e6) & (np.abs(roots) > 0)
    return np.asarray(roots[finite] * scale)


def _dc_gain(poles: ComplexArray, residues: ComplexArray, constant: FloatArray) -> float:
    closed, error = (float((constant[i] - (residues[i] / poles).sum()).real) for i in range(2))
    return abs(closed / error) if error else float("inf")
