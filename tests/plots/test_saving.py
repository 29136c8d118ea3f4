"""Pictures as files: valid, repeatable, and harmless whatever the names in them."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from dataclasses import replace
from pathlib import Path

import matplotlib as mpl
import pytest
from drawn_parts import comparison_of, comparison_with_roots, words_in
from matplotlib.text import Text

from fitamp.comparison import Comparison
from fitamp.errors import UsageError
from fitamp.plots import comparison_figures, fit_figures, save_figures
from fitamp.sweep import LeftOut, Origin

HOSTILE = "/bench/$x$ <b>bold</b> \x1b[31m\u202e\u6e2c\u5b9a " + "long_" * 60 + "$\\frac{1}{2}$ &amp;.csv"


def _hostile() -> Comparison:
    comparison = comparison_of(0)
    left_out = (LeftOut(f_hz=1e4, gain=500 - 900j, reason="<script>alert($x$)</script>\n\x00"),)
    sweep = replace(comparison.fit.sweep, origin=Origin(file=HOSTILE), left_out=left_out)
    design = replace(comparison.design, file="$a_$ <i>.toml")
    return replace(comparison, fit=replace(comparison.fit, sweep=sweep), design=design)


def test_names_of_the_pictures() -> None:
    comparison = comparison_of(0)
    assert list(comparison_figures(comparison)) == ["loop", "s-plane", "zero-path"]
    assert list(comparison_figures(comparison_with_roots())) == ["loop", "s-plane"]
    assert list(fit_figures(comparison.fit)) == ["loop", "s-plane"]


def test_every_picture_becomes_a_png_and_an_svg(tmp_path: Path) -> None:
    figures = comparison_figures(comparison_of(0))
    paths = save_figures(figures, tmp_path)
    assert [path.name for path in paths] == [f"{name}.{form}" for name in figures for form in ("png", "svg")]
    for path in paths:
        if path.suffix == ".png":
            content = path.read_bytes()
            # PNG specification: signature, then IHDR with the width as a big-endian number at byte 16.
            assert content[:8] == b"\x89PNG\r\n\x1a\n"
            assert int.from_bytes(content[16:20], "big") == 1196
        else:
            assert ET.parse(path).getroot().tag == "{http://www.w3.org/2000/svg}svg"


def test_the_same_comparison_gives_the_same_bytes(tmp_path: Path) -> None:
    contents = []
    for name in ("first", "second"):
        (tmp_path / name).mkdir()
        paths = save_figures(comparison_figures(comparison_of(0)), tmp_path / name)
        contents.append([path.read_bytes() for path in paths])
    assert contents[0] == contents[1]


def test_text_from_files_is_never_markup(tmp_path: Path) -> None:
    figures = comparison_figures(_hostile())
    for path in save_figures(figures, tmp_path):
        if path.suffix == ".svg":
            content = path.read_text(encoding="utf-8")
            assert "<b>" not in content
            assert "<script" not in content
            assert "\x1b" not in content
            tags = {element.tag.rpartition("}")[2] for element in ET.fromstring(content).iter()}
            assert not tags & {"script", "b", "i", "text"}


def test_a_dollar_is_a_dollar_and_control_characters_are_shown() -> None:
    figure = comparison_figures(_hostile())["loop"]
    texts = [text for text in figure.findobj(Text) if isinstance(text, Text)]
    assert not any(text.get_parse_math() for text in texts if "$" in text.get_text())
    words = "\n".join(words_in(figure))
    assert "/bench/$x$ <b>bold</b>" in words
    assert "<script>alert($x$)</script>\\n\\x00" in words


def test_the_users_settings_stay_as_they_are(tmp_path: Path) -> None:
    with mpl.rc_context({"font.size": 31.0, "axes.grid": True, "text.usetex": False}):
        before = dict(mpl.rcParams)
        figures = comparison_figures(comparison_of(0))
        save_figures(figures, tmp_path)
        assert dict(mpl.rcParams) == before
        assert max(float(label.get_fontsize()) for label in figures["loop"].axes[0].get_yticklabels()) < 12


def test_a_folder_that_is_not_there_is_one_clear_line(tmp_path: Path) -> None:
    figures = fit_figures(comparison_of(0).fit)
    with pytest.raises(UsageError, match=r"loop\.png: cannot be written .*; choose another place"):
        save_figures(figures, tmp_path / "nowhere")
