"""Pictures of a fit and of a comparison, drawn without a display.

Importing this package loads matplotlib; nothing else in fitamp needs it to compute.
"""

from __future__ import annotations

from matplotlib.figure import Figure

from fitamp.comparison import Comparison
from fitamp.fitting import LoopFit
from fitamp.plots.loop import loop_figure
from fitamp.plots.saving import save_figures
from fitamp.plots.splane import splane_figure
from fitamp.plots.zero_path import zero_path_figure

__all__ = [
    "comparison_figures",
    "fit_figures",
    "loop_figure",
    "save_figures",
    "splane_figure",
    "zero_path_figure",
]


def fit_figures(fit: LoopFit) -> dict[str, Figure]:
    """The pictures of a fit by name: "loop" and "s-plane"."""
    return {"loop": loop_figure(fit), "s-plane": splane_figure(fit)}


def comparison_figures(comparison: Comparison) -> dict[str, Figure]:
    """The pictures of a comparison by name: "loop", "s-plane" and, for a design with elements, "zero-path"."""
    figures = {"loop": loop_figure(comparison.fit, comparison), "s-plane": splane_figure(comparison.fit, comparison)}
    path = zero_path_figure(comparison)
    return figures if path is None else {**figures, "zero-path": path}
