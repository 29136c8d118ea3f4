"""What `fitamp read` shows of a sweep."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fitamp.report.as_json import sweep_record
from fitamp.report.reading import sweep_text
from fitamp.report.text_plot import text_plot
from fitamp.sweep import LeftOut, Origin, Sweep

FREQ_HZ = np.logspace(1, 8, 141)
GAIN = 1e4 / (1 + 1j * FREQ_HZ / 1e3) / (1 + 1j * FREQ_HZ / 5e6)


def sweep_of(*notes: str, left_out: int = 0) -> Sweep:
    points = tuple(LeftOut(f_hz=k + 1.0, gain=None, reason=f"no reading ('OVL' on line {k})") for k in range(left_out))
    return Sweep(freq_hz=FREQ_HZ, gain=GAIN, origin=Origin(file="a.csv", notes=notes), left_out=points)


def test_notes_are_shown_as_they_stand_up_to_a_few() -> None:
    lines = sweep_text(sweep_of("[red]drive 10 mV[/red]", "a\x1b[31mb", *(f"line {k}" for k in range(9)))).splitlines()
    at = lines.index("notes")
    assert lines[at + 3 : at + 5] == ["[red]drive 10 mV[/red]", "a\\x1b[31mb"]
    assert lines[at + 11] == "… 3 more lines"
    assert "notes" not in sweep_text(sweep_of())


def test_points_without_a_reading_are_listed_up_to_a_few() -> None:
    text = sweep_text(sweep_of(left_out=12))
    assert "1.000 Hz  no reading ('OVL' on line 0)" in text
    assert text.splitlines()[-1].split() == ["…", "2", "more"]


def test_record_has_the_notes() -> None:
    assert sweep_record(sweep_of("a", "b"))["notes"] == ["a", "b"]


def test_picture_puts_points_where_their_values_are() -> None:
    lines = text_plot(sweep_of())
    assert max(map(len, lines)) <= 100
    phase = lines.index("phase (°)")
    magnitude = lines[1:phase]
    # 80 dB at the left end and about -31 dB at the right one, on a scale from 100 to -50 dB, eleven rows of 15 dB.
    assert (magnitude[0].split()[0], magnitude[-1].split()[0]) == ("100", "-50")
    assert magnitude[1].split("|", 1)[1].startswith("*")
    assert magnitude[9].split("|", 1)[1].endswith("*")
    assert next(line for line in magnitude if line.strip().startswith("0 |")).count("-") > 60
    assert lines[-1].split() == ["10.0", "Hz", "100", "MHz"]
    assert lines[phase + 1].split()[0] == "0"
    assert "\n".join(lines) in sweep_text(sweep_of(), plot=True)


@pytest.mark.parametrize("gain", [np.zeros(3), np.full(3, 5.0), np.array([1.0, 0.0, 1e-300])])
def test_picture_of_next_to_nothing_is_drawn_all_the_same(gain: np.ndarray) -> None:
    lines = text_plot(replace(sweep_of(), freq_hz=FREQ_HZ[:3], gain=gain.astype(complex)))
    assert lines[0] == "|T| (dB)"
    assert text_plot(replace(sweep_of(), freq_hz=FREQ_HZ[:1], gain=GAIN[:1]))[1:]
