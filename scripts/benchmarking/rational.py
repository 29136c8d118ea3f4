"""Gain, poles and zero out of general rational fits of the loop gain: scikit-rf's vector fitting and scipy's AAA."""

from __future__ import annotations

import warnings
from collections.abc import Sequence

import numpy as np

__all__ = ["WrongRootsError", "aaa_roots", "named_roots", "vector_fit_roots"]


class WrongRootsError(Exception):
    """The fit has not the roots that a two-stage amplifier has."""


def vector_fit_roots(freq_hz: np.ndarray, gain: np.ndarray, *, real_poles: int, pairs: int) -> dict[str, float]:
    """Vector fitting without constant: as many zeros as a two-pole, one-zero loop gain has, one fewer than poles."""
    import skrf
    from skrf.vectorFitting import VectorFitting

    network = skrf.Network(f=freq_hz, f_unit="Hz", s=gain[:, np.newaxis, np.newaxis])
    fit = VectorFitting(network)
    fit.vector_fit(
        n_poles_real=real_poles,
        n_poles_cmplx=pairs,
        init_pole_spacing="log",
        fit_constant=False,
        fit_proportional=False,
        enforce_dc=False,
    )
    # Of a conjugate pair only one is stored.
    stored, residues = fit.poles / (2 * np.pi), fit.residues[0] / (2 * np.pi)
    pairs_too = stored.imag != 0
    poles = np.concatenate([stored, stored[pairs_too].conj()])
    residues = np.concatenate([residues, residues[pairs_too].conj()])
    # Numerator of the sum of partial fractions, in units of the top of the band to keep it within range.
    top_hz = freq_hz[-1]
    numerator = np.zeros(len(poles), dtype=complex)
    for index, residue in enumerate(residues):
        numerator += residue * np.poly(np.delete(poles, index) / top_hz)
    zeros = np.roots(numerator.real) * top_hz
    return named_roots(float((-residues / poles).sum().real), poles, zeros, real_poles=real_poles)


def aaa_roots(freq_hz: np.ndarray, gain: np.ndarray, *, real_poles: int, pairs: int) -> dict[str, float]:
    """AAA of the least order that holds the poles, on the sweep and its mirror image at negative frequencies."""
    from scipy.interpolate import AAA

    jf = 1j * freq_hz
    order = real_poles + 2 * pairs
    with warnings.catch_warnings():
        # It says that it has not converged: to stop at this order is meant.
        warnings.simplefilter("ignore", RuntimeWarning)
        fit = AAA(np.concatenate([jf, -jf]), np.concatenate([gain, gain.conj()]), max_terms=order + 1, clean_up=False)
    return named_roots(float(fit(0.0).real), fit.poles(), fit.roots(), real_poles=real_poles)


def named_roots(
    dc_gain: float, poles_hz: Sequence[complex], zeros_hz: Sequence[complex], *, real_poles: int
) -> dict[str, float]:
    """Pole 1, pole 2 and the zero time among the roots (s-plane roots over 2π, in Hz).

    Damped by more than 1/√2 counts as real, so that a noisy real root does and a resonance does not. The zero is the
    nearest of those; without one it is at infinity.

    Raises
    ------
    WrongRootsError
        When there are not `real_poles` such poles in the left half plane and none in the right.
    """
    poles = sorted((pole for pole in poles_hz if abs(pole.imag) <= abs(pole.real)), key=abs)
    zeros = sorted((zero for zero in zeros_hz if abs(zero.imag) <= abs(zero.real)), key=abs)
    if len(poles) != real_poles or any(pole.real >= 0 for pole in poles):
        raise WrongRootsError(f"{len(poles)} real poles, {real_poles} wanted in the left half plane: {poles}")
    return {
        "dc_gain": dc_gain,
        "pole1_hz": float(abs(poles[0])),
        "pole2_hz": float(abs(poles[1])),
        "zero_time_s": float(-(1 / zeros[0]).real / (2 * np.pi)) if zeros else 0.0,
    }
