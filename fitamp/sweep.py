"""Loop-gain sweeps: frequency in hertz against complex loop gain.

A `Sweep` is checked once, when built, and never changes. Reading files: `fitamp.importers`. Fitting: `fitamp.fitting`.
Sign: loop gain is the return ratio, positive real at DC for negative feedback.
"""

from __future__ import annotations

import html
from dataclasses import asdict, dataclass, field, replace
from enum import StrEnum
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from fitamp.arrays import ComplexArray, FloatArray, frozen_complex, frozen_float
from fitamp.errors import SweepError
from fitamp.units import si

if TYPE_CHECKING:
    import pandas as pd
    import skrf

__all__ = ["Concern", "Decision", "LeftOut", "NoiseLevels", "Origin", "Sign", "Sweep"]


class Sign(StrEnum):
    """How the read-out's sign relates to the loop gain."""

    AS_READ = "as-read"
    INVERTED = "inverted"  # the file held −T; the sweep holds T
    UNKNOWN = "unknown"  # nobody has looked yet


class Concern(StrEnum):
    """Whom a decision concerns."""

    READING = "reading"  # who wants to know how the file was understood
    RESULT = "result"  # who reads a result of the sweep
    CAUTION = "caution"  # the same reader, as a warning


@dataclass(frozen=True, slots=True, kw_only=True)
class Decision:
    """One thing that was decided while reading: what about, what was chosen, why, and whom it concerns."""

    topic: str
    choice: str
    reason: str
    concern: Concern = Concern.READING


@dataclass(frozen=True, slots=True, kw_only=True)
class LeftOut:
    """A point that is not used, with the reason; `gain` is None where the file has no reading for it."""

    f_hz: float
    gain: complex | None
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Origin:
    """Where a sweep came from. `file` is the name as given; `sha256` is of the file's bytes.

    averaged : where the sweeps came from whose average this one is
    notes : what the file says beside its numbers: lines of its preamble and comments above them, without their marks
    """

    file: str
    form: str = ""  # "csv", "touchstone", "data frame", "network", "computed", "average"
    trace: str = ""  # which columns or which S-parameter
    sha256: str | None = None
    averaged: tuple[Origin, ...] = ()
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class NoiseLevels:
    """Bench noise, all complex standard deviations for a drive of 1.

    error_channel, return_channel : additive floor of each receiver
    relative : gain errors, relative
    ratio : additive floor of the loop gain itself, as from processing after the receivers; 0 with receivers alone
    source : where the numbers come from ("estimated from the sweep", "given", "from 5 repeats")
    repeats : number of sweeps from whose differences they were estimated, 0 where not so
    """

    error_channel: float
    return_channel: float
    relative: float
    ratio: float = 0.0
    source: str = "given"
    repeats: int = 0

    def __post_init__(self) -> None:
        levels = (self.error_channel, self.return_channel, self.relative, self.ratio)
        if not all(np.isfinite(level) and level >= 0 for level in levels) or not any(levels):
            raise SweepError(f"noise levels must be finite, not negative and not all zero, but are {levels}")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sweep:
    """A checked loop-gain sweep.

    Parameters
    ----------
    freq_hz : array_like, shape (n,)
        Strictly rising, finite, above 0.
    gain : array_like of complex, shape (n,)
        Loop gain T, finite; positive real at DC for negative feedback.
    noise
        What is known of the noise; None where fitting has to estimate it.
    origin, sign, decisions, left_out
        Where the data came from, how its sign was settled, what was decided while reading, what was left out.

    Raises
    ------
    SweepError
        When the arrays do not have that shape or content; the message names the first point at fault.
    """

    freq_hz: FloatArray
    gain: ComplexArray
    noise: NoiseLevels | None = None
    origin: Origin = field(default_factory=lambda: Origin(file="(in memory)", form="computed"))
    sign: Sign = Sign.UNKNOWN
    decisions: tuple[Decision, ...] = ()
    left_out: tuple[LeftOut, ...] = ()

    def __post_init__(self) -> None:
        freq_hz, gain = frozen_float(self.freq_hz), frozen_complex(self.gain)
        object.__setattr__(self, "freq_hz", freq_hz)
        object.__setattr__(self, "gain", gain)
        _check(self.origin.file, freq_hz, gain)

    def __len__(self) -> int:
        return len(self.freq_hz)

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Sweep):
            return NotImplemented
        return (
            np.array_equal(self.freq_hz, other.freq_hz)
            and np.array_equal(self.gain, other.gain)
            and self._facts() == other._facts()
        )

    __hash__ = None  # type: ignore[assignment]  # arrays have no hash; two equal sweeps must not differ in one

    def _facts(self) -> tuple[object, ...]:
        return (self.noise, self.origin, self.sign, self.decisions, self.left_out)

    @property
    def f_min_hz(self) -> float:
        """Lowest frequency used."""
        return float(self.freq_hz[0])

    @property
    def f_max_hz(self) -> float:
        """Highest frequency used."""
        return float(self.freq_hz[-1])

    @property
    def magnitude_db(self) -> FloatArray:
        """20 log10 \\|T\\|, shape (n,)."""
        with np.errstate(divide="ignore"):
            return np.asarray(20 * np.log10(np.abs(self.gain)), dtype=float)

    @property
    def phase_deg(self) -> FloatArray:
        """Unwrapped phase in degrees, shape (n,), the first point within ±180°."""
        return np.asarray(np.degrees(np.unwrap(np.angle(self.gain))), dtype=float)

    def with_decision(self, topic: str, choice: str, reason: str, *, concern: Concern = Concern.READING) -> Sweep:
        """Return this sweep with one more decision noted."""
        decision = Decision(topic=topic, choice=choice, reason=reason, concern=concern)
        return replace(self, decisions=(*self.decisions, decision))

    def without(self, keep: ArrayLike, reason: str) -> Sweep:
        """Return this sweep with the points where `keep` is False left out for `reason`.

        Parameters
        ----------
        keep : array_like of bool, shape (n,)
        """
        kept = np.asarray(keep, dtype=bool)
        dropped = tuple(
            LeftOut(f_hz=float(f), gain=complex(t), reason=reason)
            for f, t in zip(self.freq_hz[~kept], self.gain[~kept], strict=True)
        )
        return replace(self, freq_hz=self.freq_hz[kept], gain=self.gain[kept], left_out=self.left_out + dropped)

    def to_frame(self) -> pd.DataFrame:
        """Return a DataFrame with columns f_hz, real, imag, magnitude_db, phase_deg; the rest goes into ``attrs``."""
        import pandas as pd

        frame = pd.DataFrame(
            {
                "f_hz": self.freq_hz,
                "real": self.gain.real,
                "imag": self.gain.imag,
                "magnitude_db": self.magnitude_db,
                "phase_deg": self.phase_deg,
            }
        )
        frame.attrs["fitamp"] = {
            "noise": asdict(self.noise) if self.noise else None,
            "origin": asdict(self.origin),
            "sign": self.sign.value,
            "decisions": [asdict(decision) for decision in self.decisions],
            "left_out": [
                {
                    "f_hz": p.f_hz,
                    "real": None if p.gain is None else p.gain.real,
                    "imag": None if p.gain is None else p.gain.imag,
                    "reason": p.reason,
                }
                for p in self.left_out
            ],
        }
        return frame

    @classmethod
    def from_frame(cls, frame: pd.DataFrame) -> Sweep:
        """Build a sweep from a DataFrame with columns f_hz, real, imag (V/V); ``attrs`` of `to_frame` are taken up.

        Raises
        ------
        SweepError
            When a column is missing or a value is not usable.
        """
        missing = {"f_hz", "real", "imag"} - set(map(str, frame.columns))
        if missing:
            raise SweepError(f"data frame lacks column {', '.join(sorted(missing))}; expected f_hz, real, imag")
        facts: dict[str, Any] = frame.attrs.get("fitamp") or {"origin": {"file": "(data frame)", "form": "data frame"}}
        gain = frame["real"].to_numpy(dtype=float) + 1j * frame["imag"].to_numpy(dtype=float)
        return cls(
            freq_hz=frame["f_hz"].to_numpy(dtype=float),
            gain=gain,
            noise=NoiseLevels(**facts["noise"]) if facts.get("noise") else None,
            origin=_origin(facts["origin"]),
            sign=Sign(facts.get("sign", Sign.UNKNOWN)),
            decisions=tuple(Decision(**decision) for decision in facts.get("decisions", ())),
            left_out=tuple(
                LeftOut(
                    f_hz=p["f_hz"],
                    gain=None if p["real"] is None else complex(p["real"], p["imag"]),
                    reason=p["reason"],
                )
                for p in facts.get("left_out", ())
            ),
        )

    def to_network(self) -> skrf.Network:
        """Return a one-port scikit-rf Network whose S11 is the loop gain (its 50 Ω has no meaning here)."""
        import skrf

        return skrf.Network(f=self.freq_hz, f_unit="Hz", s=self.gain[:, np.newaxis, np.newaxis], name=self.origin.file)

    @classmethod
    def from_network(cls, network: skrf.Network, *, port_out: int = 0, port_in: int = 0) -> Sweep:
        """Build a sweep from one S-parameter of a scikit-rf Network (ports counted from 0, as scikit-rf does)."""
        trace = f"S{port_out + 1}{port_in + 1}"
        origin = Origin(file=network.name or "(network)", form="network", trace=trace)
        return cls(freq_hz=network.f, gain=network.s[:, port_out, port_in], origin=origin)

    def _summary(self) -> list[tuple[str, str]]:
        rows = [
            ("file", self.origin.file),
            ("points", f"{len(self)} used, {len(self.left_out)} left out"),
            ("band", f"{si(self.f_min_hz, 'Hz')} to {si(self.f_max_hz, 'Hz')}"),
            ("loop gain", f"{self.magnitude_db[0]:.1f} dB to {self.magnitude_db[-1]:.1f} dB, low end to high end"),
            ("sign", self.sign.value),
        ]
        rows += [(decision.topic, f"{decision.choice} ({decision.reason})") for decision in self.decisions]
        return rows

    def __str__(self) -> str:
        rows = self._summary()
        width = max(len(name) for name, _ in rows)
        return "\n".join(f"{name:<{width}}  {text}" for name, text in rows)

    __repr__ = __str__

    def _repr_html_(self) -> str:
        cells = (f"<tr><th>{html.escape(n)}</th><td>{html.escape(t)}</td></tr>" for n, t in self._summary())
        return f"<table>{''.join(cells)}</table>"


def _origin(facts: dict[str, Any]) -> Origin:
    averaged = tuple(_origin(part) for part in facts.get("averaged", ()))
    return Origin(**(facts | {"averaged": averaged, "notes": tuple(facts.get("notes", ()))}))


def _check(name: str, freq_hz: FloatArray, gain: ComplexArray) -> None:
    if freq_hz.ndim != 1 or gain.ndim != 1 or len(freq_hz) != len(gain):
        raise SweepError(
            f"{name}: frequency has shape {freq_hz.shape} and gain {gain.shape}; expected two columns of one length"
        )
    if len(freq_hz) == 0:
        raise SweepError(f"{name}: no points; a sweep needs at least one")
    for fault, text in (
        (~np.isfinite(freq_hz), "frequency is not finite"),
        (freq_hz <= 0, "frequency must be above 0 Hz"),
        (~np.isfinite(gain), "loop gain is not finite"),
    ):
        if fault.any():
            index = int(np.argmax(fault))
            raise SweepError(f"{name}, point {index + 1} ({freq_hz[index]:g} Hz): {text}; leave the point out")
    falls = np.diff(freq_hz) <= 0
    if falls.any():
        index = int(np.argmax(falls)) + 1
        raise SweepError(
            f"{name}, point {index + 1}: frequency must rise, but {freq_hz[index]:g} Hz follows "
            f"{freq_hz[index - 1]:g} Hz; sort the points or split the sweep"
        )
