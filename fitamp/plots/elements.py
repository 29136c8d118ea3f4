"""Pictures of an element estimate: what moved, what that did, the classic lines, and what if."""

from __future__ import annotations

from matplotlib.figure import Figure

from fitamp.findings import ElementFindings
from fitamp.plots.elements_blame import blame_figure
from fitamp.plots.elements_lines import lines_figure
from fitamp.plots.elements_values import values_figure
from fitamp.plots.elements_whatif import whatif_figure

__all__ = ["blame_figure", "element_figures", "lines_figure", "values_figure", "whatif_figure"]


def element_figures(findings: ElementFindings) -> dict[str, Figure]:
    """The pictures by name: "elements"; "blame", "lines" and "what-if" where there is something to draw."""
    figures = {"elements": values_figure(findings)}
    others = {"blame": blame_figure(findings), "lines": lines_figure(findings), "what-if": whatif_figure(findings)}
    return figures | {name: figure for name, figure in others.items() if figure is not None}
