"""What a bench records on the way to loop gain, to the sweep of it.

Receivers (`read_receivers`), two injections at one cut (`double_injection`), the opened loop as a two-port
(`read_two_port_loop`), a closed-loop response (`follower_to_loop`). Each keeps where it came from and what was decided.
"""

from __future__ import annotations

from fitamp.loopgain.follower import follower_to_loop
from fitamp.loopgain.injection import DoubleInjection, Injection, InjectionAlone, double_injection
from fitamp.loopgain.receivers import ReceiverColumns, loop_from_receivers, read_receivers
from fitamp.loopgain.termination import Termination
from fitamp.loopgain.twoport import read_two_port_loop, voltage_gain

__all__ = [
    "DoubleInjection",
    "Injection",
    "InjectionAlone",
    "ReceiverColumns",
    "Termination",
    "double_injection",
    "follower_to_loop",
    "loop_from_receivers",
    "read_receivers",
    "read_two_port_loop",
    "voltage_gain",
]
