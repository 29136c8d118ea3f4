"""The benches of the benchmark: what is true, what the bench adds, what is judged. All of it is invented.

Common to all unless a scenario says otherwise: 281 points from 10 Hz to 100 MHz; 82 dB, poles at 1.2 kHz and 58 MHz, a
zero at twice pole 2 in the left half plane; receiver floors of 2e-5 for a drive of 1, gain error 0.1 %.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from enum import StrEnum

import numpy as np

import fitamp
from benchmarking.bound import CORE, GaussianPrior, cramer_rao, loop_gain

__all__ = ["NOISE", "SCENARIOS", "Judged", "Scenario"]

NOISE = fitamp.NoiseLevels(error_channel=2e-5, return_channel=2e-5, relative=1e-3)
BAND_HZ, POINTS = (10.0, 100e6), 281
POLE2_HZ = 58e6
# Mains lines in the error channel, for a drive of 1: there they make 1.2 and 0.6 of the error that the loop leaves.
MAINS_HZ = {50.0: 1e-4, 150.0: 5e-5}
GLITCHES_HZ = (2e6, 40e6)
GLITCH = 0.3


class Judged(StrEnum):
    """Quantities that are judged; the values are fitamp's names of them."""

    DC_GAIN = "dc_gain"
    GAIN_BANDWIDTH = "gain_bandwidth_hz"
    POLE1 = "pole1_hz"
    POLE2 = "pole2_hz"
    ZERO_TIME = "zero_time_s"
    SPLIT = "zero_pole2_split_s"

    @property
    def label(self) -> str:
        """Short name for a table's head."""
        return _LABELS[self]

    def of(self, values: Mapping[str, float]) -> float:
        """From (dc_gain, pole1_hz, pole2_hz, zero_time_s); works for numbers that carry an error with them, too."""
        if self is Judged.GAIN_BANDWIDTH:
            return values["dc_gain"] * values["pole1_hz"]
        if self is Judged.SPLIT:
            return values["zero_time_s"] - 1 / (2 * math.pi * values["pole2_hz"])
        return values[self.value]


_LABELS = {
    Judged.DC_GAIN: "T0",
    Judged.GAIN_BANDWIDTH: "GBW",
    Judged.POLE1: "p1",
    Judged.POLE2: "p2",
    Judged.ZERO_TIME: "τz",
    Judged.SPLIT: "split",
}

Disturbance = Callable[[np.ndarray, np.ndarray, np.random.Generator], np.ndarray]
ALL_FOUR = (Judged.DC_GAIN, Judged.POLE1, Judged.POLE2, Judged.ZERO_TIME)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Scenario:
    """One bench.

    judged : what the tables show
    free : names of the truth that the bound takes as unknown
    priors : what is known of them; the true values are drawn accordingly by `draw`
    disturb : what comes on top of the noise, (freq_hz, gain, rng) to gain
    spoilt_hz : frequencies whose points the bound does without
    far_pole, delay : what fitamp is told
    real_poles, pairs : order that the rational fits are told
    pole2_known : whether a pole 2 that is a factor of 2 off counts as failure
    """

    name: str
    title: str
    truth: Mapping[str, float]
    note: str = ""
    band_hz: tuple[float, float] = BAND_HZ
    points: int = POINTS
    judged: tuple[Judged, ...] = ALL_FOUR
    free: tuple[str, ...] = CORE
    priors: tuple[GaussianPrior, ...] = ()
    draw: Callable[[np.random.Generator], Mapping[str, float]] | None = None
    disturb: Disturbance | None = None
    spoilt_hz: tuple[float, ...] = ()
    far_pole: fitamp.FarPolePrior | None = None
    delay: fitamp.DelayPrior | None = None
    real_poles: int = 2
    pairs: int = 0
    pole2_known: bool = True

    @property
    def freq_hz(self) -> np.ndarray:
        """Frequencies of the sweep, logarithmically spaced."""
        return np.geomspace(*self.band_hz, self.points)

    def measure(self, rng: np.random.Generator) -> np.ndarray:
        """One noisy sweep's loop gain, shape (n,)."""
        truth = {**self.truth, **(self.draw(rng) if self.draw else {})}
        gain = fitamp.simulate_bench(loop_gain(self.freq_hz, truth), NOISE, rng)
        return gain if self.disturb is None else self.disturb(self.freq_hz, gain, rng)

    def true_values(self) -> np.ndarray:
        """What is to be found, in the order of `judged`."""
        return np.array([quantity.of(self.truth) for quantity in self.judged])

    def bound(self) -> np.ndarray:
        """Cramér–Rao bound of each judged quantity."""
        keep = np.ones(len(self.freq_hz), dtype=bool)
        keep[[_nearest(self.freq_hz, spoilt) for spoilt in self.spoilt_hz]] = False
        quantities = [quantity.of for quantity in self.judged]
        return cramer_rao(self.freq_hz[keep], self.truth, NOISE, quantities, free=self.free, priors=self.priors)


def _nearest(freq_hz: np.ndarray, wanted_hz: float) -> int:
    return int(np.argmin(np.abs(np.log(freq_hz / wanted_hz))))


def _truth(zero_time_s: float, **nuisances: float) -> dict[str, float]:
    core = {"dc_gain": 10 ** (82 / 20), "pole1_hz": 1.2e3, "pole2_hz": POLE2_HZ, "zero_time_s": zero_time_s}
    return {**core, **nuisances}


LEFT_S = 1 / (2 * math.pi * 2 * POLE2_HZ)


def _with_spurs(freq_hz: np.ndarray, gain: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """Mains lines in the error channel and single readings 30 % off, all with random phase."""
    gain = gain.copy()
    for line_hz, level in MAINS_HZ.items():
        index = _nearest(freq_hz, line_hz)
        # error = 1/(1+T); error and return still sum to the drive of 1.
        error = 1 / (1 + gain[index]) + level * np.exp(2j * np.pi * rng.random())
        gain[index] = 1 / error - 1
    for glitch_hz in GLITCHES_HZ:
        gain[_nearest(freq_hz, glitch_hz)] *= 1 + GLITCH * np.exp(2j * np.pi * rng.random())
    return gain


# A circuit with the common poles and zero whose third pole lies at 300 MHz, and how well its elements are known.
CIRCUIT = fitamp.Elements(
    gm1=177.658e-6, R1=2.22016e6, C1=434.838e-15, gm2=1.59588e-3, R2=20e3, CL=4e-12, Cc=1.8e-12, Rz=1388.85
)
SPREAD = 0.06
SPREAD_ELEMENTS = ("R1", "C1", "gm2", "R2", "CL", "Cc")


def _far_pole_s(elements: fitamp.Elements, zero_time_s: float) -> float:
    """a3/a2 of the circuit whose nulling resistor gives this zero time."""
    rz_ohm = zero_time_s / elements.Cc + 1 / elements.gm2
    _, denominator = elements.with_changes(Rz=rz_ohm).transfer().polynomials()
    return float(denominator[3] / denominator[2])


def _third_pole() -> Scenario:
    """The far-pole time follows the zero time, as both rise with the resistor, and scatters with the elements."""
    loop = CIRCUIT.transfer()
    zero_time_s, step_s = CIRCUIT.zero_time_s, 0.01 * CIRCUIT.zero_time_s
    here_s = _far_pole_s(CIRCUIT, zero_time_s)
    slope = (_far_pole_s(CIRCUIT, zero_time_s + step_s) - here_s) / step_s
    moves = [
        _far_pole_s(CIRCUIT.with_changes(**{name: getattr(CIRCUIT, name) * (1 + SPREAD)}), zero_time_s) - here_s
        for name in SPREAD_ELEMENTS
    ]
    sd_s = float(np.linalg.norm(moves))
    core = (loop.dc_gain, abs(loop.poles_hz[0]), abs(loop.poles_hz[1]), zero_time_s)
    return Scenario(
        name="third-pole",
        title="third pole at 3 times the top of the band",
        note="fitamp: far-pole prior of the circuit with elements known to 6 %; rational fits: 3 poles",
        truth={**dict(zip(CORE, core, strict=True)), "far_pole_s": here_s},
        free=(*CORE, "far_pole_s"),
        priors=(GaussianPrior(weights={"far_pole_s": 1.0, "zero_time_s": -slope}, sd=sd_s),),
        draw=lambda rng: {"far_pole_s": here_s + sd_s * rng.standard_normal()},
        far_pole=fitamp.FarPolePrior(intercept_s=here_s - slope * zero_time_s, slope=slope, sd_s=sd_s),
        delay=fitamp.DelayPrior(),
        real_poles=3,
    )


def _scenarios() -> tuple[Scenario, ...]:
    left = Scenario(name="left-zero", title="zero at 2 × pole 2, left half plane", truth=_truth(LEFT_S))
    resonance = {"pair_pole_hz": 30e6, "pair_pole_q": 20.0, "pair_zero_hz": 30.6e6, "pair_zero_q": 20.0}
    return (
        left,
        replace(left, name="right-zero", title="zero at 2 × pole 2, right half plane", truth=_truth(-LEFT_S)),
        replace(left, name="no-zero", title="n = 1: zero at infinity", truth=_truth(0.0)),
        replace(
            left,
            name="zero-on-pole2",
            title="zero on pole 2",
            note="judged: the split τz − 1/p2; the bound of it knows pole 2",
            truth=_truth(1 / (2 * math.pi * POLE2_HZ)),
            judged=(Judged.DC_GAIN, Judged.POLE1, Judged.SPLIT),
            pole2_known=False,
        ),
        replace(
            left,
            name="pole1-below",
            title="pole 1 below the band (1 MHz to 100 MHz)",
            note="judged: gain-bandwidth in place of T(0) and pole 1",
            band_hz=(1e6, 100e6),
            judged=(Judged.GAIN_BANDWIDTH, Judged.POLE2, Judged.ZERO_TIME),
        ),
        replace(
            left,
            name="pole2-above",
            title="top of the band below pole 2 (10 Hz to 20 MHz)",
            band_hz=(10.0, 20e6),
        ),
        replace(
            left,
            name="spurs",
            title="mains lines at 50 and 150 Hz, two glitches of 30 %",
            note="the bound does without the four points",
            disturb=_with_spurs,
            spoilt_hz=(*MAINS_HZ, *GLITCHES_HZ),
        ),
        replace(
            left,
            name="delay",
            title="0.5 ns of path delay",
            note="fitamp: delay free; the others do not know of it",
            truth=_truth(LEFT_S, delay_s=0.5e-9),
            free=(*CORE, "delay_s"),
            delay=fitamp.DelayPrior(sd_s=math.inf),
            far_pole=fitamp.FarPolePrior(),
        ),
        _third_pole(),
        replace(
            left,
            name="resonance",
            title="package resonance: poles at 30 MHz, zeros 2 % above, Q 20",
            note="rational fits: 2 real poles and a pair; the bound knows that there is a pair, not where",
            truth=_truth(LEFT_S, **resonance),
            free=(*CORE, *resonance),
            pairs=1,
        ),
    )


SCENARIOS = {scenario.name: scenario for scenario in _scenarios()}
