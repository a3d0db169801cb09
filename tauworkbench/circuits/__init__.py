"""Measuring circuits: what the sensor's ohms became in the log, and back.

`CIRCUITS` is the table of kinds. The fields of each are the keys of ``[circuit]``.
"""

from __future__ import annotations

from .base import Circuit, Fault, Readings
from .counts import Counts
from .kinds import Bridge, CurrentSource, Divider, Ohms, Thermometer

__all__ = [
    "CIRCUITS",
    "Bridge",
    "Circuit",
    "Counts",
    "CurrentSource",
    "Divider",
    "Fault",
    "Ohms",
    "Readings",
    "Thermometer",
]

CIRCUITS: dict[str, type[Circuit]] = {
    "divider": Divider,
    "current": CurrentSource,
    "bridge": Bridge,
    "ohms": Ohms,
    "thermometer": Thermometer,
}
