"""The opened loop as a two-port, against Kirchhoff's laws for the circuit it came from and against scikit-rf."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from fitamp.arrays import ComplexArray, FloatArray
from fitamp.errors import SweepError, UsageError
from fitamp.loopgain import Termination, read_two_port_loop, voltage_gain
from fitamp.sweep import Concern, Sign

FREQ_HZ: FloatArray = np.geomspace(1e3, 1e8, 61)
OPEN, LOOP, NO_IMPEDANCE = Termination(), Termination(is_loop=True), Termination(resistance_ohm=0.0)


def circuit(freq_hz: float, *, back: float = 1e-8) -> ComplexArray:
    """Admittances of an invented two-stage loop between its ports, shape (2, 2), the inner node eliminated.

    Port 1: 20 kΩ ∥ 2 pF. Stage 1: −0.15 mS into 1 MΩ ∥ 0.2 pF. Stage 2: −1.6 mS into 50 kΩ ∥ 4 pF at port 2,
    bridged by 1.8 pF in series with 1.3 kΩ. A conductance `back` goes from port 2 to port 1. As a loop it inverts once
    more, in stage 1: its gain at DC is positive here, as with +0.15 mS.
    """
    s = 2j * np.pi * freq_hz
    bridge = 1 / (1300 + 1 / (s * 1.8e-12))
    y = np.array(
        [
            [1 / 20e3 + s * 2e-12 + back, 0, -back],
            [0.15e-3, 1e-6 + s * 0.2e-12 + bridge, -bridge],
            [-back, 1.6e-3 - bridge, 1 / 50e3 + s * 4e-12 + bridge + back],
        ],
        dtype=complex,
    )
    kept = [0, 2]
    inner = y[np.ix_(kept, [1])] @ y[np.ix_([1], kept)] / y[1, 1]
    return np.asarray(y[np.ix_(kept, kept)] - inner)


def scattering(reference_ohm: tuple[float, float] = (50.0, 50.0), *, back: float = 1e-8) -> ComplexArray:
    """S = (1 − √z·Y·√z)(1 + √z·Y·√z)⁻¹ (D. M. Pozar, Microwave Engineering, ch. 4, from memory), shape (n, 2, 2)."""
    root = np.diag(np.sqrt(reference_ohm))
    normal = np.array([root @ circuit(f, back=back) @ root for f in FREQ_HZ.tolist()])
    return np.asarray((np.eye(2) - normal) @ np.linalg.inv(np.eye(2) + normal))


def by_nodes(freq_hz: float, load: complex, source_ohm: float = 0.0, *, back: float = 1e-8) -> complex:
    """Voltage at port 2 for 1 V of the source behind its resistance, `load` an admittance at port 2."""
    y = circuit(freq_hz, back=back)
    y[1, 1] += load
    if source_ohm == 0:
        return complex(-y[1, 0] / y[1, 1])
    y[0, 0] += 1 / source_ohm
    return complex(np.linalg.solve(y, np.array([1 / source_ohm, 0]))[1])


def input_admittance(freq_hz: float, load: complex, *, back: float = 1e-8) -> complex:
    y = circuit(freq_hz, back=back)
    return complex(y[0, 0] - y[0, 1] * y[1, 0] / (y[1, 1] + load))


@pytest.mark.parametrize(
    ("load", "source"),
    [
        (OPEN, NO_IMPEDANCE),
        (Termination(resistance_ohm=1e6, capacitance_f=8e-12), NO_IMPEDANCE),
        (Termination(resistance_ohm=50.0), Termination(resistance_ohm=50.0)),
        (Termination(capacitance_f=3e-12), Termination(resistance_ohm=2e3)),
    ],
)
@pytest.mark.parametrize("reference", [(50.0, 50.0), (75.0, 75.0), (50.0, 1000.0)])
def test_stated_terminations_against_nodal_analysis(
    load: Termination, source: Termination, reference: tuple[float, float]
) -> None:
    found = voltage_gain(FREQ_HZ, scattering(reference), reference_ohm=reference, load=load, source=source)
    expected = [
        by_nodes(f, 1 / load.resistance_ohm + 2j * np.pi * f * load.capacitance_f, source.resistance_ohm)
        for f in FREQ_HZ.tolist()
    ]
    np.testing.assert_allclose(found, expected, rtol=1e-9)


@pytest.mark.parametrize("back", [0.0, 1e-8, 1e-7])
def test_loop_ends_in_itself_as_by_doing_it_over_and_over(back: float) -> None:
    found = voltage_gain(FREQ_HZ, scattering(back=back), load=LOOP)
    expected = []
    for f in FREQ_HZ.tolist():
        load = 0j
        for _ in range(400):
            load = input_admittance(f, load, back=back)
        expected.append(by_nodes(f, load, back=back))
    np.testing.assert_allclose(found, expected, rtol=1e-9)


def test_source_that_is_the_loop_gives_the_same_of_a_loop_that_goes_one_way() -> None:
    s = scattering(back=0.0)
    np.testing.assert_allclose(
        voltage_gain(FREQ_HZ, s, load=OPEN, source=LOOP), voltage_gain(FREQ_HZ, s, load=LOOP), rtol=1e-9
    )


def test_closed_loop_is_singular_where_the_gain_is_one() -> None:
    # Port 2 joined to port 1 of the chain matrix: a solution without a drive wherever an eigenvalue of it is 1, so the
    # gain is one over an eigenvalue whatever goes backward. Chain parameters by scikit-rf.
    from skrf.network import s2a

    s = scattering()
    eigenvalues = np.linalg.eigvals(s2a(s, np.full((len(s), 2), 50.0)))
    largest = eigenvalues[np.arange(len(s)), np.abs(eigenvalues).argmax(axis=1)]
    np.testing.assert_allclose(voltage_gain(FREQ_HZ, s, load=LOOP), 1 / largest, rtol=1e-9)


def test_terminations_that_count_twice_are_refused() -> None:
    with pytest.raises(UsageError, match=r"load the loop itself and source 50.00 Ω count the loop's own loading twice"):
        voltage_gain(FREQ_HZ, scattering(), load=LOOP, source=Termination(resistance_ohm=50.0))
    with pytest.raises(UsageError, match=r"load 50.00 Ω and source the loop itself count"):
        voltage_gain(FREQ_HZ, scattering(), load=Termination(resistance_ohm=50.0), source=LOOP)
    with pytest.raises(UsageError, match="a termination of -1 ohm and 0 F is none"):
        Termination(resistance_ohm=-1.0)


def written(folder: Path, s: ComplexArray, name: str = "loop.s2p", head: str = "# Hz S RI R 75") -> Path:
    path = folder / name
    rows = [
        " ".join(
            repr(float(x))
            for x in (f, *(part for k in (m[0, 0], m[1, 0], m[0, 1], m[1, 1]) for part in (k.real, k.imag)))
        )
        for f, m in zip(FREQ_HZ, s, strict=True)
    ]
    path.write_text("\n".join(["! cut at the output", head, *rows, ""]), encoding="utf-8")
    return path


def test_file_is_read_with_its_reference_and_told(tmp_path: Path) -> None:
    s = scattering((75.0, 75.0))
    sweep = read_two_port_loop(written(tmp_path, s))
    assert sweep.sign is Sign.AS_READ
    np.testing.assert_allclose(sweep.gain, voltage_gain(FREQ_HZ, s, reference_ohm=75.0), rtol=1e-12)
    told = next(d for d in sweep.decisions if d.concern is Concern.RESULT)
    assert told.choice == "T = V2/E from S11, S12, S21 and S22"
    assert told.reason.endswith("load at port 2: the loop itself; source at port 1: 0 Ω")
    assert sweep.origin.notes == ("cut at the output",)
    assert not [d for d in sweep.decisions if d.topic == "trace"]


def test_inverting_loop_is_turned_round(tmp_path: Path) -> None:
    s = scattering((75.0, 75.0), back=0.0)
    s[:, 1, 0] *= -1
    sweep = read_two_port_loop(written(tmp_path, s), load=OPEN)
    assert sweep.sign is Sign.INVERTED
    expected = [by_nodes(f, 0j, back=0.0) for f in FREQ_HZ.tolist()]
    np.testing.assert_allclose(sweep.gain, expected, rtol=1e-9)


def test_backward_gain_that_counts_is_a_caution(tmp_path: Path) -> None:
    s = scattering((75.0, 75.0), back=3e-5)
    cautions = [
        d for d in read_two_port_loop(written(tmp_path, s), sign=Sign.AS_READ).decisions if d.topic == "two-port"
    ]
    assert [d.concern for d in cautions] == [Concern.CAUTION]
    assert cautions[0].choice.startswith("forward times backward gain is ")
    small = read_two_port_loop(written(tmp_path, scattering((75.0, 75.0), back=1e-10)))
    assert not [d for d in small.decisions if d.concern is Concern.CAUTION]


def test_other_files_are_refused(tmp_path: Path) -> None:
    path = written(tmp_path, scattering(), name="loop.csv")
    with pytest.raises(UsageError, match=r"loop\.csv: a loop as a two-port comes as \.s2p"):
        read_two_port_loop(path)
    with pytest.raises(SweepError, match=r"none\.s2p: no such file"):
        read_two_port_loop(tmp_path / "none.s2p")


def test_gain_without_bound_is_refused(tmp_path: Path) -> None:
    s = np.zeros((len(FREQ_HZ), 2, 2), dtype=complex)
    s[:, 1, 0], s[:, 1, 1] = 5, 1
    with pytest.raises(SweepError, match=r"point 1 \(1.000 kHz\): with this termination the voltage gain has no bound"):
        read_two_port_loop(written(tmp_path, s), load=OPEN, sign=Sign.AS_READ)
