"""Header cells: what common spellings mean (common practice, no source), and what they leave open."""

from __future__ import annotations

import pytest

from fitamp.importers.quantity import Quantity, Unit, meaning_of, unit_of

F, MAG, PH, RE, IM, CX = Quantity
HZ, KHZ, MHZ, GHZ, RAD_S, DB, LIN, DEG, RAD = Unit

SPELLINGS: dict[str, tuple[Quantity | None, Unit | None]] = {
    "freq": (F, None),
    "Frequency": (F, None),
    "f": (F, None),
    "Frequency (Hz)": (F, HZ),
    "Freq[MHz]": (F, MHZ),
    "f / kHz": (F, KHZ),
    "frequency/GHz": (F, GHZ),
    "Freq. [Hz]": (F, HZ),
    "Frequency in Hz": (F, HZ),
    "freq_hz": (F, HZ),
    "freq_mhz": (F, MHZ),
    "FreqHz": (F, HZ),
    "Hz": (F, HZ),
    "f (mHz)": (F, None),
    "omega": (F, RAD_S),
    "ω / rad/s": (F, RAD_S),
    "w (rad/s)": (F, RAD_S),
    "omega_rad_s": (F, RAD_S),
    "w": (None, None),
    "mag": (MAG, None),
    "Gain": (MAG, None),
    "magnitude": (MAG, None),
    "|T|": (MAG, None),
    "amplitude": (MAG, None),
    "level": (MAG, None),
    "Loop gain": (MAG, None),
    "dB": (MAG, DB),
    "mag_db": (MAG, DB),
    "Gain (dB)": (MAG, DB),
    "Gain, dB": (MAG, DB),
    "dB(T)": (MAG, DB),
    "|T| dB": (MAG, DB),
    "20*log10(|T|)": (MAG, DB),
    "S21 (dB)": (MAG, DB),
    "T (dB)": (MAG, DB),
    "GaindB": (MAG, DB),
    "Level (dBm)": (MAG, None),
    "Magnitude (V/V)": (MAG, LIN),
    "mag_lin": (MAG, LIN),
    "phase": (PH, None),
    "arg": (PH, None),
    "angle": (PH, None),
    "phase(deg)": (PH, DEG),
    "phase [rad]": (PH, RAD),
    "Phase (°)": (PH, DEG),
    "°": (PH, DEG),
    "∠T (°)": (PH, DEG),
    "arg(T) in rad": (PH, RAD),
    "Loop gain phase (deg)": (PH, DEG),
    "Loop gain (deg)": (PH, DEG),
    "PhaseDeg": (PH, DEG),
    "Phase (Bogenmaß)": (PH, RAD),
    "Phase (Grad)": (PH, None),
    "phase (Hz)": (None, None),
    "re": (RE, None),
    "Real part": (RE, None),
    "Re(T)": (RE, None),
    "Re(T) (V/V)": (RE, None),
    "T.real": (RE, None),
    "ℜ(T)": (RE, None),
    "gain_real": (RE, None),
    "imag": (IM, None),
    "Im(S21)": (IM, None),
    "T.imag": (IM, None),
    "Re (mV)": (None, None),
    "Im (%)": (None, None),
    "Re(Z) (Ω)": (None, None),
    "complex gain": (CX, None),
    "T": (None, None),
    "time": (None, None),
    "phase margin (deg)": (None, None),
    "gain error (dB)": (None, None),
    "group delay (s)": (None, None),
    "magnitude phase": (None, None),
}


@pytest.mark.parametrize("text", SPELLINGS)
def test_header_cell_means_what_it_says_and_no_more(text: str) -> None:
    meaning = meaning_of(f" {text} ")
    assert (meaning.quantity, meaning.unit) == SPELLINGS[text]
    assert meaning.text == text
    assert not meaning.weak


def test_unit_under_an_unknown_name_speaks_weakly() -> None:
    for text, quantity in (("RBW (Hz)", F), ("Taktrate (Hz)", F), ("Flatness (dB)", MAG), ("Tilt (deg)", PH)):
        meaning = meaning_of(text)
        assert (meaning.quantity, meaning.weak) == (quantity, True)


def test_grad_is_degrees_in_one_language_and_gradians_in_another() -> None:
    for text, word in (("Phase (Grad)", "Grad"), ("phase_grad", "grad"), ("Phase [grads]", "grads")):
        meaning = meaning_of(text)
        assert (meaning.quantity, meaning.unit) == (PH, None)
        assert meaning.doubt == f"{word} may be degrees or gradians, 400 to the turn"
    assert meaning_of("Phase (deg)").doubt == ""
    assert meaning_of("gradient").doubt == ""


def test_milli_and_mega_are_not_mixed_up() -> None:
    assert unit_of("MHz") is unit_of("mhz") is unit_of("MHZ") is MHZ
    assert unit_of("mHz") is None


def test_unit_from_its_own_row_completes_the_name() -> None:
    assert meaning_of("Gain").with_unit(DB).unit is DB
    assert meaning_of("CH1").with_unit(DB).quantity is MAG
    assert meaning_of("Loop gain").with_unit(DEG).quantity is PH
    assert meaning_of("Bandwidth").with_unit(HZ).weak
