"""Files as labs hand them over: every one gives the numbers that stand in it, with what was decided."""

from __future__ import annotations

import gzip
import io
import re
from pathlib import Path

import numpy as np
import pytest
from bench_tables import FREQ_HZ, GAIN, RTOL, cells, file_of, table

from fitamp.errors import SweepError, UsageError
from fitamp.importers import read_sweep, read_sweeps
from fitamp.sweep import Sign, Sweep

COLUMNS = ["freq_hz", "re", "im"]


def assert_same(sweep: Sweep, rtol: float = RTOL) -> None:
    np.testing.assert_allclose(sweep.freq_hz, FREQ_HZ, rtol=rtol)
    assert np.max(np.abs(sweep.gain / GAIN - 1)) < rtol


def choices(sweep: Sweep) -> dict[str, str]:
    return {decision.topic: decision.choice for decision in sweep.decisions}


HEADERS = {
    "German": (["Frequenz (Hz)", "Betrag (dB)", "Phase (Grad)"], "utf-8"),
    "German, units row": (["Frequenz", "Verstärkung", "Winkel"], "latin-1"),
    "French": (["Fréquence (Hz)", "Module (dB)", "Phase (degrés)"], "latin-1"),
    "Spanish": (["Frecuencia (Hz)", "Ganancia (dB)", "Fase (grados)"], "utf-8"),
    "Italian": (["Frequenza (Hz)", "Guadagno (dB)", "Fase (gradi)"], "utf-8"),
    "Japanese": (["周波数(Hz)", "ゲイン(dB)", "位相(度)"], "utf-8"),
    "Japanese, Shift-JIS": (["周波数(Hz)", "ゲイン(dB)", "位相(度)"], "cp932"),
    "Japanese, EUC": (["周波数(Hz)", "ゲイン(dB)", "位相(度)"], "euc_jp"),
}


@pytest.mark.parametrize("language", HEADERS)
def test_localised_tables(tmp_path: Path, language: str) -> None:
    header, codec = HEADERS[language]
    text = table(header, cells("dB deg"), separator=";", decimal=",")
    if "row" in language:
        text = text.replace("\n", "\n[Hz];[dB];[Grad]\n", 1)
    sweep = read_sweep(file_of(tmp_path, text.encode(codec)))
    assert_same(sweep)
    names = {"cp932": "Shift-JIS", "euc_jp": "EUC-JP", "latin-1": "Latin-1", "utf-8": "UTF-8"}
    assert choices(sweep)["encoding"] == names[codec]
    assert ("Grad" in choices(sweep)) == language.startswith("German")


GROUPED = {
    "comma": (",", "."),
    "point": (".", ","),
    "apostrophe": ("'", "."),
    "space": (" ", ","),
    "narrow space": ("\N{NARROW NO-BREAK SPACE}", ","),
}


@pytest.mark.parametrize("name", GROUPED)
def test_thousands_separators(tmp_path: Path, name: str) -> None:
    mark, decimal = GROUPED[name]
    rows = [
        [f"{float(f):,.1f}".translate({ord(","): mark, ord("."): decimal}), re.replace(".", decimal), im]
        for f, re, im in (
            [f, f"{float(re):.9f}", f"{float(im):.9f}".replace(".", decimal)] for f, re, im in cells("re im")
        )
    ]
    sweep = read_sweep(file_of(tmp_path, table(COLUMNS, rows, separator=";")))
    assert_same(sweep, 2e-5)
    assert choices(sweep)["thousands separator"] == name.removeprefix("narrow ")


def test_prefixes_and_units_in_the_cells(tmp_path: Path) -> None:
    prefixes = [(1e9, "G"), (1e6, "M"), (1e3, "k"), (1, "")]
    rows = []
    for f, db, deg in cells("dB deg"):
        scale, prefix = next((s, p) for s, p in prefixes if float(f) >= s)
        rows.append(
            [f"{float(f) / scale:.12g} {prefix}Hz", f"{db[:8]}{db[8:]}".replace("e", "E"), f"{float(deg):.10f}°"]
        )
    sweep = read_sweep(file_of(tmp_path, table(["Frequency", "Gain (dB)", "Phase"], rows, separator="\t")))
    assert_same(sweep, 1e-9)
    assert choices(sweep)["unit in the cells"] == "deg"
    assert choices(sweep)["frequency"] == "column 1 ('Frequency') in Hz"


def test_cells_of_the_frequency_alone_may_have_a_prefix(tmp_path: Path) -> None:
    path = file_of(tmp_path, "f (Hz),re,im\n100,9,-1\n1k,8,-2\n2.5M,1,-3\n0.1G,0.1,-0.1\n")
    assert read_sweep(path, sign=Sign.AS_READ).freq_hz.tolist() == [100, 1000, 2.5e6, 1e8]


@pytest.mark.parametrize("mark", ["\N{MINUS SIGN}", "\N{EN DASH}", "\N{FULLWIDTH HYPHEN-MINUS}", "\N{HYPHEN}"])
def test_other_signs_for_minus(tmp_path: Path, mark: str) -> None:
    text = table(COLUMNS, cells("re im"), separator=";").replace("-", mark)
    sweep = read_sweep(file_of(tmp_path, text))
    assert_same(sweep)
    assert choices(sweep)["minus sign"] == f"U+{ord(mark):04X} read as minus"


@pytest.mark.parametrize("word", ["OVL", "---", "", "NaN", "-inf", "#N/A", "9.91E+37"])
def test_points_without_a_reading_are_left_out_with_line_and_reason(tmp_path: Path, word: str) -> None:
    rows = cells("re im")
    rows[10][2] = word
    rows[3] = [rows[3][0], word, word]
    sweep = read_sweep(file_of(tmp_path, table(COLUMNS, rows, separator=",")))
    keep = np.delete(np.arange(len(FREQ_HZ)), [3, 10])
    np.testing.assert_allclose(sweep.freq_hz, FREQ_HZ[keep], rtol=RTOL)
    np.testing.assert_allclose(sweep.gain, GAIN[keep], rtol=RTOL)
    first, second = sweep.left_out
    assert (first.f_hz, first.gain) == (FREQ_HZ[3], None)
    assert first.reason == f"no reading ({repr(word) if word else 'an empty cell'} on line 5)"
    assert second.reason.endswith("on line 12)")
    assert choices(sweep)["no reading"] == "2 of 25 points left out"
    assert Sweep.from_frame(sweep.to_frame()) == sweep
    assert read_sweep(file_of(tmp_path, table(COLUMNS, rows, separator=","))) == sweep


def test_sweep_with_few_readings_is_refused_at_the_first_gap(tmp_path: Path) -> None:
    rows = cells("re im")
    for row in rows[4:7]:
        row[1] = "OVL"
    message = (
        "line 6, column 2 ('re'): 'OVL' is not a number; measure the point again or remove the row (3 of 25 points"
    )
    with pytest.raises(SweepError, match=re.escape(message)):
        read_sweep(file_of(tmp_path, table(COLUMNS, rows, separator=",")))


def test_frequency_without_a_reading_has_no_place_and_is_refused(tmp_path: Path) -> None:
    rows = cells("re im")
    rows[4][0] = "OVL"
    with pytest.raises(SweepError, match=r"line 6, column 1 \('freq_hz'\): 'OVL' is not a number"):
        read_sweep(file_of(tmp_path, table(COLUMNS, rows, separator=",")))


def repeats(count: int) -> list[list[list[str]]]:
    """Invented repeats: each larger than the one before by one part in a thousand."""
    return [
        [[f, repr(float(re) * (1 + k / 1000)), repr(float(im) * (1 + k / 1000))] for f, re, im in cells("re im")]
        for k in range(count)
    ]


SEVERAL = {
    "header again": [
        "".join(table(COLUMNS, rows, separator=",") for rows in repeats(3)),
        "a second header among the rows",
    ],
    "header and notes again": [
        "".join(f"Run {k}\n\n" + table(COLUMNS, rows, separator=",") for k, rows in enumerate(repeats(3))),
        "a second header among the rows",
    ],
    "frequency anew": [
        table(COLUMNS, [row for rows in repeats(3) for row in rows], separator=","),
        "the frequency starts anew here",
    ],
    "up and down": [
        table(
            COLUMNS, [row for k, rows in enumerate(repeats(3)) for row in rows[:: -1 if k == 1 else 1]], separator=","
        ),
        "the frequency starts anew here",
    ],
    "column": [
        table(
            ["Sweep", *COLUMNS], [[f"S{k}", *row] for k, rows in enumerate(repeats(3)) for row in rows], separator=","
        ),
        "column 1 is 'S1' in its rows",
    ],
    "column, row by row": [
        table(
            ["run no", *COLUMNS],
            [[str(k), *r] for rows in zip(*repeats(3), strict=True) for k, r in enumerate(rows)],
            separator=",",
        ),
        "column 1 is '1' in its rows",
    ],
}


@pytest.mark.parametrize("form", SEVERAL)
def test_file_of_several_sweeps(tmp_path: Path, form: str) -> None:
    text, told = SEVERAL[form]
    path = file_of(tmp_path, text)
    sweeps = read_sweeps(path)
    assert len(sweeps) == 3
    for k, sweep in enumerate(sweeps):
        np.testing.assert_allclose(sweep.freq_hz, FREQ_HZ, rtol=RTOL)
        np.testing.assert_allclose(sweep.gain, GAIN * (1 + k / 1000), rtol=RTOL)
        again = read_sweep(path, sweep=k + 1)
        assert (again.gain.tolist(), again.sign) == (sweep.gain.tolist(), Sign.AS_READ)
        assert choices(again)["sweep"].startswith(f"{k + 1} of 3, from line ")
    with pytest.raises(
        SweepError,
        match=rf"{re.escape(told)}; the file holds 3 sweeps, from lines .*: choose one, as in --sweep 2, or average",
    ):
        read_sweep(path)
    with pytest.raises(UsageError, match="sweep 4 is not there; the file holds 3 sweeps, counted from 1"):
        read_sweep(path, sweep=4)


def test_one_sweep_is_all_there_is(tmp_path: Path) -> None:
    path = file_of(tmp_path, table(COLUMNS, cells("re im"), separator=","))
    assert read_sweeps(path) == (read_sweep(path),)
    assert read_sweep(path, sweep=1) == read_sweep(path)
    with pytest.raises(UsageError, match="sweep 0 is not there; the file holds 1 sweep"):
        read_sweep(path, sweep=0)
    one_port = file_of(tmp_path, "# Hz S RI R 50\n1 9 0\n2 9 0\n4 9 0\n", "a.s1p")
    assert len(read_sweeps(one_port)) == 1
    with pytest.raises(UsageError, match="a Touchstone file holds one sweep"):
        read_sweep(one_port, sweep=2)


def test_a_table_that_is_chosen_does_not_need_the_others_to_be_sound(tmp_path: Path) -> None:
    broken = table(["freq_hz", "level", "x"], cells("re im"), separator=",")
    path = file_of(tmp_path, table(COLUMNS, cells("re im"), separator=",") + broken)
    assert_same(read_sweep(path, sweep=1))
    with pytest.raises(SweepError, match="line 27: the header names a magnitude but no phase"):
        read_sweep(path, sweep=2)


def test_channels_between_words_for_begin_and_end(tmp_path: Path) -> None:
    # The way of several network analysers (common practice, no source).
    body = "".join(",".join(row) + "\n" for row in cells("dB deg"))
    channels = [f"BEGIN CH{k}\nFreq(Hz),S21(DB),S21(DEG)\n{body}END\n" for k in (1, 2)]
    first, second = read_sweeps(file_of(tmp_path, "!Invented analyser\n" + "\n".join(channels)))
    assert_same(first)
    assert_same(second)
    assert first.origin.notes == ("Invented analyser", "BEGIN CH1")
    assert second.origin.notes == ("END", "BEGIN CH2")
    assert "last line" not in choices(first)
    assert choices(second)["last line"] == "line 58 left aside"


def test_touchstone_from_standard_input_says_its_ports_by_its_rows(monkeypatch: pytest.MonkeyPatch) -> None:
    one = "# Hz S RI R 50\n" + "".join(" ".join(row) + "\n" for row in cells("re im"))
    two = "# Hz S RI R 50\n" + "".join(f"{f} 0 0 {re} {im} 0 0 0 0\n" for f, re, im in cells("re im"))
    for content in (one, two):
        monkeypatch.setattr("sys.stdin", Console(content.encode()))
        sweep = read_sweep("-")
        assert_same(sweep)
        assert (sweep.origin.file, sweep.origin.form) == ("standard input", "touchstone")
    monkeypatch.setattr("sys.stdin", Console(b"# Hz S RI\n1 2\n"))
    with pytest.raises(SweepError, match="standard input: the number of ports is not known; name the file"):
        read_sweep("-")
    monkeypatch.setattr("sys.stdin", Console(table(COLUMNS, cells("re im"), separator=",").encode()))
    assert_same(read_sweep("-"))


class Console:
    """Standard input as far as its bytes are concerned."""

    def __init__(self, data: bytes) -> None:
        self.buffer = io.BytesIO(data)


def test_gzip_files_of_both_kinds(tmp_path: Path) -> None:
    content = table(COLUMNS, cells("re im"), separator=",").encode()
    sweep = read_sweep(file_of(tmp_path, gzip.compress(content), "a.csv.gz"))
    assert_same(sweep)
    assert choices(sweep)["packing"].startswith("gzip, ")
    content = ("# Hz S RI R 50\n" + "\n".join(" ".join(row) for row in cells("re im"))).encode()
    for name in ("a.s1p.gz", "a.S1P.GZ"):
        assert_same(read_sweep(file_of(tmp_path, gzip.compress(content), name)))
