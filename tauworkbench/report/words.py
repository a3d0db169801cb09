"""Numbers and names as a reader sees them: rounding, units, open intervals, the trade's words."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from ..uncertainty import Quantity

__all__ = [
    "NOT_STATED",
    "decimals",
    "figures",
    "interval",
    "kind_words",
    "model_words",
    "named",
    "number",
    "percent",
    "plain",
    "sentence_list",
]

NOT_STATED = "not stated"
_MOST_FIGURES = 9  # a noise-free record's uncertainty doesn't earn a number more digits than this

TESTS = {
    "plunge": "plunge into the medium",
    "air-step": "step of temperature in air",
    "self-heating": "self-heating by a step of power",
    "cooling-after-heating": "cooling after self-heating",
    "field": "field log",
}
QUANTITIES = {
    "ambient-change": "response to a change of the medium's temperature",
    "internal-heating": "response to heat made inside the sensor, "
    "and the response to a change of the medium that it implies",
    "cooling-after-heating": "cooling after heat was made inside the sensor",
    "ambient": "the temperature of the medium behind the sensor's own",
}
ONSETS = {
    "found": "found in the record: the apparent onset",
    "given": "given in the run file",
    "marker": "from the logged marker",
    "before": "before the fitted samples",
    "reference": "none: the logged reference drives the model",
}
CIRCUITS = {
    "divider": "resistive divider",
    "current": "current source",
    "bridge": "bridge",
    "ohms": "resistance logged directly",
    "thermometer": "temperature logged directly",
}
LAWS = {
    "beta": "the two-parameter (beta) equation",
    "steinhart-hart": "the Steinhart-Hart equation",
    "four-term": "the four-term logarithmic equation",
    "three-parameter": "the three-parameter exponential R = a exp(b / (t + c))",
    "table": "a table of resistance against temperature, interpolated smoothly",
    "platinum": "the Callendar-Van Dusen equation of IEC 60751",
}
# JSON name: (in words, unit as shown, factor from the stored unit to the shown one)
NAMES: dict[str, tuple[str, str, float]] = {
    "time_constant_1_s": ("Time constant, the slowest", "s", 1.0),
    "time_constant_2_s": ("Time constant, the second", "s", 1.0),
    "zero_s": ("Zero (a direct path beside the slow one)", "s", 1.0),
    "dead_time_s": ("Dead time", "s", 1.0),
    "transfer_s": ("Duration of the change of medium", "s", 1.0),
    "drift_k_per_s": ("Drift of the final level", "mK/min", 6e4),
    "offset_k": ("Sensor less reference, at its mean", "K", 1.0),
    "gain": ("Share of a change that reaches the sensor", "", 1.0),
    "lag_s": ("Lag behind a steady ramp", "s", 1.0),
    "onset_s": ("Onset, log time", "s", 1.0),
    "start_c": ("Temperature before the step", "°C", 1.0),
    "final_c": ("Temperature that it settles at", "°C", 1.0),
    "dissipation.mw_per_k": ("Dissipation constant", "mW/K", 1.0),
    "sensor": ("Sensor", "", 1.0),
    "medium": ("Medium", "", 1.0),
    "speed_m_s": ("Speed of the medium", "m/s", 1.0),
    "immersion_mm": ("Immersion depth", "mm", 1.0),
    "medium_c": ("Temperature of the medium", "°C", 1.0),
    "mounting": ("Mounting", "", 1.0),
    "pressure_pa": ("Pressure", "Pa", 1.0),
    "operator": ("Operator", "", 1.0),
    "note": ("Note", "", 1.0),
    "ambient_c": ("Ambient temperature", "°C", 1.0),
    "dissipation_mw_per_k": ("Dissipation constant used", "mW/K", 1.0),
    "rated_power_mw": ("Rated power", "mW", 1.0),
}
# Longest first: "_k_per_s" before "_s".
_SUFFIXES = {
    "_k_per_s": "K/s",
    "mw_per_k": "mW/K",
    "_m_s": "m/s",
    "_mm": "mm",
    "_pa": "Pa",
    "_mw": "mW",
    "_c": "°C",
    "_k": "K",
    "_s": "s",
}
_ORDINALS = ("slowest", "second", "third", "fourth", "fifth", "sixth")
_POLES = {"one-pole": "one time constant", "two-pole": "two time constants in series"}
_EXTRAS = {
    " with zero": " with a direct path",
    " + dead time": ", a dead time",
    " + drift": ", a drifting final level",
}


def named(name: str) -> tuple[str, str, float]:
    """Return a JSON name's words, the unit that it is shown in, and the factor to that unit."""
    if name in NAMES:
        return NAMES[name]
    head, _, rest = name.partition(".")
    if head == "response_time_s" and rest:
        return f"Time to {rest} % of a step", "s", 1.0
    if head == "time_constants_s" and rest.isdigit() and int(rest) < len(_ORDINALS):
        return f"Time constant, the {_ORDINALS[int(rest)]}", "s", 1.0
    for suffix, unit in _SUFFIXES.items():
        if name.endswith(suffix):
            return name.removesuffix(suffix).replace("_", " ").strip() or name, unit, 1.0
    return name.replace("_", " "), "", 1.0


def kind_words(names: Mapping[str, str], kind: str) -> str:
    """Return the words for a kind; a kind that has none stands for itself."""
    return names.get(kind, kind)


def model_words(model: str) -> str:
    """Say a model's name from ``result.json`` in words."""
    words = model
    for short, long in (*_POLES.items(), *_EXTRAS.items()):
        words = words.replace(short, long)
    return words


def decimals(quantity: Quantity, factor: float = 1.0) -> int:
    """Return decimals that show two significant digits of the standard uncertainty.

    GUM (JCGM 100:2008) 7.2.6. Where a side is open, half the distance to the other bound stands
    in for the uncertainty; without any bound, the value keeps three significant digits.
    """
    value, u = quantity.value * factor, quantity.standard_uncertainty
    if u is None:
        bounds = [b for b in (quantity.low, quantity.high) if b is not None]
        u = max((abs(quantity.value - b) / 2 for b in bounds), default=0.0)
    most = _MOST_FIGURES - 1 - _exponent(value)
    if not (u and math.isfinite(u)):
        return min(2 - _exponent(value), 12)
    return min(1 - _exponent(float(f"{abs(u * factor):.1e}")), most, 12)


def number(value: float, places: int) -> str:
    """Write a number with that many decimals; fewer than none rounds to tens, hundreds, ..."""
    if not math.isfinite(value):
        return "not known"
    rounded = round(value, places)
    if abs(rounded) >= 1e9:
        return f"{rounded:.3g}"
    return f"{rounded + 0.0:.{max(places, 0)}f}"  # + 0.0: no minus before a zero


def figures(value: float, significant: int = 3) -> str:
    """Write a number to that many significant digits, without an exponent where readable."""
    return number(value, min(significant - 1 - _exponent(value), 12))


def interval(quantity: Quantity, unit: str, factor: float = 1.0) -> str:
    """Write the interval; an open side in words, ``below 0.4 s``."""
    places = decimals(quantity, factor)
    tail = f" {unit}" if unit else ""
    shown = [
        None if b is None else number(b * factor, places) for b in (quantity.low, quantity.high)
    ]
    low, high = shown if factor > 0 else shown[::-1]
    if low is None and high is None:
        return "no limit from this record"
    if low is None:
        return f"below {high}{tail}"
    if high is None:
        return f"above {low}{tail}"
    return f"{low} to {high}{tail}"


def percent(share: float) -> str:
    """Write a share as per cent: ``95 %``."""
    return f"{100 * share:.4g} %"


def plain(value: Any) -> str:
    """Write a value of a run file as a reader would; None is ``not stated``."""
    if value is None or value == "":
        return NOT_STATED
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, Mapping):
        return ", ".join(f"{k} {plain(v)}" for k, v in value.items())
    if isinstance(value, list | tuple):
        return ", ".join(plain(v) for v in value)
    return str(value)


def sentence_list(items: list[str] | tuple[str, ...]) -> str:
    """Join with commas and a final ``and``."""
    return " and ".join(filter(None, (", ".join(items[:-1]), *items[-1:])))


def _exponent(value: float) -> int:
    return math.floor(math.log10(abs(value))) if value and math.isfinite(value) else 0
