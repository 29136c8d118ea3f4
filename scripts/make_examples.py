#!/usr/bin/env python3
"""Write the sweeps in data_examples: an invented chip's parts as an invented bench would have recorded them.

    python scripts/make_examples.py [--out data_examples]

The loop gain is the exact circuit's, with the probe's load and the cable's delay; the noise is that of two receivers.
Seeds are fixed, so that the files come out the same.
"""

from __future__ import annotations

import argparse
from pathlib import Path

import numpy as np

import fitamp

HERE = Path(__file__).resolve().parent
NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
FREQ_HZ = np.geomspace(10.0, 200e6, 241)
PROBE_F, CABLE_S = 2.03e-12, 0.41e-9
# The parts: how far each element is from its design, and the resistor.
HEALTHY = {"gm1": 1.03, "R1": 0.91, "C1": 1.06, "gm2": 0.96, "R2": 1.08, "CL": 1.04, "Cc": 1.02}
OTHER = {"gm1": 0.98, "R1": 1.07, "C1": 0.97, "gm2": 1.04, "R2": 0.94, "CL": 1.10, "Cc": 0.98}
# Part f: a weak second stage, and 0.8 pF of pad that nobody designed in CL, which is 1 % off beside it.
STEPPED = {"gm1": 1.04, "R1": 0.93, "C1": 1.09, "gm2": 0.84, "R2": 1.10, "CL": 1.01 + 0.8 / 4.0, "Cc": 1.03}
STEPPED_RZ_OHM = 1080.0
# File, load and resistance added, as a steps file writes them and in SI units, and a note.
STEPS = (
    ("base.csv", "", "", 0.0, 0.0, "as delivered"),
    ("load_5p.csv", "5 pF", "", 5e-12, 0.0, "C0G capacitor across the output"),
    ("load_15p.csv", "15 pF", "", 15e-12, 0.0, "10 pF beside it"),
    ("rz_minus_400.csv", "", "-400 Ohm", 0.0, -400.0, "trim code 2 instead of 6"),
    ("rz_plus_500.csv", "", "500 Ohm", 0.0, 500.0, "trim code 11 instead of 6"),
)


def sweep_of(
    part: dict[str, float], rz_ohm: float, seed: int, *, load_added_f: float = 0.0
) -> tuple[np.ndarray, np.ndarray]:
    """Frequency in hertz and loop gain of a part on this bench."""
    nominal = fitamp.read_design(HERE.parent / "data_examples" / "line_buffer.toml").elements
    assert nominal is not None
    changed = {name: getattr(nominal, name) * factor for name, factor in part.items()}
    changed["CL"] += PROBE_F + load_added_f
    elements = nominal.with_changes(**changed, Rz=rz_ohm, delay_s=CABLE_S)
    gain = elements.transfer().evaluate(FREQ_HZ)
    return FREQ_HZ, fitamp.simulate_bench(gain, NOISE, np.random.default_rng(seed))


def nulling_resistance(part: dict[str, float]) -> float:
    """1/gm2 of a part."""
    nominal = fitamp.read_design(HERE.parent / "data_examples" / "line_buffer.toml").elements
    assert nominal is not None
    return 1 / (nominal.gm2 * part["gm2"])


def decibels(gain: np.ndarray) -> np.ndarray:
    """20 log10 of the magnitude."""
    return 20 * np.log10(np.abs(gain))


def comma_table(gain: np.ndarray, what: str = "part a, loop gain") -> str:
    """Comma-separated, preamble of comments, units in the header."""
    rows = [
        f"{f:.6g},{m:.5f},{p:.4f}" for f, m, p in zip(FREQ_HZ, decibels(gain), np.angle(gain, deg=True), strict=True)
    ]
    head = [f"# line buffer, {what} (invented data)", "# injection at the output, 64 averages"]
    return "\n".join([*head, "Frequency (Hz),Gain (dB),Phase (deg)", *rows]) + "\n"


def semicolon_table(gain: np.ndarray) -> str:
    """Semicolons and decimal commas; this read-out shows −T."""
    shown = -gain
    angle = np.degrees(np.unwrap(np.angle(shown)))
    rows = [f"{f / 1e3:.6g};{m:.5f};{p:.4f}" for f, m, p in zip(FREQ_HZ, decibels(gain), angle, strict=True)]
    head = ["line buffer, part b (invented data)", "2026-03-12 14:05", ""]
    return "\n".join([*head, "Freq [kHz];Magnitude [dB];Phase [°]", *rows]).replace(".", ",") + "\n"


def tab_table(gain: np.ndarray) -> str:
    """Tabs, a row of units, real and imaginary part, falling frequency."""
    rows = [f"{f / 1e6:.9g}\t{t.real:.9g}\t{t.imag:.9g}" for f, t in zip(FREQ_HZ, gain, strict=True)]
    head = ["! line buffer, part a again (invented data)", "f\tRe\tIm", "MHz\tV/V\tV/V"]
    return "\n".join([*head, *reversed(rows)]) + "\n"


def one_port(gain: np.ndarray) -> str:
    """Touchstone 1.x, one port."""
    rows = [f"{f / 1e3:.9g} {t.real:.9g} {t.imag:.9g}" for f, t in zip(FREQ_HZ, gain, strict=True)]
    head = ["! line buffer, part c, loop gain as S11 (invented data)", "# kHz S RI R 50"]
    return "\n".join([*head, *rows]) + "\n"


def two_port(gain: np.ndarray) -> str:
    """Touchstone 1.x, two ports in the order 11 21 12 22; the loop gain is S21."""
    level, angle = decibels(gain), np.angle(gain, deg=True)
    rows = [
        f"{f / 1e6:.9g}  -42.1 3.0  {m:.6f} {p:.5f}  -80.0 0.0  -38.7 -5.0"
        for f, m, p in zip(FREQ_HZ, level, angle, strict=True)
    ]
    head = ["! line buffer, part d, loop gain as S21 (invented data)", "# MHz S DB R 50"]
    return "\n".join([*head, *rows]) + "\n"


def stepped_files() -> dict[str, str]:
    """Part f: a sweep for each step, and the steps file, by name."""
    rows = [
        "# line buffer, part f: what was added in which sweep (invented data)",
        "file,load_added_F,rz_added_ohm,temp_C,note",
    ]
    files = {}
    for number, (name, load, resistance, load_added_f, rz_added_ohm, note) in enumerate(STEPS):
        _, gain = sweep_of(STEPPED, STEPPED_RZ_OHM + rz_added_ohm, seed=21 + number, load_added_f=load_added_f)
        files[name] = comma_table(gain, f"part f, {note}, loop gain")
        rows.append(f"{name},{load},{resistance},24,{note}")
    return files | {"steps.csv": "\n".join(rows) + "\n"}


def main() -> None:
    """Write all files."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--out", type=Path, default=HERE.parent / "data_examples")
    out: Path = parser.parse_args().out
    out.mkdir(parents=True, exist_ok=True)
    _, healthy = sweep_of(HEALTHY, 1.05 * 1300, seed=11)
    _, missing = sweep_of(OTHER, 0.0, seed=12)
    _, nulled = sweep_of(HEALTHY, nulling_resistance(HEALTHY), seed=13)
    _, too_much = sweep_of(OTHER, 2.4 * 1300, seed=14)
    _, again = sweep_of(HEALTHY, 1.05 * 1300, seed=15)
    files = {
        "part_a_healthy.csv": (comma_table(healthy), "utf-8"),
        "part_b_resistor_missing.csv": (semicolon_table(missing), "latin-1"),
        "part_c_nulled.s1p": (one_port(nulled), "ascii"),
        "part_d_too_much.s2p": (two_port(too_much), "ascii"),
        "part_e_healthy_other_bench.txt": (tab_table(again), "utf-16"),
    }
    for name, (text, encoding) in files.items():
        (out / name).write_bytes(text.encode(encoding))
        print(f"{out / name}: {len(FREQ_HZ)} points")
    folder = out / "part_f_stepped"
    folder.mkdir(exist_ok=True)
    for name, text in stepped_files().items():
        (folder / name).write_bytes(text.encode("utf-8"))
    print(f"{folder}: {len(STEPS)} sweeps and what was added in each")


if __name__ == "__main__":
    main()
