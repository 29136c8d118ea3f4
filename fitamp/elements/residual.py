"""The loop-equation residual of a circuit over one or many sweeps, and the information that sweeps hold.

Elements are shared by all sweeps; each sweep has its condition and its own noise.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.elements.circuit import Circuit
from fitamp.elements.condition import Condition
from fitamp.fitting.leastsq import interleaved
from fitamp.sweep import NoiseLevels, Sweep

__all__ = ["Measured", "information", "loop_equation", "stacked"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Measured:
    """One sweep with how it was taken and the noise it is weighted with.

    inflation : by which its variance is larger than the noise, where the circuit does not describe it within the noise
    factor : what is known to be in the sweep beside the circuit, shape (n,); None for nothing
    """

    sweep: Sweep
    condition: Condition
    noise: NoiseLevels
    inflation: float = 1.0
    factor: ComplexArray | None = None


def loop_equation(
    gain: ComplexArray, slopes: ComplexArray, measured_gain: ComplexArray, noise: NoiseLevels
) -> tuple[ComplexArray, ComplexArray]:
    """Residuals (n,) of the loop equation in standard deviations per component, and their derivatives (n, p).

    Parameters
    ----------
    gain, slopes : shapes (n,) and (n, p)
        Modelled loop gain M and its derivatives.
    measured_gain : shape (n,)
        T as measured. With drive 1 the receivers see 1/(1+T) and T/(1+T), each with its own floor, so (T − M)/(1 + T)
        has the variance n_r² + |M|² n_e² + rel² |T/(1+T)|² + ratio²/|1+T|². M stays in the variance and is
        differentiated with it; weights frozen at the data bias the low end (errors in variables: R. Pintelon and
        J. Schoukens, System Identification: A Frequency Domain Approach).
    """
    through = 1 + measured_gain
    variance = (
        noise.return_channel**2
        + np.abs(gain) ** 2 * noise.error_channel**2
        + noise.relative**2 * np.abs(measured_gain / through) ** 2
        + noise.ratio**2 / np.abs(through) ** 2
    )
    weight = np.sqrt(2 / variance) / through
    residual = (measured_gain - gain) * weight
    variance_slopes = 2 * noise.error_channel**2 * (np.conj(gain)[:, np.newaxis] * slopes).real
    derivatives = -slopes * weight[:, np.newaxis] - 0.5 * (residual / variance)[:, np.newaxis] * variance_slopes
    return residual, derivatives


def stacked(circuit: Circuit, values: FloatArray, sweeps: Sequence[Measured]) -> tuple[FloatArray, FloatArray]:
    """Residuals (m,) of all sweeps, re and im in turn, then of the priors, and their derivatives (m, p)."""
    residuals, derivatives = [], []
    for one in sweeps:
        gain, slopes = circuit.gain_and_derivatives(values, one.sweep.freq_hz, one.condition)
        if one.factor is not None:
            gain, slopes = gain * one.factor, slopes * one.factor[:, np.newaxis]
        residual, slope = loop_equation(gain, slopes, one.sweep.gain, one.noise)
        share = 1 / np.sqrt(one.inflation)
        residuals.append(interleaved(residual) * share)
        derivatives.append(interleaved(slope) * share)
    priors, prior_slopes = circuit.prior_rows(values)
    return np.concatenate([*residuals, priors]), np.concatenate([*derivatives, prior_slopes])


def information(
    circuit: Circuit,
    values: FloatArray,
    freq_hz: FloatArray,
    noise: NoiseLevels,
    *,
    condition: Condition | None = None,
) -> FloatArray:
    """Fisher information that one sweep will hold about the vector, shape (p, p), before it is taken.

    Parameters
    ----------
    values : shape (p,)
        Where it is to be known: ``circuit.designed``, or an estimate's.
    freq_hz : shape (n,)
        Frequencies of the sweep.
    noise
        Noise levels expected. A hundredfold average divides them by ten.

    Notes
    -----
    Information of several sweeps adds, and so does `Circuit.prior_information`; the inverse of the sum is the
    covariance to be expected. That the variance itself depends on the elements adds next to nothing.
    """
    gain, slopes = circuit.gain_and_derivatives(values, freq_hz, condition or Condition())
    rows = interleaved(loop_equation(gain, slopes, gain, noise)[1])
    return np.asarray(rows.T @ rows)
