"""Touchstone files that cannot be used, and odd ones that are sound."""

from __future__ import annotations

from corpus_kinds import FREQ_3, GAIN_3, ONE_PORT, TABLE, V2, Content, Odd, packed, pickled

__all__ = ["ODD_TOUCHSTONE", "REFUSED_TOUCHSTONE", "TOUCHSTONE_OPTIONS"]

REFUSED_TOUCHSTONE: dict[str, Content] = {
    "pickle.s2p": pickled,
    "no_ports.s0p": ONE_PORT,
    "ports_unknown.ts": ONE_PORT,
    "utf16.s1p": ONE_PORT.encode("utf-16"),
    "no_option_line.s1p": "10 9 -1\n20 9 -2\n",
    "late_option_line.s1p": "10 9 -1\n# Hz S RI R 50\n20 9 -2\n",
    "second_option_line.s1p": ONE_PORT + ONE_PORT,
    "unknown_option.s1p": ONE_PORT.replace("RI", "XY"),
    "impedances.s1p": ONE_PORT.replace(" S ", " Z "),
    "negative_reference.s1p": ONE_PORT.replace("50", "-50"),
    "no_data.s1p": "# Hz S RI R 50\n! nothing\n",
    "nan.s1p": ONE_PORT + "80 nan -5\n",
    "inf.s1p": ONE_PORT + "80 inf -5\n",
    "word.s1p": ONE_PORT + "80 seven -5\n",
    "comma.s1p": ONE_PORT + "80 7,5 -5\n",
    "short_row.s1p": ONE_PORT + "80 7\n",
    "wrong_ports.s2p": ONE_PORT,
    "falls.s1p": ONE_PORT + "30 7 -5\n",
    "repeated.s1p": ONE_PORT + "40 8 -4\n",
    "negative_frequency.s1p": "# Hz S RI\n-10 9 -1\n20 9 -2\n",
    "level_beyond.s1p": "# Hz S DB\n10 60 0\n20 90000 0\n40 60 0\n",
    "binary.s1p": ONE_PORT.encode() + b"\x00\x01\x02",
    "csv.s2p": TABLE,
    "keyword_in_1.s1p": ONE_PORT.replace("10 9", "[Reference] 50\n10 9"),
    "version_3.s1p": V2.replace("2.0", "3.0"),
    "no_end.s1p": V2.replace("[End]\n", ""),
    "wrong_count.s1p": V2.replace("Frequencies] 3", "Frequencies] 4"),
    "ports_contradict.s2p": V2,
    "no_count.s1p": V2.replace("[Number of Frequencies] 3\n", ""),
    "mixed_mode.s1p": V2.replace("[Network Data]", "[Mixed-Mode Order] D2,3\n[Network Data]"),
    "after_the_end.s1p": V2 + "80 7 -5\n",
    "open_information.s1p": V2.replace("[Network", "[Begin Information]\n[Network"),
    "huge_count.s1p": V2.replace("Frequencies] 3", "Frequencies] 9999999999"),
    "huge_ports.s999p": ONE_PORT,
    "columns_and_touchstone.s1p": ONE_PORT,
    "trace_beyond.s1p": ONE_PORT,
    "trace_of_three.s3p": "# Hz S RI\n" + "10 " + "9 -1 " * 9 + "\n",
    "sweep_of_one_port.s1p": ONE_PORT,
}

# Options that they are read with.
TOUCHSTONE_OPTIONS: dict[str, tuple[str, ...]] = {
    "columns_and_touchstone.s1p": ("--columns", "f=1:Hz re=2 im=3"),
    "trace_beyond.s1p": ("--trace", "S21"),
    "sweep_of_one_port.s1p": ("--sweep", "2"),
}


ODD_TOUCHSTONE = (
    Odd(name="capitals.S1P", content=ONE_PORT.upper().replace("\n", "\r\n"), freq_hz=FREQ_3, gain=GAIN_3),
    Odd(name="packed.s1p.gz", content=packed(ONE_PORT.encode()), freq_hz=FREQ_3, gain=GAIN_3),
    Odd(
        name="comments.s1p",
        content="! <b>invented</b>\n!\n" + ONE_PORT.replace("-2", "-2 ! range"),
        freq_hz=FREQ_3,
        gain=GAIN_3,
    ),
    Odd(name="at_zero.s1p", content=ONE_PORT.replace("10 9", "0 9 0\n10 9"), freq_hz=FREQ_3, gain=GAIN_3),
    Odd(name="gigahertz_by_default.s1p", content="#\n0.5 9 0\n1 2 0\n", freq_hz=(5e8, 1e9), gain=(9, 2)),
    Odd(name="over_lines.s1p", content="# Hz S RI\n10\n9 -1\n20\n9 -2\n40 8 -4\n", freq_hz=FREQ_3, gain=GAIN_3),
    Odd(name="version_2.ts", content=V2, freq_hz=FREQ_3, gain=GAIN_3),
    Odd(
        name="information.ts",
        content=V2.replace("[Network", "[Begin Information]\n=cmd()\n[End Information]\n[Network"),
        freq_hz=FREQ_3,
        gain=GAIN_3,
    ),
    Odd(
        name="order_21.s2p",
        content="# Hz S RI\n10 0 0 9 -1 1 1 0 0\n20 0 0 9 -2 1 1 0 0\n40 0 0 8 -4 1 1 0 0\n",
        freq_hz=FREQ_3,
        gain=GAIN_3,
    ),
    Odd(
        name="back.s2p",
        content="# Hz S RI\n10 0 0 1 1 9 -1 0 0\n20 0 0 1 1 9 -2 0 0\n40 0 0 1 1 8 -4 0 0\n",
        options=("--trace", "S12"),
        freq_hz=FREQ_3,
        gain=GAIN_3,
    ),
)
