"""The benchmark's tables as text: one a scenario, at most 100 columns, or one for all in Markdown.

The column "cost" is fitamp's time over the method's: how many such fits one fitamp fit costs.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from benchmarking.methods import Method
from benchmarking.running import Score
from benchmarking.scenarios import Scenario

__all__ = ["markdown_head", "markdown_rows", "text_table"]

NONE = "–"
TITLES = {
    Method.FITAMP: "fitamp",
    Method.LMFIT_DB: "lmfit dB, °",
    Method.LMFIT_LOG: "lmfit log",
    Method.VECTOR: "vector fit",
    Method.AAA: "AAA",
}
NAME_WIDTH, RMSE_WIDTH, BIAS_WIDTH, REST_WIDTH = 11, 6, 6, 7


def text_table(scenario: Scenario, scores: Sequence[Score]) -> str:
    """Head and one line a method."""
    labels = [quantity.label for quantity in scenario.judged]
    percent_width = 4 if len(labels) > 3 else 6
    groups = (("RMSE/bound", RMSE_WIDTH), ("bias/bound", BIAS_WIDTH), ("covered %", percent_width))
    rest = ("failed", "ms", "cost")
    head = " " * NAME_WIDTH + "".join(f"{title:>{width * len(labels)}} " for title, width in groups)
    names = " " * NAME_WIDTH + "".join("".join(f"{x:>{width}}" for x in labels) + " " for _, width in groups)
    lines = [f"{scenario.name}: {scenario.title}", *([f"  ({scenario.note})"] if scenario.note else []), head.rstrip()]
    lines.append(names + "".join(f"{text:>{REST_WIDTH}}" for text in rest).rstrip())
    for score in scores:
        cells = (
            "".join(f"{_number(value):>{RMSE_WIDTH}}" for value in _cells(score.rmse, labels)),
            "".join(f"{_number(value, sign='+'):>{BIAS_WIDTH}}" for value in _cells(score.bias, labels)),
            "".join(f"{_percent(value):>{percent_width}}" for value in _cells(score.coverage, labels)),
        )
        last = (f"{score.failed:.0%}", _number(score.milliseconds), _cost(score, scores))
        line = f"{TITLES[score.method]:<{NAME_WIDTH}}" + "".join(f"{cell} " for cell in cells)
        lines.append((line + "".join(f"{text:>{REST_WIDTH}}" for text in last)).rstrip())
    return "\n".join(lines)


def markdown_head() -> str:
    """First two lines of the Markdown table."""
    names = ("scenario", "method", "worst error/bound", "coverage", "failed", "cost")
    return f"| {' | '.join(names)} |\n|{'---|' * 2}{'---:|' * 4}"


def markdown_rows(scenario: Scenario, scores: Sequence[Score]) -> str:
    """One row a method: its worst root-mean-square error over the bound, the range of coverage, failures, time."""
    rows = []
    for score in scores:
        worst = NONE if score.rmse is None else _number(float(score.rmse.max()))
        coverage = NONE
        if score.coverage is not None:
            low, high = _percent(score.coverage.min()), _percent(score.coverage.max())
            coverage = f"{low} %" if low == high else f"{low}–{high} %"
        cells = (scenario.name, TITLES[score.method], worst, coverage, f"{100 * score.failed:.0f} %")
        rows.append(f"| {' | '.join((*cells, _cost(score, scores)))} |")
    return "\n".join(rows)


def _cells(values: np.ndarray | None, labels: Sequence[str]) -> list[float | None]:
    return [None] * len(labels) if values is None else [float(value) for value in values]


def _number(value: float | None, sign: str = "-") -> str:
    """Three digits in at most five characters, six with a sign."""
    if value is None:
        return NONE
    size = abs(value)
    if size >= 9999.5:
        return f"{value:{sign}.0e}".replace("e+0", "e").replace("e+", "e")
    digits = 2 if size < 9.995 else 1 if size < 99.95 else 0
    return f"{value:{sign}.{digits}f}"


def _percent(value: float | None) -> str:
    return NONE if value is None else f"{100 * value:.0f}"


def _cost(score: Score, scores: Sequence[Score]) -> str:
    """How many fits by this method take the time of one by fitamp."""
    own = [other.milliseconds for other in scores if other.method is Method.FITAMP]
    return _number(own[0] / score.milliseconds) if own else NONE
