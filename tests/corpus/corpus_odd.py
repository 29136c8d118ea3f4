"""Text tables that are odd but sound, with the numbers that stand in them."""

from __future__ import annotations

from corpus_kinds import DECADES, FREQ_3, GAIN_3, HEAD, ROWS, TABLE, Odd, packed

__all__ = ["ODD"]

_SEMICOLONS = TABLE.replace(",", ";")
_RUNS = "".join(f"{k},{row}\n" for row in ROWS.split() for k in ("cold", "warm"))
_ELEVEN = HEAD + "".join(f"{k},9,-{k}\n" for k in range(1, 12))
_WITHOUT_3 = tuple(k for k in range(1, 12) if k != 3)
_DB = "10,20,0\n20,0,0\n40,-20,0\n"

ODD = (
    Odd(name="old_line_ends.csv", content=TABLE.replace("\n", "\r")),
    Odd(name="windows.csv", content=TABLE.replace("\n", "\r\n")),
    Odd(name="mixed_line_ends.csv", content=TABLE.replace("\n", "\r\n", 2)),
    Odd(name="no_last_line_end.csv", content=TABLE.rstrip()),
    Odd(name="closing_ctrl_z.csv", content=TABLE + "\x1a"),
    Odd(name="byte_order_mark.csv", content="\ufeff" + TABLE),
    Odd(name="utf16_with_mark.csv", content=TABLE.encode("utf-16")),
    Odd(name="utf16_big_endian.csv", content=TABLE.encode("utf-16-be")),
    Odd(name="latin1.csv", content=("Prüfling 3\n" + TABLE).encode("latin-1")),
    Odd(name="shift_jis.csv", content=TABLE.replace("freq_hz", "周波数(Hz)").encode("cp932")),
    Odd(name="packed.csv.gz", content=packed(TABLE.encode())),
    Odd(name="packed_in_secret.csv", content=packed(TABLE.encode())),
    Odd(name="packed_in_name_only.csv.gz", content=TABLE),
    Odd(name="no_suffix", content=TABLE),
    Odd(name="spreadsheet_in_name_only.xls", content=TABLE.replace(",", "\t")),
    Odd(name="blank_lines.csv", content="\n\n" + TABLE.replace("\n", "\n\n") + " \n\n"),
    Odd(name="comments_between.csv", content=TABLE.replace("40,", "# range\n40,")),
    Odd(name="separator_line.csv", content="sep=;\n" + _SEMICOLONS),
    Odd(name="quoted.csv", content="".join('"' + line.replace(",", '","') + '"\n' for line in TABLE.split())),
    Odd(name="separator_at_ends.csv", content=TABLE.replace("\n", ",\n")),
    Odd(name="spaces.csv", content=TABLE.replace(",", "    ")),
    Odd(name="wide_spaces.csv", content=TABLE.replace(",", " , ")),
    Odd(name="closing_line.csv", content=TABLE + "END OF DATA\n"),
    Odd(name="falling.csv", content=HEAD + "".join(f"{row}\n" for row in ROWS.split()[::-1])),
    Odd(name="at_zero.csv", content=HEAD + "0,9,0\n" + ROWS),
    Odd(
        name="signs_and_points.csv",
        content=HEAD + "+10.,+9,-.1e1\n20,9.0E0,-2e+00\n040,8.000,-4\n",
        freq_hz=FREQ_3,
        gain=GAIN_3,
    ),
    Odd(
        name="long_number.csv",
        content=HEAD + f"10,9{'0' * 299},-1\n20,9,-2\n",
        freq_hz=(10, 20),
        gain=(9e299 - 1j, 9 - 2j),
    ),
    Odd(
        name="subnormal.csv",
        content=HEAD + "10,9,-5e-324\n20,9,-2\n",
        freq_hz=(10, 20),
        gain=(complex(9, -5e-324), 9 - 2j),
    ),
    Odd(
        name="decimal_comma.csv",
        content="freq_hz;re;im\n10,5;9,25;-1,5\n20;9;-2\n",
        freq_hz=(10.5, 20),
        gain=(9.25 - 1.5j, 9 - 2j),
    ),
    Odd(
        name="thousands.csv",
        content="freq_hz;re;im\n1,000.5;9;-1\n2,000,000;9;-2\n",
        freq_hz=(1000.5, 2e6),
        gain=(9 - 1j, 9 - 2j),
    ),
    Odd(
        name="thousands_by_points.csv",
        content="freq_hz;re;im\n1.000;9,5;-1\n2.000.000;9;-2\n",
        freq_hz=(1e3, 2e6),
        gain=(9.5 - 1j, 9 - 2j),
    ),
    Odd(
        name="thousands_by_apostrophe.csv",
        content="freq_hz;re;im\n1'000;9;-1\n2'000'000;9;-2\n",
        freq_hz=(1e3, 2e6),
        gain=(9 - 1j, 9 - 2j),
    ),
    Odd(
        name="prefixes.csv",
        content=HEAD + "10,9,-1\n1.2k,9,-2\n2.5M,500m,-4\n",
        freq_hz=(10, 1200, 2.5e6),
        gain=(9 - 1j, 9 - 2j, 0.5 - 4j),
    ),
    Odd(
        name="units_in_cells.csv",
        content="f,dB,Phase\n10 Hz,20 dB,0°\n1 kHz,0 dB,0°\n0.1 MHz,-20 dB,0°\n",
        freq_hz=(10, 1e3, 1e5),
        gain=(10, 1, 0.1),
    ),
    Odd(name="unicode_minus.csv", content=TABLE.replace("-", "\N{MINUS SIGN}")),
    Odd(name="full_width.csv", content=TABLE.replace("-", "\N{FULLWIDTH HYPHEN-MINUS}")),
    Odd(
        name="german.csv",
        content="Frequenz (Hz);Betrag (dB);Phase (Grad)\n" + _DB.replace(",", ";"),
        freq_hz=FREQ_3,
        gain=DECADES,
    ),
    Odd(
        name="french.csv",
        content=("Fréquence (Hz);Module (dB);Phase (degrés)\n" + _DB.replace(",", ";")).encode("latin-1"),
        freq_hz=FREQ_3,
        gain=DECADES,
    ),
    Odd(
        name="italian.csv",
        content="Frequenza (Hz);Guadagno (dB);Fase (gradi)\n" + _DB.replace(",", ";"),
        freq_hz=FREQ_3,
        gain=DECADES,
    ),
    Odd(
        name="spanish.csv",
        content="Frecuencia (Hz);Ganancia (dB);Fase (grados)\n" + _DB.replace(",", ";"),
        freq_hz=FREQ_3,
        gain=DECADES,
    ),
    Odd(name="japanese.csv", content="周波数(Hz),利得(dB),位相(度)\n" + _DB, freq_hz=FREQ_3, gain=DECADES),
    Odd(
        name="gaps.csv",
        content=_ELEVEN.replace("3,9,-3", "3,OVL,---"),
        freq_hz=_WITHOUT_3,
        gain=tuple(complex(9, -k) for k in _WITHOUT_3),
    ),
    Odd(
        name="nan_among_many.csv",
        content=_ELEVEN.replace("3,9,-3", "3,nan,nan"),
        freq_hz=_WITHOUT_3,
        gain=tuple(complex(9, -k) for k in _WITHOUT_3),
    ),
    Odd(name="complex.csv", content="freq_hz,T\n10,9-1j\n20,(9-2i)\n40,8 - 4*j\n", freq_hz=FREQ_3, gain=GAIN_3),
    Odd(name="pairs.csv", content="freq_hz;T\n10;(9,-1)\n20;(9,-2)\n40;(8,-4)\n", freq_hz=FREQ_3, gain=GAIN_3),
    Odd(
        name="other_columns.csv",
        content="no,freq_hz,re,im,state\n" + "".join(f"{k},{row},ok\n" for k, row in enumerate(ROWS.split())),
    ),
    Odd(name="second_of_two.csv", content=HEAD + "1,1,0\n2,1,0\n4,1,0\n" + TABLE, options=("--sweep", "2")),
    Odd(name="numbered.csv", content="Sweep,freq_hz,re,im\n" + _RUNS, options=("--sweep", "2")),
    Odd(
        name="traces.csv",
        content="f,a,b,c,d\n" + "".join(f"{row},0,0\n" for row in ROWS.split()),
        options=("--columns", "f=1:Hz re=a im='b'"),
    ),
    Odd(
        name="units_row.csv",
        content="Frequency;Gain;Phase\nHz;dB;deg\n" + _DB.replace(",", ";"),
        freq_hz=FREQ_3,
        gain=DECADES,
    ),
    Odd(
        name="formula_beside.csv",
        content="note,freq_hz,re,im\n" + "".join(f"=cmd()|A{k},{row}\n" for k, row in enumerate(ROWS.split())),
    ),
    Odd(name="markup_in_header.csv", content=TABLE.replace("re,", "<script>alert(1)</script> re,")),
    Odd(name="markup_in_notes.csv", content="[bold]x[/bold] <b>&amp;</b> =1+1 \u202e\n" + TABLE),
    Odd(name="=cmd()[red]&amp;'$(x)`y`.csv", content=TABLE),
    Odd(name="naïve 周波数 \N{RIGHT-TO-LEFT OVERRIDE}.csv", content=TABLE),
)
