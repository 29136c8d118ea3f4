"""Design files that cannot be used."""

from __future__ import annotations

from corpus_kinds import Content, directory, huge, nothing, pickled

__all__ = ["DESIGNS"]

_ELEMENTS = """
[elements]
gm1 = "150 uS"
R1 = "1 MOhm"
C1 = "200 fF"
gm2 = "1.6 mS"
R2 = "50 kOhm"
CL = "4 pF"
Cc = "1.8 pF"
Rz = "1.3 kOhm"
"""
_ROOTS = """
[designed]
dc_gain = "82 dB"
pole1 = "1.1 kHz"
pole2 = "40 MHz"
zero = "131 MHz"
half_plane = "left"
"""

DESIGNS: dict[str, Content] = {
    "not_there.toml": nothing,
    "folder.toml": directory,
    "empty.toml": "",
    "huge.toml": huge,
    "pickle.toml": pickled,
    "binary.toml": bytes(range(256)),
    "latin1.toml": (_ELEMENTS + "# Größe\n").encode("latin-1"),
    "utf16.toml": _ELEMENTS.encode("utf-16"),
    "a_sweep.toml": "freq_hz,re,im\n10,9,-1\n",
    "json.toml": '{"elements": {"gm1": "150 uS"}}',
    "yaml.toml": "elements:\n  gm1: !!python/object/apply:os.system ['true']\n",
    "open_quote.toml": _ELEMENTS.replace('"1 MOhm"', '"1 MOhm'),
    "open_table.toml": _ELEMENTS.replace("[elements]", "[elements"),
    "key_twice.toml": _ELEMENTS + 'R1 = "2 MOhm"\n',
    "table_twice.toml": _ELEMENTS + _ELEMENTS,
    "both.toml": _ELEMENTS + _ROOTS,
    "neither.toml": "[loop]\nbeta = 1.0\n",
    "no_heading.toml": _ELEMENTS.replace("[elements]", ""),
    "missing_element.toml": _ELEMENTS.replace('R2 = "50 kOhm"\n', ""),
    "unknown_element.toml": _ELEMENTS + 'R3 = "1 kOhm"\n',
    "unknown_table.toml": _ELEMENTS + "[elemnts]\n",
    "array_of_tables.toml": _ELEMENTS.replace("[elements]", "[[elements]]"),
    "bare_number.toml": _ELEMENTS.replace('"1 MOhm"', "1e6"),
    "no_unit.toml": _ELEMENTS.replace('"1 MOhm"', '"1"'),
    "wrong_unit.toml": _ELEMENTS.replace('"1 MOhm"', '"1 MHz"'),
    "negative.toml": _ELEMENTS.replace('"1 MOhm"', '"-1 MOhm"'),
    "zero.toml": _ELEMENTS.replace('"1 MOhm"', '"0 Ohm"'),
    "nan.toml": _ELEMENTS.replace('"1 MOhm"', '"nan Ohm"'),
    "inf.toml": _ELEMENTS.replace('"1 MOhm"', "inf"),
    "true.toml": _ELEMENTS.replace('"1 MOhm"', "true"),
    "date.toml": _ELEMENTS.replace('"1 MOhm"', "2026-01-05"),
    "list.toml": _ELEMENTS.replace('"1 MOhm"', '["1 MOhm", "2 MOhm"]'),
    "expression.toml": _ELEMENTS.replace('"1 MOhm"', '"2 * 0.5 MOhm"'),
    "code.toml": _ELEMENTS.replace('"1 MOhm"', "\"__import__('os').getcwd()\""),
    "comma.toml": _ELEMENTS.replace('"1.6 mS"', '"1,6 mS"'),
    "endless_digits.toml": _ELEMENTS.replace('"1 MOhm"', "9" * 10_000),
    "deep.toml": "a = " + "[" * 20_000,
    "spread_of_everything.toml": _ELEMENTS.replace('"1 MOhm"', '{ value = "1 MOhm", spread = "900 %" }'),
    "unknown_part.toml": _ELEMENTS.replace('"1 MOhm"', '{ value = "1 MOhm", sigma = "9 %" }'),
    "limits_crossed.toml": _ELEMENTS + "[limits]\nphase_margin_deg = [90, 60]\n",
    "unknown_limit.toml": _ELEMENTS + "[limits]\nslew_rate = [1, 2]\n",
    "negative_delay.toml": _ELEMENTS + '[bench]\ndelay = "-1 ns"\n',
    "control_characters.toml": '[about]\nname = "a\\u001b[31mb"\n' + _ELEMENTS,
    "half_plane.toml": _ROOTS.replace('"left"', '"<b>left</b>"'),
    "poles_crossed.toml": _ROOTS.replace('"40 MHz"', '"40 Hz"'),
    "unstable.toml": _ROOTS.replace('"1.1 kHz"', '"-1.1 kHz"'),
}
