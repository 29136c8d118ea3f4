"""What all pictures share: colours, text that stays text, lettered size, and axes placed in inches.

Positions are set here, not by a layout engine: every text is measured once, so that drawing takes one pass.
Text from files is drawn as it stands: no mathematics, no control characters, nothing the font cannot draw.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from functools import lru_cache
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg, RendererAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties, findfont, get_font

from fitamp.report.tables import printable

__all__ = [
    "COLOURS",
    "DPI",
    "SIZE_PT",
    "SMALL_PT",
    "WIDTH_IN",
    "drawing_style",
    "inert",
    "new_figure",
    "place_axes",
    "shortened",
    "text_width_in",
    "wrapped",
]

WIDTH_IN = 9.2
DPI = 130
SIZE_PT = 10.0
SMALL_PT = 9.0
FAMILY = "DejaVu Sans"  # comes with matplotlib, so pictures look alike everywhere

# M. Okabe and K. Ito, Color Universal Design (2008): told apart with every common colour vision. Roles differ in
# lightness and in line style or fill as well, so that a grey print still reads.
COLOURS: Mapping[str, str] = {
    "measured": "#000000",
    "fitted": "#0072B2",
    "designed": "#E69F00",
    "left out": "#D55E00",
    "good": "#009E73",
    "bad": "#D55E00",
    "off": "#E69F00",
    "gone": "#CC79A7",
    "open": "#999999",
    "grid": "#DDDDDD",
    "ink": "#222222",
}

# Any: matplotlib's stubs list its settings by name, and the list differs from version to version.
_STYLE: Any = {
    "font.family": FAMILY,
    "font.size": SMALL_PT,
    "axes.labelsize": SIZE_PT,
    "axes.edgecolor": "#666666",
    "axes.linewidth": 0.8,
    "axes.axisbelow": True,
    "grid.color": COLOURS["grid"],
    "grid.linewidth": 0.6,
    "xtick.labelsize": SMALL_PT,
    "ytick.labelsize": SMALL_PT,
    "legend.fontsize": SMALL_PT,
    "text.color": COLOURS["ink"],
    "text.parse_math": False,  # a "$" in a file name is a dollar
    "text.usetex": False,
    "hatch.linewidth": 0.8,
    "svg.fonttype": "path",  # the same letters on every machine
    "svg.hashsalt": "fitamp",  # the same file from the same data
    "figure.dpi": DPI,
    "savefig.dpi": "figure",
}


@contextmanager
def drawing_style() -> Iterator[None]:
    """fitamp's drawing settings, whatever the user's own are; those are back when the block ends."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_STYLE)
        yield


def new_figure(height_in: float = 1.0) -> Figure:
    """A figure of fitamp's width on the Agg canvas: it needs no display and no backend."""
    figure = Figure(figsize=(WIDTH_IN, height_in), dpi=DPI)
    FigureCanvasAgg(figure)
    return figure


def place_axes(figure: Figure, *, left: float, bottom: float, width: float, height: float) -> Axes:
    """Axes at a place given in inches from the figure's lower left corner."""
    total_width, total_height = figure.get_size_inches()
    box = (left / total_width, bottom / total_height, width / total_width, height / total_height)
    return figure.add_axes(box)


def inert(text: str) -> str:
    """Text from a file, safe to draw: control characters as escapes, characters the font lacks as "?"."""
    return "".join(c if _has_glyph(c) else "?" for c in printable(text))


@lru_cache(maxsize=1024)
def _has_glyph(character: str) -> bool:
    return get_font(findfont(FAMILY)).get_char_index(ord(character)) != 0


@lru_cache(maxsize=1)
def _renderer() -> Any:
    renderer: Any = RendererAgg
    return renderer(10, 10, DPI)  # letters are hinted, so their width depends on the resolution


@lru_cache(maxsize=4096)
def text_width_in(text: str, size_pt: float = SMALL_PT, weight: str = "normal") -> float:
    """Width of one line of text in inches."""
    font = FontProperties(family=FAMILY, size=size_pt, weight=weight)
    width, _, _ = _renderer().get_text_width_height_descent(text, font, False)
    return float(width) / DPI


def shortened(text: str, width_in: float, size_pt: float = SMALL_PT, weight: str = "normal") -> str:
    """Text made to fit by leaving out its middle: beginning and end of a file name tell files apart."""
    if text_width_in(text, size_pt, weight) <= width_in:
        return text
    low, high = 0, len(text)
    while high - low > 1:
        middle = (low + high) // 2
        if text_width_in(_without_middle(text, middle), size_pt, weight) <= width_in:
            low = middle
        else:
            high = middle
    return _without_middle(text, low)


def _without_middle(text: str, kept: int) -> str:
    head, tail = (kept + 1) // 2, kept // 2
    return f"{text[:head]}…{text[len(text) - tail :]}"


def wrapped(text: str, width_in: float, size_pt: float = SIZE_PT, weight: str = "normal") -> list[str]:
    """Lines of at most `width_in`; a word that is too long for a line loses its middle."""
    lines: list[str] = []
    for word in text.split():
        fitting = shortened(word, width_in, size_pt, weight)
        longer = f"{lines[-1]} {fitting}" if lines else fitting
        if lines and text_width_in(longer, size_pt, weight) <= width_in:
            lines[-1] = longer
        else:
            lines.append(fitting)
    return lines
