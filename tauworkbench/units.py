"""Units at the edge: the trade's spellings first, pint behind them; SI (and degC) inside."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .errors import InputError

__all__ = ["canonical", "convert", "dimension", "parse_unit"]


@dataclass(frozen=True)
class _Unit:
    """value in the canonical unit = factor * value + shift."""

    dimension: str
    factor: float = 1.0
    shift: float = 0.0


CANONICAL = {
    "time": "s", "voltage": "V", "current": "A", "resistance": "ohm", "temperature": "degC",
    "counts": "counts", "speed": "m/s", "power": "W", "number": "1",
}  # fmt: skip

_T, _V, _A, _R, _C = "time", "voltage", "current", "resistance", "temperature"
_TABLE: dict[str, _Unit] = {
    **dict.fromkeys(("s", "sec", "second", "seconds"), _Unit(_T)),
    **dict.fromkeys(("ms", "msec"), _Unit(_T, 1e-3)),
    **dict.fromkeys(("us", "µs", "μs"), _Unit(_T, 1e-6)),
    "ns": _Unit(_T, 1e-9),
    **dict.fromkeys(("min", "mins", "minute", "minutes"), _Unit(_T, 60.0)),
    **dict.fromkeys(("h", "hr", "hour", "hours"), _Unit(_T, 3600.0)),
    "V": _Unit(_V), "mV": _Unit(_V, 1e-3), "uV": _Unit(_V, 1e-6), "µV": _Unit(_V, 1e-6),
    "A": _Unit(_A), "mA": _Unit(_A, 1e-3), "uA": _Unit(_A, 1e-6), "µA": _Unit(_A, 1e-6),
    "nA": _Unit(_A, 1e-9),
    **dict.fromkeys(("ohm", "Ohm", "ohms", "Ohms", "Ω", "Ω", "R"), _Unit(_R)),
    **dict.fromkeys(("kohm", "kOhm", "kOhms", "kΩ", "kΩ"), _Unit(_R, 1e3)),
    **dict.fromkeys(("Mohm", "MOhm", "MΩ", "MΩ"), _Unit(_R, 1e6)),
    **dict.fromkeys(("degC", "C", "°C", "ºC", "℃", "deg C", "Celsius", "celsius"), _Unit(_C)),
    **dict.fromkeys(("degF", "F", "°F", "ºF", "℉", "deg F"), _Unit(_C, 5 / 9, -160 / 9)),
    **dict.fromkeys(("K", "kelvin", "Kelvin"), _Unit(_C, 1.0, -273.15)),
    "mK": _Unit(_C, 1e-3, -273.15),
    **dict.fromkeys(("counts", "count", "codes", "code", "LSB", "adc"), _Unit("counts")),
    "m/s": _Unit("speed"), "W": _Unit("power"), "mW": _Unit("power", 1e-3),
    "1": _Unit("number"), "": _Unit("number"),
}  # fmt: skip


def parse_unit(text: str) -> str | None:
    """Return the spelling of a unit that this package knows, or None."""
    word = text.strip().strip("[]()").strip()
    return word if word and _find(word) is not None else None


def dimension(unit: str) -> str | None:
    """Return what a unit measures (``time``, ``voltage``, ...), or None."""
    found = _find(unit)
    return None if found is None else found.dimension


def canonical(unit: str) -> str:
    """Return the unit that values of this kind have inside the package."""
    return CANONICAL[_known(unit).dimension]


def convert(values: ArrayLike, unit: str, to: str) -> NDArray[np.float64]:
    """Convert values; a unit of another dimension is refused.

    Parameters
    ----------
    values : array_like
    unit, to : str
        Any known spelling. A temperature is converted with its zero: convert a difference as two.
    """
    source, target = _known(unit), _known(to)
    if source.dimension != target.dimension:
        raise InputError(
            "unit",
            f'"{unit}" is a {source.dimension} and "{to}" a {target.dimension}',
            "give a unit of the right kind",
        )
    array = np.asarray(values, float)
    if source == target:
        return array
    inside = array * source.factor + source.shift
    return np.asarray((inside - target.shift) / target.factor)


def _known(unit: str) -> _Unit:
    found = _find(unit)
    if found is None:
        raise InputError("unit", f'"{unit}" is not a unit known here', "give one such as s, mV, degC")
    return found


def _find(unit: str) -> _Unit | None:
    return _TABLE.get(unit.strip())
