"""The kinds of circuit: one short entry each; `base` does the shared work."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray
from .base import Circuit, Fault, Readings, each_once
from .checks import number, word
from .electrical import Branch, Electrical

__all__ = ["Bridge", "CurrentSource", "Divider", "Ohms", "Thermometer"]

_FIXED = ("fixed", "fixed_rel_u", "fixed resistor")
_SUPPLY = ("supply", "supply_rel_u", "supply voltage")
_CURRENT = ("current", "current_rel_u", "measuring current")
_ABSOLUTE_ZERO_C = -273.15


@dataclass(frozen=True, eq=False, kw_only=True)
class _Ratio(Electrical):
    """A supply across a fixed resistor and the sensor in series; the signal is taken between."""

    supply: float | FloatArray
    fixed: float
    sensor_leg: str
    fixed_rel_u: float | None = None
    supply_rel_u: float | None = None

    excited_by: ClassVar[str] = "supply"
    tolerated: ClassVar[tuple[tuple[str, str, str], ...]] = (_FIXED, _SUPPLY)

    def __post_init__(self) -> None:
        number("fixed", self.fixed, above=0.0)
        word("sensor_leg", self.sensor_leg, ("low", "high"))
        super().__post_init__()

    def _pair(self) -> tuple[float, float]:
        """Share of the supply, and source resistance [ohm], of what the signal is taken against."""
        return 0.0, 0.0

    def branch(self) -> Branch:
        """Return voltage and current of the sensor's leg, the reader's own current included."""
        share, source = self._pair()
        g = self.input_siemens
        supply = self.supply
        rise = 1.0 + source * g  # the reader's current s g flows through the reference pair too
        if self.sensor_leg == "low":
            drive = supply * (1.0 - share) / self.fixed
            return Branch(supply * share, rise, drive, -rise / self.fixed - g)
        return Branch(
            supply * (1.0 - share), -rise, supply * share / self.fixed, rise / self.fixed + g
        )


@dataclass(frozen=True, eq=False, kw_only=True)
class Divider(_Ratio):
    """Voltage divider: V = supply * R / (R + fixed) across the sensor.

    Attributes
    ----------
    supply : float or array_like
        [V]
    fixed : float
        [ohm]
    sensor_leg : {"low", "high"}
        ``"low"``: the signal is across the sensor; ``"high"``: across the fixed resistor.
    fixed_rel_u, supply_rel_u : float, optional
        Relative standard uncertainties.
    """


@dataclass(frozen=True, eq=False, kw_only=True)
class Bridge(_Ratio):
    """Wheatstone bridge: V = supply * (x - lower / (upper + lower)), x as in a divider.

    Attributes
    ----------
    upper, lower : float
        The reference pair, from the supply down [ohm]; taken as exact. The rest as in `Divider`.
    """

    upper: float
    lower: float

    bipolar: ClassVar[bool] = True

    def __post_init__(self) -> None:
        number("upper", self.upper, above=0.0)
        number("lower", self.lower, above=0.0)
        super().__post_init__()

    def _pair(self) -> tuple[float, float]:
        share = self.lower / (self.upper + self.lower)
        return share, self.upper * share


@dataclass(frozen=True, eq=False, kw_only=True)
class CurrentSource(Electrical):
    """A current through the sensor; the signal is the voltage across it: V = current * R.

    Attributes
    ----------
    current : float or array_like
        [A]
    current_rel_u : float, optional
        Relative standard uncertainty.
    """

    current: float | FloatArray
    current_rel_u: float | None = None

    excited_by: ClassVar[str] = "current"
    tolerated: ClassVar[tuple[tuple[str, str, str], ...]] = (_CURRENT,)

    def branch(self) -> Branch:
        """Return the whole signal as voltage; the reader takes its share of the current."""
        return Branch(0.0, 1.0, self.current, -self.input_siemens)


@dataclass(frozen=True, eq=False, kw_only=True)
class Ohms(Circuit):
    """The signal is the resistance [ohm]; the power in the sensor isn't known.

    Attributes
    ----------
    lead_ohm : float
        Contained in the signal, in series with the sensor [ohm].
    """

    lead_ohm: float = 0.0

    signal_unit: ClassVar[str] = "ohm"

    def __post_init__(self) -> None:
        number("lead_ohm", self.lead_ohm, low=0.0)

    def readings(self, signal: ArrayLike) -> Readings:
        """Return the signal itself, without the leads."""
        y = np.atleast_1d(np.asarray(signal, float))
        lead = f" behind leads of {self.lead_ohm:g} ohm" if self.lead_ohm else ""
        return _direct(y - self.lead_ohm, 0.0, f"its resistance would be zero or negative{lead}")

    def signal(self, value: ArrayLike) -> FloatArray:
        """Return the resistance with the leads [ohm]."""
        return np.asarray(value, float) + self.lead_ohm


@dataclass(frozen=True, eq=False, kw_only=True)
class Thermometer(Circuit):
    """The signal is the temperature [degC]: no law is needed, and the power isn't known."""

    gives: ClassVar[str] = "degC"
    signal_unit: ClassVar[str] = "degC"

    def readings(self, signal: ArrayLike) -> Readings:
        """Return the signal itself."""
        words = f"the temperature lies at or below {_ABSOLUTE_ZERO_C} degC"
        return _direct(np.atleast_1d(np.array(signal, float)), _ABSOLUTE_ZERO_C, words)

    def signal(self, value: ArrayLike) -> FloatArray:
        """Return the temperature itself [degC]."""
        return np.asarray(value, float)


def _direct(value: FloatArray, bound: float, words: str) -> Readings:
    faults = each_once(
        [Fault("the signal is infinite", np.isinf(value)), Fault(words, value <= bound)]
    )
    for fault in faults:
        value[fault.where] = np.nan
    return Readings(value, np.where(np.isnan(value), np.nan, 1.0), None, faults)
