"""Words of headers in six languages (dictionary knowledge, no source)."""

from __future__ import annotations

import pytest

from fitamp.importers.quantity import Quantity, Unit, meaning_of, names_sweeps, unit_of
from fitamp.importers.words import folded, language_of

F, MAG, PH, RE, IM, CX = Quantity
HZ, KHZ, MHZ, GHZ, RAD_S, DB, LIN, DEG, RAD = Unit

SPELLINGS: dict[str, dict[str, tuple[Quantity | None, Unit | None]]] = {
    "German": {
        "Frequenz (Hz)": (F, HZ),
        "Frequenz in kHz": (F, KHZ),
        "FREQUENZ [MHz]": (F, MHZ),
        "Kreisfrequenz": (F, RAD_S),
        "Verstärkung (dB)": (MAG, DB),
        "Verstaerkung / dB": (MAG, DB),
        "Schleifenverstärkung in dB": (MAG, DB),
        "Betrag": (MAG, None),
        "Phase der Schleifenverstärkung (Bogenmaß)": (PH, RAD),
        "Winkel [rad]": (PH, RAD),
        "Winkel (Grad)": (PH, None),
        "Realteil": (RE, None),
        "Imaginärteil": (IM, None),
        "Phasenreserve (°)": (None, None),
        "Gruppenlaufzeit (s)": (None, None),
    },
    "French": {
        "Fréquence (Hz)": (F, HZ),
        "FRÉQUENCE (kHz)": (F, KHZ),
        "pulsation": (F, RAD_S),
        "Module (dB)": (MAG, DB),
        "Gain en dB": (MAG, DB),
        "Phase (degrés)": (PH, DEG),
        "Phase (radians)": (PH, RAD),
        "Phase (grades)": (PH, None),
        "Partie réelle": (RE, None),
        "Partie imaginaire": (IM, None),
        "Marge de phase (°)": (None, None),
    },
    "Spanish": {
        "Frecuencia (Hz)": (F, HZ),
        "Frecuencia angular": (F, RAD_S),
        "Módulo (dB)": (MAG, DB),
        "Ganancia [dB]": (MAG, DB),
        "Fase (grados)": (PH, DEG),
        "Fase (radianes)": (PH, RAD),
        "Parte real": (RE, None),
        "Parte imaginaria": (IM, None),
        "Margen de fase (°)": (None, None),
    },
    "Italian": {
        "Frequenza (Hz)": (F, HZ),
        "Pulsazione": (F, RAD_S),
        "Guadagno (dB)": (MAG, DB),
        "Modulo (dB)": (MAG, DB),
        "Fase (gradi)": (PH, DEG),
        "Fase (radianti)": (PH, RAD),
        "Parte reale": (RE, None),
        "Parte immaginaria": (IM, None),
        "Margine di fase (°)": (None, None),
    },
    "Japanese": {
        "周波数(Hz)": (F, HZ),
        "周波数［ｋＨｚ］": (F, KHZ),
        "周波数㎒": (F, MHZ),
        "角周波数": (F, RAD_S),
        "ゲイン(dB)": (MAG, DB),
        "利得［デシベル］": (MAG, DB),
        "振幅": (MAG, None),
        "ループゲイン 位相(度)": (PH, DEG),
        "位相（°）": (PH, DEG),
        "位相(ラジアン)": (PH, RAD),
        "実部": (RE, None),
        "虚数部": (IM, None),
        "位相余裕(度)": (None, None),
    },
}
CASES = [(language, text) for language, spellings in SPELLINGS.items() for text in spellings]


@pytest.mark.parametrize(("language", "text"), CASES)
def test_header_cell_means_the_same_in_every_language(language: str, text: str) -> None:
    meaning = meaning_of(text)
    assert (meaning.quantity, meaning.unit) == SPELLINGS[language][text]
    assert meaning.text == text


def test_a_header_shows_its_language_by_words_that_no_other_has() -> None:
    assert language_of(["Frequenz", "Betrag", "Phase"]) == "German"
    assert language_of(["Fréquence", "gain", "phase"]) == "French"
    assert language_of(["Frecuencia", "Ganancia", "Fase"]) == "Spanish"
    assert language_of(["Frequenza", "Guadagno", "Fase"]) == "Italian"
    assert language_of(["周波数", "利得", "位相"]) == "Japanese"
    assert language_of(["frequency", "gain", "phase"]) == ""
    assert language_of(["Frequenz", "Ganancia"]) == ""


def test_units_without_accents_capitals_or_width() -> None:
    assert unit_of("DEGRÉS") is unit_of("degres") is unit_of("［度］") is DEG
    assert unit_of("㎑") is KHZ
    assert folded("Größe É") == "grosse e"


def test_columns_that_number_the_sweeps() -> None:
    for text in ("Sweep", "run", "Run no.", "Repeat", "Durchlauf", "Messung Nr", "Balayage", "掃引", "sweep index"):
        assert names_sweeps(text)
    for text in ("no", "point", "index", "sweep time", "frequency", "run mode"):
        assert not names_sweeps(text)
