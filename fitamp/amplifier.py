"""Small-signal elements of a Miller-compensated two-stage amplifier to its exact loop gain.

Stage 1: gm1 into R1 ∥ C1. Stage 2: inverting gm2 into R2 ∥ CL. Cc in series with the nulling resistor Rz
bridges stage 2; Cgd, where given, bridges it directly. The loop closes through beta. All SI: S, Ω, F, Hz, s.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fitamp.errors import DesignError
from fitamp.transfer import TWO_PI, Transfer

__all__ = ["ELEMENT_NAMES", "Elements", "coefficients"]

ELEMENT_NAMES = ("gm1", "R1", "C1", "gm2", "R2", "CL", "Cc", "Rz")
_MAY_BE_ZERO = frozenset({"Rz", "Cgd", "delay_s"})

# A number that may be complex: analytic in every element, for differentiation by a complex step.
Scalar = Any


def coefficients(
    *,
    gm1: Scalar,
    R1: Scalar,
    C1: Scalar,
    gm2: Scalar,
    R2: Scalar,
    CL: Scalar,
    Cc: Scalar,
    Rz: Scalar,
    Cgd: Scalar = 0.0,
    beta: Scalar = 1.0,
) -> tuple[NDArray[Any], NDArray[Any]]:
    """Return the loop gain's numerator (3,) and denominator (4,) in ascending powers of s (rad/s).

    ``denominator[0]`` is 1, ``numerator[0]`` the DC loop gain. The lengths do not depend on the values:
    without Cgd the last numerator coefficient is 0, without Rz the last of the denominator is.

    With y1 = 1/R1 + s·C1, y2 = 1/R2 + s·CL, D = 1 + s·Rz·Cc and N = s·Cc + s·Cgd·D, Kirchhoff's current law
    at the two stage outputs gives T = beta·gm1·(gm2·D − N) / (y1·y2·D + N·(y1 + y2 + gm2)); both are
    multiplied by R1·R2 here. Every argument may be complex (the result is analytic in each); nothing is
    checked.
    """
    series = Rz * Cc
    stage1, stage2 = R1 * C1, R2 * CL
    bridge1, bridge2 = Cc + Cgd, Cgd * series  # N = s·bridge1 + s²·bridge2
    # R1·R2·(y1 + y2 + gm2) = sum0 + s·sum1
    sum0 = R1 + R2 + gm2 * R1 * R2
    sum1 = R1 * R2 * (C1 + CL)
    numerator = beta * gm1 * R1 * R2 * np.array([gm2, Cc * (gm2 * Rz - 1) - Cgd, -bridge2])
    denominator = np.array(
        [
            1.0 + 0 * series,
            stage1 + stage2 + series + bridge1 * sum0,
            stage1 * stage2 + series * (stage1 + stage2) + bridge1 * sum1 + bridge2 * sum0,
            series * stage1 * stage2 + bridge2 * sum1,
        ]
    )
    return numerator, denominator


@dataclass(frozen=True, slots=True, kw_only=True)
class Elements:
    """Element values of the two-stage amplifier, and what encloses it.

    Parameters
    ----------
    gm1, gm2
        Transconductances in S.
    R1, R2
        Output resistances of the stages in Ω.
    C1, CL
        Capacitance from each stage's output to ground in F; CL includes the load.
    Cc, Rz
        Compensation capacitor in F and nulling resistor in Ω; 0 Ω for none.
    Cgd
        Overlap capacitance across stage 2 in F; it bypasses Rz and brings a right-half-plane zero back.
    mirror_pole_hz
        Pole of the first stage's current-mirror load in Hz, counted positive; None for none. The mirror
        carries half of the signal, so a zero comes with it at twice the frequency (common practice).
    delay_s
        Delay of the loop's path in s.
    beta
        Feedback factor.

    Raises
    ------
    DesignError
        Naming the element, when a value is not finite or not above 0 (Rz, Cgd and delay_s may be 0).
    """

    gm1: float
    R1: float
    C1: float
    gm2: float
    R2: float
    CL: float
    Cc: float
    Rz: float
    Cgd: float = 0.0
    mirror_pole_hz: float | None = None
    delay_s: float = 0.0
    beta: float = 1.0

    def __post_init__(self) -> None:
        for name in _NAMES:
            value = getattr(self, name)
            if name == "mirror_pole_hz" and value is None:
                continue
            object.__setattr__(self, name, _checked(name, value))

    @property
    def zero_time_s(self) -> float:
        """Zero time Cc·(Rz − 1/gm2) of the compensation branch; above 0: left half plane.

        This is the share of Cc and Rz alone. With Cgd the numerator's coefficient of s is smaller by Cgd/gm2,
        and a mirror adds its zero: ``transfer().zero_time_s`` has everything.
        """
        return self.Cc * (self.Rz - 1 / self.gm2)

    @property
    def nulling_product(self) -> float:
        """gm2·Rz: 0 no resistor, 1 zero at infinity, above 1 left half plane."""
        return self.gm2 * self.Rz

    def with_changes(self, **changes: float | None) -> Elements:
        """Return these elements with some values changed.

        Raises
        ------
        DesignError
            When a name is not an element or a value not usable.
        """
        unknown = sorted(set(changes) - set(_NAMES))
        if unknown:
            raise DesignError(f"no element is named {', '.join(unknown)}; known are {', '.join(_NAMES)}")
        changed: dict[str, Any] = dict(changes)
        return replace(self, **changed)

    def transfer(self) -> Transfer:
        """Return the exact loop gain: two poles without Rz, three with, and the zeros.

        Without Cgd there is one zero, none where gm2·Rz is exactly 1; Cgd together with Rz gives two.
        """
        values = {name: getattr(self, name) for name in (*ELEMENT_NAMES, "Cgd", "beta")}
        numerator, denominator = coefficients(**values)
        loop_gain = Transfer.from_polynomials(numerator, denominator, delay_s=self.delay_s)
        if self.mirror_pole_hz is None:
            return loop_gain
        mirror = Transfer(dc_gain=1.0, poles_hz=(-self.mirror_pole_hz,), zeros_hz=(-2 * self.mirror_pole_hz,))
        return loop_gain.cascade(mirror)

    # The approximations of hand calculation: for orientation and for start values, never for a verdict.

    @property
    def gain_bandwidth_approx_hz(self) -> float:
        """Approximate gain-bandwidth beta·gm1/(2πCc); right when stage 2 has much gain."""
        return self.beta * self.gm1 / (TWO_PI * self.Cc)

    @property
    def pole2_approx_hz(self) -> float:
        """Approximate second pole gm2·Cc/(2π(C1·CL + Cc(C1 + CL))), counted positive; right for small Rz."""
        return self.gm2 * self.Cc / (TWO_PI * (self.C1 * self.CL + self.Cc * (self.C1 + self.CL)))

    @property
    def pole3_approx_hz(self) -> float | None:
        """Approximate third pole 1/(2π·Rz·C1), counted positive, for C1 ≪ Cc, CL; None without Rz."""
        return 1 / (TWO_PI * self.Rz * self.C1) if self.Rz else None

    @property
    def pole_cancelling_resistor(self) -> float:
        """Rz in Ω that puts the zero near pole 2: (1 + (CL + C1)/Cc)/gm2."""
        return (1 + (self.CL + self.C1) / self.Cc) / self.gm2


_NAMES = tuple(item.name for item in fields(Elements))


def _checked(name: str, value: object) -> float:
    least = "0 or more" if name in _MAY_BE_ZERO else "above 0"
    if isinstance(value, (bool, str)) or not isinstance(value, (int, float, np.number)):
        raise DesignError(f"{name} must be a number {least}, but is {value!r}")
    number = float(value)
    if not math.isfinite(number) or number < 0 or (number == 0 and name not in _MAY_BE_ZERO):
        raise DesignError(f"{name} must be finite and {least}, but is {number:g}")
    return number
