"""What was said of many dies as a confusion table, and what that comes to."""

from __future__ import annotations

import statistics
from collections import Counter
from collections.abc import Iterable, Sequence

from fitamp import Nulling
from fitamp.comparison import Route
from judging.judged import CLEARLY, NEAR_ONE, REGIONS, Judged
from judging.making import regions

NO_FIT = "no fit"


def table(dies: Sequence[Judged]) -> str:
    """Confusion table with the share of intervals that hold the truth, and the mean error in standard errors."""
    heads = [*REGIONS, Nulling.UNDECIDED, NO_FIT, "covered", "bias"]
    widths = [max(len(head), 6) for head in heads]
    cells = "  ".join(f"{head:>{width}}" for head, width in zip(heads, widths, strict=True))
    lines = [f"{'true region':<12}  {cells}"]
    for region in REGIONS:
        row = [die for die in dies if die.region is region]
        counts = Counter(die.verdict or NO_FIT for die in row)
        texts = [str(counts[head]) for head in heads[:-2]] + [share(die.covers for die in row), bias(row)]
        cells = "  ".join(f"{text:>{width}}" for text, width in zip(texts, widths, strict=True))
        lines.append(f"{region:<12}  {cells}")
    return "\n".join(lines)


def summary(dies: Sequence[Judged]) -> str:
    """What the table comes to, one line a question."""
    wrong = [die for die in dies if die.is_wrong]
    clear = [die for die in dies if die.is_clear]
    undecided = [die for die in dies if not die.is_decided]
    numbered = [die for die in dies if die.stderr_s is not None]
    # Where the interval lies in one region and there is still no verdict, the model did not describe the sweep.
    one_region = sum(
        any(low <= die.low_s and die.high_s <= high for low, high in regions().values())
        for die in undecided
        if die.low_s is not None and die.high_s is not None
    )
    no_number = sum(die.stderr_s is None for die in undecided)
    far = f", at most {max(die.errors_off for die in wrong):.2f} standard errors from it" if wrong else ""
    clearly = f"undecided, |n − 1| > {NEAR_ONE} and {CLEARLY:g} expected standard errors from every limit"
    lines = {
        "wrong half plane": f"{sum(die.is_wrong_half_plane for die in dies)} of {len(dies)}",
        "wrong across a limit": f"{len(wrong)} of {len(dies)} ({share(die.is_wrong for die in dies)}){far}",
        clearly: (
            f"{sum(not die.is_decided for die in clear)} of {len(clear)} ({share(not die.is_decided for die in clear)})"
        ),
        "undecided in all": (
            f"{len(undecided)} of {len(dies)}: {len(undecided) - one_region - no_number} reach into several regions, "
            f"{one_region} not described by the model, {no_number} without a zero time"
        ),
        "95 % interval holds the zero time": (
            f"{share(die.covers for die in numbered)} of {len(numbered)} with a standard error, mean error "
            f"{bias(numbered)} standard errors"
        ),
        "decided by the circuit": f"{sum(die.route is Route.CIRCUIT for die in dies)} of {len(dies)}",
    }
    return "\n".join(f"{question}: {answer}" for question, answer in lines.items())


def bias(dies: Iterable[Judged]) -> str:
    """Mean error of the zero time in standard errors; a dash of none."""
    pulls = [die.pull for die in dies if die.pull is not None]
    return f"{statistics.fmean(pulls):+.2f}" if pulls else "–"


def share(flags: Iterable[bool]) -> str:
    """Share of flags that are set, in percent; a dash of none."""
    found = list(flags)
    return f"{sum(found) / len(found):.1%}" if found else "–"
