"""What a bench records on the way to loop gain, to the sweep of it.

Receivers (`read_receivers`), and two injections at one cut (`double_injection`). Each keeps where it came from and what
was decided.
"""

from __future__ import annotations

from fitamp.loopgain.injection import DoubleInjection, Injection, InjectionAlone, double_injection
from fitamp.loopgain.receivers import ReceiverColumns, loop_from_receivers, read_receivers

__all__ = [
    "DoubleInjection",
    "Injection",
    "InjectionAlone",
    "ReceiverColumns",
    "double_injection",
    "loop_from_receivers",
    "read_receivers",
]
