"""The few conversions at the edge: how the trade spells its units, and what they come to.

The spellings of the trade come first, from a small table; anything else is asked of pint, which is
imported only then. Inside the package everything is in the canonical unit of its dimension:
s, V, A, ohm, degC, counts, m/s and 1.
"""

from __future__ import annotations

import re
import unicodedata
from functools import lru_cache
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .errors import InputError

__all__ = ["CANONICAL", "canonical", "convert", "dimension", "parse_unit"]

CANONICAL = MappingProxyType(
    {
        "time": "s",
        "voltage": "V",
        "current": "A",
        "resistance": "ohm",
        "temperature": "degC",
        "counts": "counts",
        "speed": "m/s",
        "dimensionless": "1",
    }
)

# unit: dimension, then canonical = factor * value + offset. Exact by definition (SI brochure, 9th
# edition; degF by definition of the scale).
_UNITS: dict[str, tuple[str, float, float]] = {
    "s": ("time", 1.0, 0.0),
    "ms": ("time", 1e-3, 0.0),
    "us": ("time", 1e-6, 0.0),
    "ns": ("time", 1e-9, 0.0),
    "min": ("time", 60.0, 0.0),
    "h": ("time", 3600.0, 0.0),
    "d": ("time", 86400.0, 0.0),
    "V": ("voltage", 1.0, 0.0),
    "mV": ("voltage", 1e-3, 0.0),
    "uV": ("voltage", 1e-6, 0.0),
    "A": ("current", 1.0, 0.0),
    "mA": ("current", 1e-3, 0.0),
    "uA": ("current", 1e-6, 0.0),
    "nA": ("current", 1e-9, 0.0),
    "ohm": ("resistance", 1.0, 0.0),
    "mohm": ("resistance", 1e-3, 0.0),
    "kohm": ("resistance", 1e3, 0.0),
    "Mohm": ("resistance", 1e6, 0.0),
    "degC": ("temperature", 1.0, 0.0),
    "degF": ("temperature", 5.0 / 9.0, -160.0 / 9.0),
    "K": ("temperature", 1.0, -273.15),
    "counts": ("counts", 1.0, 0.0),
    "m/s": ("speed", 1.0, 0.0),
    "mm/s": ("speed", 1e-3, 0.0),
    "cm/s": ("speed", 1e-2, 0.0),
    "km/h": ("speed", 1.0 / 3.6, 0.0),
    "ft/min": ("speed", 0.3048 / 60.0, 0.0),
    "1": ("dimensionless", 1.0, 0.0),
    "%": ("dimensionless", 1e-2, 0.0),
}

# How loggers spell them; case counts. "C", "F" and "S" are the trade's degC, degF and seconds
# (common practice, no source), not coulomb, farad and siemens.
_SPELLINGS = {
    "s": "s sec secs S Sec SEC",
    "ms": "ms msec mS",
    "us": "us μs usec",
    "ns": "ns nsec",
    "min": "min mins Min MIN",
    "h": "h hr hrs H Hr",
    "d": "d",
    "V": "V v Volt VDC Vdc",
    "mV": "mV mv mVDC",
    "uV": "uV μV uv",
    "A": "A Amp Amps",
    "mA": "mA ma",
    "uA": "uA μA ua",
    "nA": "nA",
    "ohm": "ohm Ohm OHM Ω R",
    "mohm": "mohm mOhm mΩ",
    "kohm": "kohm kOhm KOhm KOHM kΩ KΩ k",
    "Mohm": "Mohm MOhm MΩ",
    "degC": "degC C °C DegC DEGC deg_C °c deg.C degreesC",
    "degF": "degF F °F DegF DEGF deg_F deg.F",
    "K": "K °K degK",
    "counts": "counts count Counts code codes LSB lsb raw digits ADC adc",
    "m/s": "m/s mps",
    "mm/s": "mm/s",
    "cm/s": "cm/s",
    "km/h": "km/h kmh kph",
    "ft/min": "ft/min fpm",
    "1": "1 -",
    "%": "% percent %RH %rh",
}
_WORDS = {
    "s": "second seconds",
    "ms": "millisecond milliseconds",
    "us": "microsecond microseconds",
    "ns": "nanosecond nanoseconds",
    "min": "minute minutes",
    "h": "hour hours",
    "d": "day days",
    "V": "volt volts",
    "mV": "millivolt millivolts",
    "A": "ampere amperes amps",
    "mA": "milliampere milliamperes milliamps",
    "uA": "microampere microamperes microamps",
    "ohm": "ohms",
    "kohm": "kiloohm kiloohms kilohm kilohms kohms",
    "Mohm": "megaohm megaohms megohm megohms",
    "degC": "celsius centigrade degree_celsius degrees_celsius degc degreec",
    "degF": "fahrenheit degree_fahrenheit degrees_fahrenheit",
    "K": "kelvin kelvins",
    "counts": "counts",
}
_BY_SPELLING = {w: unit for unit, words in _SPELLINGS.items() for w in words.split()}
_BY_WORD = {w: unit for unit, words in _WORDS.items() for w in words.split()}

# What may be handed to pint: names joined by * or /, no numbers, so that nothing is computed.
_SAFE = re.compile(r"[A-Za-zΩμ°Å]{1,20}(?:\s?[*/· ]\s?[A-Za-zΩμ°Å]{1,20}){0,3}")


def parse_unit(text: str) -> str | None:
    """Return a unit's plain spelling, ``"kOhm"`` giving ``"kohm"``; None for what is no unit.

    Parameters
    ----------
    text : str
        As it stands in a header or a run file; outer blanks and brackets don't matter.
    """
    plain = _plain(text)
    if not plain or len(plain) > 40:
        return None
    joined = plain.replace(" ", "")
    for form in (plain, joined, joined.replace("deg.", "deg")):
        if form in _BY_SPELLING:
            return _BY_SPELLING[form]
    for form in (joined.casefold(), plain.casefold().replace(" ", "_")):
        if form in _BY_WORD:
            return _BY_WORD[form]
    return _asked_of_pint(plain)


def dimension(unit: str) -> str | None:
    """Return what a unit measures, a key of `CANONICAL`; None where it is no unit known here."""
    name = parse_unit(unit)
    if name is None:
        return None
    if name in _UNITS:
        return _UNITS[name][0]
    return _pint_dimension(name)


def canonical(unit: str) -> str:
    """Return the unit that values of this kind have inside the package.

    Raises
    ------
    InputError
        For a unit that isn't known.
    """
    return CANONICAL[_known(unit)[1]]


def convert(values: Any, unit: str, to: str) -> NDArray[np.float64]:
    """Return values in another unit of the same dimension.

    Parameters
    ----------
    values : array_like
        In ``unit``. Temperatures are absolute: a difference in K is *not* converted by this.
    unit, to : str
        Any spelling that `parse_unit` knows.

    Raises
    ------
    InputError
        Where a unit isn't known, or the two measure different things.
    """
    (name, kind), (to_name, to_kind) = _known(unit), _known(to)
    if kind != to_kind:
        raise InputError(
            "unit",
            f'"{unit}" measures {kind} and "{to}" {to_kind}',
            f"give a unit of {to_kind}, such as {CANONICAL[to_kind]}",
        )
    out = np.asarray(values, dtype=float)
    if name == to_name:
        return out
    factor, offset = _affine(name)
    to_factor, to_offset = _affine(to_name)
    total = factor / to_factor
    if offset == to_offset:
        return out * total
    return out * total + (offset - to_offset) / to_factor


def _known(unit: str) -> tuple[str, str]:
    """Return a unit's plain spelling and its dimension, or refuse."""
    name = parse_unit(unit)
    kind = None if name is None else dimension(name)
    if name is None or kind is None:
        raise InputError(
            "unit",
            f'"{unit}" is no unit known here',
            "use one such as s, min, h, ms, V, mV, A, mA, uA, ohm, kohm, degC, degF, K or counts",
        )
    return name, kind


def _affine(name: str) -> tuple[float, float]:
    """Return factor and offset to the canonical unit."""
    if name in _UNITS:
        return _UNITS[name][1:]
    registry = _registry()
    base = {"time": "s", "voltage": "V", "current": "A", "resistance": "ohm",
            "temperature": "degC", "speed": "m/s"}[_pint_dimension(name) or ""]  # fmt: skip
    at_zero, at_one = (float(registry.Quantity(x, name).to(base).magnitude) for x in (0.0, 1.0))
    return at_one - at_zero, at_zero


def _plain(text: str) -> str:
    """Text without brackets, with one form for each letter that Unicode has twice."""
    out = text.replace("º", "°").replace("˚", "°").strip()
    if len(out) > 2 and out[0] + out[-1] in ("[]", "()", "{}", "<>"):
        out = out[1:-1]
    return " ".join(unicodedata.normalize("NFKC", out).split())


@lru_cache(maxsize=1)
def _registry() -> Any:
    import pint

    return pint.UnitRegistry(cache_folder=None)


@lru_cache(maxsize=256)
def _asked_of_pint(text: str) -> str | None:
    """Return pint's own name for a unit of a kind that is used here."""
    if len(text) < 2 or not _SAFE.fullmatch(text):
        return None
    import pint

    try:
        name = str(_registry().parse_units(text.replace("·", "*")))
    except (pint.errors.PintError, ValueError, TypeError, AttributeError, SyntaxError):
        return None
    return name if _pint_dimension(name) else None


@lru_cache(maxsize=256)
def _pint_dimension(name: str) -> str | None:
    registry = _registry()
    found = registry.parse_units(name).dimensionality
    for kind, base in (
        ("time", "s"), ("voltage", "V"), ("current", "A"), ("resistance", "ohm"),
        ("temperature", "kelvin"), ("speed", "m/s"),
    ):  # fmt: skip
        if found == registry.parse_units(base).dimensionality:
            return kind
    return None
