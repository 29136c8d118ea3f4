"""Under which conditions a sweep was measured, in words and for JSON: repeats, through sweep, and what to beware of."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict
from typing import Any

from fitamp.conditioning.through import ThroughDelay
from fitamp.sweep import Concern, Sweep

__all__ = ["caution_records", "cautions", "conditions", "repeat_records", "through_as_dict"]


def conditions(sweep: Sweep) -> Iterator[str]:
    """What a reader of a result has to know of how its sweep came about, a line each."""
    for decision in sweep.decisions:
        if decision.concern is Concern.RESULT:
            yield f"{decision.topic}: {decision.choice} ({decision.reason})"


def cautions(sweep: Sweep) -> Iterator[tuple[str, str]]:
    """(code, sentence) of what to beware of."""
    for decision in sweep.decisions:
        if decision.concern is Concern.CAUTION:
            yield decision.topic.replace(" ", "-"), f"{decision.choice}: {decision.reason}"


def caution_records(sweep: Sweep) -> list[dict[str, str]]:
    """`cautions` as they stand among the warnings of a result."""
    return [{"code": code, "message": message} for code, message in cautions(sweep)]


def repeat_records(sweep: Sweep) -> list[dict[str, str | None]]:
    """The sweeps of which this one is the average; none where it is itself."""
    return [{"file": origin.file, "sha256": origin.sha256} for origin in sweep.origin.averaged]


def through_as_dict(through: ThroughDelay) -> dict[str, Any]:
    """A through sweep, and in what it is no pure delay."""
    return {
        "file": through.file,
        "sha256": through.sha256,
        "points": through.points,
        "f_min_hz": through.f_min_hz,
        "f_max_hz": through.f_max_hz,
        "delay_s": through.delay_s,
        "stderr_s": through.stderr_s,
        "gain": through.gain,
        "scatter": through.scatter,
        "pure_delay": through.is_pure_delay,
        "departures": [asdict(departure) | {"kind": departure.kind.value} for departure in through.departures],
        "left_out": [{"f_hz": point.f_hz, "reason": point.reason} for point in through.left_out],
    }
