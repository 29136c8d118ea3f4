"""fitamp's own errors. Each carries the exit code that the command line returns for it.

A message is one line: where, what was found, what was expected, what to do.
"""

from __future__ import annotations

__all__ = ["DesignError", "FitError", "FitampError", "InputError", "SweepError", "UsageError"]


class FitampError(Exception):
    """Base of all errors that fitamp raises on purpose."""

    exit_code = 1


class UsageError(FitampError):
    """The command or call was put together wrongly (an option that does not fit, an output that exists)."""

    exit_code = 2


class InputError(FitampError):
    """A file cannot be used as it is; `excerpt` are lines that show the place, where one can be shown."""

    exit_code = 3
    excerpt: tuple[str, ...] = ()


class SweepError(InputError):
    """A sweep, or the file it should come from, is not usable."""


class DesignError(InputError):
    """A design file is not usable: the message names table, key, value and expectation."""


class FitError(FitampError):
    """No trustworthy result can be had from this sweep."""

    exit_code = 4
