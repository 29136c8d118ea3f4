"""What was fitted beside the two poles and the zero, in words."""

from __future__ import annotations

import math
from collections.abc import Iterator

from fitamp.fitting import LoopFit, Root
from fitamp.fitting.result import text_of
from fitamp.units import si, si_with_error

__all__ = ["further_sentences", "model_in_words"]


def further_sentences(fit: LoopFit) -> Iterator[str]:
    """One sentence for each resonance, doublet and range step."""
    for pole, zero in zip(fit.resonant_poles[::2], fit.resonant_zeros[::2], strict=True):
        quality = abs(pole.value_hz) / abs(2 * pole.value_hz.real)
        yield f"resonance: poles at {_distance(pole)} (Q = {quality:.3g}), zeros at {_distance(zero)}"
    for pole, zero in zip(fit.doublet_poles, fit.doublet_zeros, strict=True):
        yield f"doublet: pole at {_distance(pole)}, zero at {_distance(zero)}"
    for pole in fit.further_poles:
        yield f"further pole: at {_distance(pole)}"
    for step in fit.range_steps:
        size, turn = text_of("size_db", step.size_db), text_of("turn_deg", step.turn_deg)
        yield f"range step: at {si(step.f_hz, 'Hz')} by {size} and {turn}, taken off above it"


def model_in_words(fit: LoopFit) -> str:
    """The model as "two poles, one zero and a resonance"."""
    parts = ["two poles, one zero"]
    for count, one, many in (
        (len(fit.resonant_poles) // 2, "a resonance", "resonances"),
        (len(fit.doublet_poles), "a further pole and zero", "further pole-zero pairs"),
        (len(fit.further_poles), "a further pole", "further poles"),
        (len(fit.range_steps), "a range step", "range steps"),
    ):
        if count:
            parts.append(one if count == 1 else f"{count} {many}")
    return " and ".join(parts)


def _distance(root: Root) -> str:
    return si_with_error(abs(root.value_hz), _distance_error(root), "Hz")


def _distance_error(root: Root) -> float | None:
    """Standard error of a root's distance from the origin."""
    if root.covariance is None:
        return None
    direction = (root.value_hz.real / abs(root.value_hz), root.value_hz.imag / abs(root.value_hz))
    variance = sum(direction[i] * direction[j] * float(root.covariance[i, j]) for i in range(2) for j in range(2))
    return math.sqrt(max(variance, 0.0))
