"""Resistance and temperature, both ways, with the slope.

A new law is a frozen dataclass beside these (see `base.Law`) and one line in `LAWS`.
"""

from .base import Law
from .calibration import Calibrated, calibrate
from .platinum import Platinum
from .table import Table
from .thermistor import Beta, FourTerm, SteinhartHart, ThreeParameter

__all__ = [
    "LAWS",
    "Beta",
    "Calibrated",
    "FourTerm",
    "Law",
    "Platinum",
    "SteinhartHart",
    "Table",
    "ThreeParameter",
    "calibrate",
]

LAWS: dict[str, type[Law]] = {
    "beta": Beta,
    "steinhart-hart": SteinhartHart,
    "four-term": FourTerm,
    "three-parameter": ThreeParameter,
    "table": Table,
    "platinum": Platinum,
}
"""The kinds that ``[law] kind`` names."""
