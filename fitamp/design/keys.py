"""The tables of a design file and their keys: what reading takes, refusals list, and the template shows."""

from __future__ import annotations

from collections.abc import Mapping

from fitamp.design.model import LIMITED_QUANTITIES

__all__ = ["ELEMENT_KEYS", "KEYS", "ROOT_KEYS"]

# Keys of [elements]: field of `Elements`, and unit.
ELEMENT_KEYS: Mapping[str, tuple[str, str]] = {
    "gm1": ("gm1", "S"),
    "R1": ("R1", "Ω"),
    "C1": ("C1", "F"),
    "gm2": ("gm2", "S"),
    "R2": ("R2", "Ω"),
    "CL": ("CL", "F"),
    "Cc": ("Cc", "F"),
    "Rz": ("Rz", "Ω"),
    "Cgd": ("Cgd", "F"),
    "mirror_pole": ("mirror_pole_hz", "Hz"),
}
# Keys of [designed] that hold a quantity: field of `Roots`.
ROOT_KEYS: Mapping[str, str] = {
    "dc_gain": "dc_gain",
    "pole1": "pole1_hz",
    "pole2": "pole2_hz",
    "pole3": "pole3_hz",
    "zero": "zero_hz",
}
KEYS: Mapping[str, tuple[str, ...]] = {
    "about": ("name", "note"),
    "elements": tuple(ELEMENT_KEYS),
    "designed": (*ROOT_KEYS, "half_plane"),
    "loop": ("beta", "delay"),
    "limits": (*LIMITED_QUANTITIES, "half_plane", "small_zero"),
    "bench": ("load", "delay"),
}
