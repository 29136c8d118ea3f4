"""The opened loop as a two-port: S-parameters to voltage gain into a stated termination.

Port 1 is where the loop is driven at the cut, port 2 where it comes back. With reflection factors Γs of the source and
ΓL of the load the voltage at port 2 over the source's electromotive force is

    V2/E = (1 − Γs)/2 · S21·(1 + ΓL) / ((1 − Γs·S11)(1 − S22·ΓL) − S12·S21·Γs·ΓL)

(signal-flow graph; D. M. Pozar, Microwave Engineering, ch. 4 and 12, from memory). The loop itself ends in its own
input: ΓL = S11 + S12·S21·ΓL/(1 − S22·ΓL). Ending in it over and over converges to u = 1 − S22·ΓL, the larger root of
u² − (1 − Δ)u + S12·S21 = 0 with Δ = S11·S22 − S12·S21; then V2/V1 = S21/u.
"""

from __future__ import annotations

import io
import os
from dataclasses import replace

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.conditioning.sign import settle_sign
from fitamp.errors import SweepError, UsageError
from fitamp.importers.source import Source, load_source
from fitamp.importers.text import decode
from fitamp.importers.touchstone import read_touchstone
from fitamp.importers.touchstone_scan import scan
from fitamp.loopgain.termination import LOOP, NO_IMPEDANCE, Termination
from fitamp.sweep import Concern, Origin, Sign, Sweep
from fitamp.units import si

__all__ = ["read_two_port_loop", "voltage_gain"]

_SUFFIX = ".s2p"
_TRACES = ("S11", "S12", "S21", "S22")
# Forward times backward gain, S12·S21/u², is the ratio of the roots; below this the loop's own termination is the same
# after some ten rounds, to a part in 1000.
_APART = 0.5


def voltage_gain(
    freq_hz: ArrayLike,
    s: ArrayLike,
    *,
    reference_ohm: ArrayLike = 50.0,
    load: Termination = LOOP,
    source: Termination = NO_IMPEDANCE,
) -> ComplexArray:
    """Voltage at port 2 over the source's electromotive force at port 1, shape (n,).

    Parameters
    ----------
    freq_hz : array_like, shape (n,)
    s : array_like of complex, shape (n, 2, 2)
        S-parameters; ``s[:, 1, 0]`` is S21.
    reference_ohm : float or array_like, shape (2,)
        Reference resistance of the ports.
    load
        What port 2 sees; by default port 1 of the loop.
    source
        What drives port 1; by default a source without impedance, so that the gain is V2/V1.

    Raises
    ------
    UsageError
        When both terminations count the same loading: one of them is the loop, and the other neither nothing nor open.
    """
    _refuse_twice(load, source)
    freq_hz, s = np.asarray(freq_hz, dtype=float), np.asarray(s, dtype=complex)
    reference = np.broadcast_to(np.asarray(reference_ohm, dtype=float), (2,))
    if reference[0] != reference[1]:
        s = _on_one_reference(s, reference)
    s11, s12, s21, s22 = s[:, 0, 0], s[:, 0, 1], s[:, 1, 0], s[:, 1, 1]
    round_trip = s12 * s21
    if load.is_loop or source.is_loop:
        other = round_trip / _larger_root(s)
        loop_source, loop_load = s22 / (1 - other), s11 / (1 - other)
    gamma_load = loop_load if load.is_loop else load.reflection(freq_hz, reference[0])
    gamma_source = loop_source if source.is_loop else source.reflection(freq_hz, reference[0])
    below = (1 - gamma_source * s11) * (1 - s22 * gamma_load) - round_trip * gamma_source * gamma_load
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray((1 - gamma_source) / 2 * s21 * (1 + gamma_load) / below)


def read_two_port_loop(
    path: str | os.PathLike[str],
    *,
    load: Termination = LOOP,
    source: Termination = NO_IMPEDANCE,
    sign: Sign | None = None,
) -> Sweep:
    """Loop gain from a Touchstone file of the opened loop, all four S-parameters counted.

    Parameters
    ----------
    path
        ``.s2p``, perhaps packed (``.s2p.gz``); port 1 is where the loop was driven.
    load, source
        As in `voltage_gain`.
    sign
        `Sign.AS_READ` for T = V2/E, `Sign.INVERTED` for T = −V2/E, None to recognise it from the band.

    Returns
    -------
    Sweep
        T, positive real at DC for negative feedback.

    Raises
    ------
    SweepError
        When the file cannot be read, or the band does not show the sign.
    UsageError
        When it is no ``.s2p`` file, or what `voltage_gain` refuses.
    """
    _refuse_twice(load, source)
    data = load_source(path)
    if data.suffix != _SUFFIX:
        raise UsageError(f"{data.file}: a loop as a two-port comes as .s2p; rename the file if it is one")
    records = [read_touchstone(data, trace=trace) for trace in _TRACES]
    first = records[0]
    s = np.stack([record.gain for record in records], axis=1).reshape(-1, 2, 2)
    reference = _reference(data)
    gain = voltage_gain(first.freq_hz, s, reference_ohm=reference, load=load, source=source)
    if not np.isfinite(gain).all():
        index = int(np.argmax(~np.isfinite(gain)))
        raise SweepError(
            f"{data.file}, point {index + 1} ({si(float(first.freq_hz[index]), 'Hz')}): with this termination the "
            "voltage gain has no bound; check the S-parameters and the termination"
        )
    sweep = Sweep(
        freq_hz=first.freq_hz,
        gain=gain,
        origin=Origin(
            file=data.file,
            form="two-port",
            trace=", ".join(_TRACES),
            sha256=data.sha256,
            notes=first.origin.notes,
        ),
        decisions=tuple(one for one in first.decisions if one.topic != "trace"),
        left_out=tuple(replace(point, gain=None) for point in first.left_out),
    )
    return _explained(settle_sign(sweep, sign), s, load, source)


def _explained(sweep: Sweep, s: ComplexArray, load: Termination, source: Termination) -> Sweep:
    minus = "−" if sweep.sign is Sign.INVERTED else ""
    sweep = sweep.with_decision(
        "loop gain",
        f"T = {minus}V2/E from S11, S12, S21 and S22",
        f"port 1 is where the loop was driven; load at port 2: {load}; source at port 1: {source}",
        concern=Concern.RESULT,
    )
    larger = _larger_root(s)
    closeness = np.abs(s[:, 0, 1] * s[:, 1, 0] / larger**2)
    if (load.is_loop or source.is_loop) and closeness.max() > _APART:
        worst = int(np.argmax(closeness))
        return sweep.with_decision(
            "two-port",
            f"forward times backward gain is {closeness[worst]:.2g} at {si(float(sweep.freq_hz[worst]), 'Hz')}",
            "what the loop itself ends in is not plain where that is near 1; state a termination with --load",
            concern=Concern.CAUTION,
        )
    return sweep


def _larger_root(s: ComplexArray) -> ComplexArray:
    """The larger u of u² − (1 − Δ)u + S12·S21 = 0, shape (n,): what an endless chain of the two-port converges to."""
    round_trip = s[:, 0, 1] * s[:, 1, 0]
    total = 1 - (s[:, 0, 0] * s[:, 1, 1] - round_trip)
    spread = np.sqrt(total**2 - 4 * round_trip + 0j)
    spread = np.where((total * spread.conj()).real < 0, -spread, spread)
    return np.asarray((total + spread) / 2)


def _on_one_reference(s: ComplexArray, reference: ArrayLike) -> ComplexArray:
    """S-parameters of ports with different reference resistances, with that of port 1 at both."""
    from skrf.network import renormalize_s

    first, second = np.asarray(reference, dtype=float)
    return np.asarray(renormalize_s(s, np.array([first, second]), np.array([first, first])), dtype=complex)


def _reference(data: Source) -> FloatArray:
    """Reference resistances of the two ports of a file that was read already."""
    from skrf.io.touchstone import Touchstone

    found = scan(data.file, decode(data).lines, 2)
    content = io.StringIO("\n".join(found.kept) + "\n")
    content.name = "checked.s2p"
    return np.asarray(np.real(np.asarray(Touchstone(content).z0)[0]), dtype=float)


def _refuse_twice(load: Termination, source: Termination) -> None:
    none_beside = source.resistance_ohm == 0 and not source.is_loop
    open_beside = np.isinf(load.resistance_ohm) and not load.is_loop and not load.capacitance_f
    if (load.is_loop and not none_beside) or (source.is_loop and not open_beside):
        raise UsageError(
            f"load {load} and source {source} count the loop's own loading twice or with something else; give a load "
            "beside a source, or leave one of them out"
        )
