"""Pictures to files: PNG and SVG, the same bytes from the same data."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from matplotlib.figure import Figure

from fitamp.errors import UsageError
from fitamp.plots.style import drawing_style

__all__ = ["save_figures"]

# No dates: a picture changes only when its data does.
_METADATA: Mapping[str, dict[str, None]] = {"png": {}, "svg": {"Date": None}}


def save_figures(figures: Mapping[str, Figure], folder: Path) -> tuple[Path, ...]:
    """Write every figure as ``KEY.png`` and ``KEY.svg`` into an existing folder, and return the paths in that order.

    Raises
    ------
    UsageError
        When a file cannot be written.
    """
    written: list[Path] = []
    with drawing_style():
        for name, figure in figures.items():
            for form, metadata in _METADATA.items():
                path = Path(folder) / f"{name}.{form}"
                try:
                    figure.savefig(path, format=form, metadata=metadata)
                except OSError as error:
                    raise UsageError(
                        f"{path}: cannot be written ({error.strerror or error}); choose another place"
                    ) from error
                written.append(path)
    return tuple(written)
