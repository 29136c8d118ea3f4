"""Whether the verdict on the zero, and on the other limits, would be decided."""

from __future__ import annotations

import math
from collections.abc import Mapping

from fitamp.comparison.verdict import regions_of, window_of
from fitamp.design import Design
from fitamp.planning.result import QUANTILE, Expected, LimitOutlook, Outlook

__all__ = ["outlook_of"]


def outlook_of(design: Design, by_name: Mapping[str, Expected], *, reach_s: float) -> Outlook:
    """Distances to the edges of verdict and limits in standard deviations.

    reach_s : standard deviation of the zero time over the parts that the plan is for
    """
    zero_time = by_name["zero_time_s"]
    centre_s, sd_s = zero_time.value, zero_time.sd
    assert centre_s is not None
    tiles = regions_of(design, window_of(design))
    region = next(verdict.value for verdict, start, to in tiles if start <= centre_s <= to)
    edges_s = sorted({end for _, start, to in tiles for end in (start, to) if math.isfinite(end)})
    limits = tuple(
        LimitOutlook(quantity=name, low=limit.low, high=limit.high, sigma=_sigma(by_name[name], limit.low, limit.high))
        for name, limit in design.limits.items()
        if name in by_name
    )
    if sd_s is None:
        return Outlook(region=region, edge_sigma=None, half_plane_sigma=None, undecided_share=None, limits=limits)
    nearest_s = min(abs(centre_s - edge) for edge in edges_s)
    return Outlook(
        region=region,
        edge_sigma=_ratio(nearest_s, sd_s),
        half_plane_sigma=_ratio(abs(centre_s), sd_s),
        undecided_share=_share_near(edges_s, QUANTILE * sd_s, centre_s, math.hypot(reach_s, sd_s)),
        limits=limits,
    )


def _share_near(edges: list[float], reach: float, mean: float, sd: float) -> float:
    """Share of a normal distribution within `reach` of any of the rising edges."""
    from scipy.special import ndtr

    share, covered = 0.0, -math.inf
    for edge in edges:
        start, end = max(edge - reach, covered), edge + reach
        covered = end
        if sd > 0 and start < end:
            share += float(ndtr((end - mean) / sd) - ndtr((start - mean) / sd))
    return share


def _sigma(one: Expected, low: float | None, high: float | None) -> float | None:
    if one.value is None or one.sd is None:
        return None
    rooms = [one.value - low] if low is not None else []
    rooms += [high - one.value] if high is not None else []
    return _ratio(min(rooms), one.sd)


def _ratio(distance: float, sd: float) -> float:
    return distance / sd if sd else math.copysign(math.inf, distance)
