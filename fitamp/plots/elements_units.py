"""Axes in one multiple of a unit, which the label names."""

from __future__ import annotations

from matplotlib.axis import Axis
from matplotlib.ticker import FuncFormatter

__all__ = ["in_multiples"]

_PREFIXES = (
    (1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"), (1e-12, "p"), (1e-15, "f")
)  # fmt: skip
_PLAIN = {"deg": "°", "%": "%"}


def in_multiples(axis: Axis, unit: str, label: str) -> None:
    """Ticks as plain numbers in the multiple that suits the larger end."""
    factor, prefix = 1.0, ""
    if unit not in _PLAIN:
        largest = max(abs(end) for end in axis.get_view_interval())
        factor, prefix = next((one for one in _PREFIXES if one[0] <= largest), _PREFIXES[-1])
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value / factor + 0.0:.6g}".replace("-", "−")))
    axis.set_label_text(f"{label} ({prefix}{_PLAIN.get(unit, unit)})")
