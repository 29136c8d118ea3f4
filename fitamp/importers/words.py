"""Words of column headers, in the languages that bench software speaks (common practice, no source).

Words are in small letters without accents, as `folded` makes them. A word stands under one language only where no
other has it; by it a header shows its language.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable

__all__ = ["JAPANESE", "WORDS", "folded", "language_of"]

# What a header means, then language, then words; "" for words of more than one language.
WORDS: dict[str, dict[str, str]] = {
    "frequency": {
        "": "f freq freqs frq",
        "English": "frequency frequencies",
        "German": "frequenz frequenzen",
        "French": "frequence frequences",
        "Spanish": "frecuencia frecuencias",
        "Italian": "frequenza frequenze",
    },
    # Angular frequency by its name alone, and words that make a frequency one.
    "omega": {
        "": "omega ω",
        "German": "kreisfrequenz",
        "French": "pulsation",
        "Spanish": "pulsacion",
        "Italian": "pulsazione",
    },
    "angular": {"": "angular", "French": "angulaire", "Italian": "angolare"},
    "magnitude": {
        "": "mag magn ampl amp modulus modulo mod abs",
        "English": "magnitude gain loopgain amplitude level",
        "German": "betrag verstarkung verstaerkung schleifenverstarkung schleifenverstaerkung kreisverstarkung "
        "kreisverstaerkung leerlaufverstarkung leerlaufverstaerkung pegel amplitudengang",
        "French": "module niveau",
        "Spanish": "magnitud ganancia amplitud nivel",
        "Italian": "guadagno ampiezza livello",
    },
    "phase": {
        "": "phas pha ph arg ang phi φ fase argumento argomento",
        "English": "phase argument angle",
        "German": "winkel phasenwinkel phasenlage phasengang phasenverschiebung",
        "French": "dephasage",
        "Spanish": "desfase",
        "Italian": "sfasamento",
    },
    "real": {
        "": "re real",
        "German": "realteil realanteil",
        "French": "reel reelle",
        "Italian": "reale",
    },
    "imaginary": {
        "": "im imag img",
        "English": "imaginary",
        "German": "imaginarteil imaginaerteil imaginaranteil imaginaeranteil",
        "French": "imaginaire",
        "Spanish": "imaginario imaginaria",
        "Italian": "immaginario immaginaria",
    },
    "complex": {"": "cplx", "English": "complex", "German": "komplex komplexe", "French": "complexe"},
    # Names that a trace may have beside its quantity.
    "trace": {
        "": "gain loopgain level",
        "German": "verstarkung verstaerkung schleifenverstarkung schleifenverstaerkung kreisverstarkung "
        "kreisverstaerkung leerlaufverstarkung leerlaufverstaerkung pegel",
        "French": "niveau",
        "Spanish": "ganancia nivel",
        "Italian": "guadagno livello",
    },
    # Names that say nothing of the quantity, so that a unit alone may decide.
    "neutral": {
        "": "t l h a de del della en in of y loop lg open ol trace tr ch channel data response value bode",
        "German": "kanal messwert wert antwort",
        "French": "voie valeur reponse",
        "Spanish": "canal valor respuesta",
        "Italian": "canale valore risposta",
    },
    # Columns that belong to a trace without being one.
    "side": {
        "": "sd std stdev stderr sigma err delay noise ohm ohms",
        "English": "margin error uncertainty coherence limit weight mask upper lower impedance admittance",
        "German": "reserve phasenreserve amplitudenreserve rand phasenrand amplitudenrand fehler unsicherheit "
        "koharenz kohaerenz grenze grenzwert gewicht maske impedanz admittanz laufzeit gruppenlaufzeit rauschen "
        "abweichung standardabweichung",
        "French": "marge erreur incertitude coherence limite poids masque bruit retard ecart",
        "Spanish": "margen incertidumbre coherencia peso mascara ruido retardo impedancia desviacion",
        "Italian": "margine errore incertezza coerenza ritardo rumore impedenza scarto deviazione",
    },
    # Columns that number the sweeps of a file.
    "sweep": {
        "English": "sweep run repeat repetition record acquisition",
        "German": "durchlauf durchgang messung wiederholung",
        "French": "balayage mesure essai",
        "Spanish": "barrido medida medicion",
        "Italian": "scansione misura",
    },
}
# Terms of Japanese headers, longer ones first, with the English that stands for them.
JAPANESE = {
    "開ループ利得": "gain",
    "ループゲイン": "gain",
    "ループ利得": "gain",
    "一巡伝達関数": "trace",
    "位相余裕": "margin",
    "ゲイン余裕": "margin",
    "利得余裕": "margin",
    "群遅延": "delay",
    "角周波数": "angular frequency",
    "周波数": "frequency",
    "利得": "gain",
    "ゲイン": "gain",
    "振幅": "amplitude",
    "大きさ": "magnitude",
    "絶対値": "magnitude",
    "レベル": "level",
    "位相角": "phase",
    "位相": "phase",
    "偏角": "phase",
    "実数部": "real",
    "実部": "real",
    "虚数部": "imaginary",
    "虚部": "imaginary",
    "複素数": "complex",
    "複素": "complex",
    "余裕": "margin",
    "誤差": "error",
    "雑音": "noise",
    "ノイズ": "noise",
    "遅延": "delay",
    "掃引": "sweep",
    "測定": "run",
    "メガヘルツ": "MHz",
    "キロヘルツ": "kHz",
    "ギガヘルツ": "GHz",
    "ヘルツ": "Hz",
    "デシベル": "dB",
    "ラジアン": "rad",
    "度": "deg",
}

_LANGUAGE_BY_WORD = {
    word: language for by in WORDS.values() for language, words in by.items() if language for word in words.split()
}


def folded(text: str) -> str:
    """Small letters without accents; ß is ss."""
    apart = unicodedata.normalize("NFKD", text.casefold())
    return "".join(c for c in apart if not unicodedata.combining(c))


def language_of(cells: Iterable[str]) -> str:
    """The one language that a header's words belong to; empty where they show none, English or more than one."""
    found = {_LANGUAGE_BY_WORD.get(word, "") for cell in cells for word in re.findall(r"[a-z]+", folded(cell))}
    if any(term in cell for term in JAPANESE for cell in cells):
        found.add("Japanese")
    foreign = found - {"", "English"}
    return foreign.pop() if len(foreign) == 1 else ""
