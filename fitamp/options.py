"""What the command line takes as one word of text: noise levels and the path delay. Refusals are one line."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from fitamp.errors import UsageError
from fitamp.sweep import NoiseLevels
from fitamp.units import parse_quantity, parse_ratio

__all__ = ["StatedDelay", "parse_delay", "parse_noise"]

# Finer than the digits of a double; its square, as a variance, is still far from underflow.
LEAST_LEVEL = 1e-15

_NOISE_KEYS = ("error", "return", "relative", "ratio")
_NOISE_EXAMPLE = '--noise "error=2e-5 return=2e-5 relative=1e-3"'
_DELAY_EXAMPLE = '"0.4 ns", "0.4 ns +- 0.02 ns" or free'
_PLUS_MINUS = re.compile(r"\+/?[-−]|±")


@dataclass(frozen=True, slots=True, kw_only=True)
class StatedDelay:
    """Path delay as the user states it, in s: value and standard deviation; an infinite one for a free delay."""

    delay_s: float = 0.0
    sd_s: float = 0.0

    @property
    def is_free(self) -> bool:
        """Whether nothing is known of it, so that it has to be fitted."""
        return math.isinf(self.sd_s)


def parse_noise(text: str) -> NoiseLevels:
    """Read ``"error=2e-5 return=2e-5 relative=1e-3 ratio=1e-6"`` in any order; a level left out is 0.

    Raises
    ------
    UsageError
        Saying what was found and what is expected.
    """
    levels: dict[str, float] = {}
    for word in re.sub(r"\s+(?=%)", "", re.sub(r"\s*=\s*", "=", text)).split():
        key, equals, value = word.partition("=")
        if not equals or key not in _NOISE_KEYS:
            raise UsageError(f"--noise: {word!r} is not one of {', '.join(_NOISE_KEYS)} with =; as in {_NOISE_EXAMPLE}")
        if key in levels:
            raise UsageError(f"--noise: {key} is given twice; give it once")
        levels[key] = _level(key, value)
    if not any(levels.values()):
        raise UsageError(f"--noise: no level above 0 in {text!r}; expected something like {_NOISE_EXAMPLE}")
    return NoiseLevels(
        error_channel=levels.get("error", 0.0),
        return_channel=levels.get("return", 0.0),
        relative=levels.get("relative", 0.0),
        ratio=levels.get("ratio", 0.0),
    )


def parse_delay(text: str) -> StatedDelay:
    """Read ``"0.4 ns"``, ``"0.4 ns +- 0.02 ns"`` (one standard deviation; also ± and +/-), or ``"free"``.

    Raises
    ------
    UsageError
        Saying what was found and what is expected.
    """
    if text.strip().lower() == "free":
        return StatedDelay(sd_s=math.inf)
    parts = _PLUS_MINUS.split(text)
    if len(parts) > 2:
        raise UsageError(f"--delay: {text!r} has more than one ±; expected {_DELAY_EXAMPLE}")
    times = []
    for part in parts:
        try:
            time_s = parse_quantity(part.strip(), "s")
        except ValueError:
            raise UsageError(f"--delay: {part.strip()!r} is not a time with unit; expected {_DELAY_EXAMPLE}") from None
        if time_s < 0:
            raise UsageError(f"--delay: {part.strip()!r} is negative; expected 0 s or more, as in {_DELAY_EXAMPLE}")
        times.append(time_s)
    return StatedDelay(delay_s=times[0], sd_s=times[1] if len(times) > 1 else 0.0)


def _level(key: str, text: str) -> float:
    try:
        level = parse_ratio(text)
    except ValueError:
        raise UsageError(f"--noise: {key}={text} is not a number; expected something like {key}=2e-5") from None
    if level and not LEAST_LEVEL <= level <= 1:
        raise UsageError(
            f"--noise: {key}={text} is no noise level for a drive of 1; expected 0, or {LEAST_LEVEL:g} to 1, as in "
            f"{_NOISE_EXAMPLE}"
        )
    return level
