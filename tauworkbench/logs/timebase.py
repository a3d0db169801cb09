"""Roles to numbers on one strictly increasing time base."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..errors import InputError
from ..records import FloatArray
from ..units import canonical, convert, dimension
from .record import Channels, Column, Log

__all__ = ["to_channels"]

_ASSUMED = {"supply": "V", "current": "A", "speed": "m/s"}
_HELD = ("supply", "current")


def to_channels(
    log: Log,
    roles: Mapping[str, str],
    units: Mapping[str, str],
    *,
    object: Mapping[str, Any] | None = None,  # noqa: A002 - the run file's own key
) -> Channels:
    """Take the columns in use as numbers in one unit each, on log time."""
    where = f"{log.path.name}"
    keep = np.ones(log.rows, bool)
    if object:
        keep = log.text(object["column"]) == str(object["value"])
        if not keep.any():
            raise InputError(
                "[log] object", f"no row has {object['column']} = {object['value']}", "check it"
            )
    cautions: list[str] = []
    columns = {role: log.column(key, f"[log] {role}") for role, key in roles.items()}
    seconds, origin = _seconds(log, columns["time"], units, keep)
    values, written, given_units = {}, {}, {}
    for role, column in columns.items():
        if role == "time":
            continue
        unit = _unit(log, column, role, units, cautions)
        written[role], given_units[role] = unit, canonical(unit)
        values[role] = convert(log.numbers(column.number), unit, canonical(unit))
    good = keep & np.isfinite(seconds)
    signal = values["signal"]
    dropped = int((good & ~np.isfinite(signal)).sum()) + int((keep & ~np.isfinite(seconds)).sum())
    good &= np.isfinite(signal)
    if dropped:
        cautions.append(f"{dropped} rows without a time or a signal were dropped")
    rows = np.flatnonzero(good)
    if not rows.size:
        raise InputError(where, "holds no sample with a time and a signal", "check the columns")
    return _in_order(seconds[rows], {k: v[rows] for k, v in values.items()}, rows, origin,
                     (given_units, written, cautions, log.first_row))  # fmt: skip


def _in_order(
    seconds: FloatArray, values: dict[str, FloatArray], rows: Any, origin: str, rest: Any
) -> Channels:
    units, written, cautions, first_row = rest
    order = np.argsort(seconds, kind="stable")
    if np.any(np.diff(order) < 0):
        cautions.append(f"{int((np.diff(seconds) < 0).sum())} rows out of order were sorted")
    seconds, rows = seconds[order], rows[order]
    unique, first, count = np.unique(seconds, return_index=True, return_counts=True)
    out = {}
    for role, array in values.items():
        sorted_values = array[order]
        if unique.size < seconds.size:
            sorted_values = np.add.reduceat(sorted_values, first) / count
        out[role] = sorted_values
    if unique.size < seconds.size:
        cautions.append(f"{seconds.size - unique.size} rows with repeated stamps were averaged")
    for role in _HELD:
        if role in out:
            out[role] = _held(out[role])
    return Channels(
        unique, out, units, written, rows[first] + first_row, origin, (), tuple(cautions)
    )


def _held(values: FloatArray) -> FloatArray:
    """Hold each value until the next one."""
    good = np.flatnonzero(np.isfinite(values))
    if not good.size:
        return values
    at = np.maximum(np.searchsorted(good, np.arange(values.size), side="right") - 1, 0)
    return np.asarray(values[good[at]])


def _unit(
    log: Log, column: Column, role: str, units: Mapping[str, str], cautions: list[str]
) -> str:
    named = [units.get(k) for k in (role, column.name, column.short_name, str(column.number))]
    given = next((u for u in named if u is not None), None)
    if given is not None:
        if dimension(given) is None:
            raise InputError(f'[log] units {role}', f'"{given}" is not a unit', "give e.g. mV")
        if column.unit and dimension(column.unit) and column.unit != given:
            cautions.append(
                f'{column.short_name} is in "{given}" by the run file and in "{column.unit}" by the '
                "log; the run file was followed"
            )
        return given
    if column.unit and dimension(column.unit):
        return column.unit
    if role in _ASSUMED:
        return _ASSUMED[role]
    if role == "marker":
        return "1"
    raise InputError(
        f"{log.path.name} [log] units",
        f'the column "{column.short_name or column.number}" has no unit',
        f"give it as units = {{ {role} = ... }}",
    )


def _seconds(
    log: Log, column: Column, units: Mapping[str, str], keep: Any
) -> tuple[FloatArray, str]:
    numbers = log.numbers(column.number)
    if np.isfinite(numbers[keep]).mean() > 0.5:
        cautions: list[str] = []
        unit = _unit(log, column, "time", units, cautions)
        if dimension(unit) != "time":
            raise InputError("[log] time", f'"{unit}" is no unit of time', "give s, min or h")
        seconds = convert(numbers, unit, "s")
        first = float(np.nanmin(seconds))
        return seconds - first, f"{first:.9g} s on the log's own clock"
    import pandas as pd

    day_first = log.reading.day_first
    stamps = pd.to_datetime(
        pd.Series(log.text(column.number)),
        errors="coerce", dayfirst=True if day_first is None else day_first, format="mixed",
    )  # fmt: skip
    if stamps.isna().mean() > 0.5:
        raise InputError(
            f"{log.path.name} [log] time",
            f'the column "{column.short_name}" holds no times that can be read',
            "choose another column",
        )
    nanoseconds = stamps.astype("datetime64[ns]").astype("int64").to_numpy()
    good = stamps.notna().to_numpy()
    first = int(nanoseconds[good].min())
    seconds = np.where(good, (nanoseconds - first) / 1e9, np.nan)
    return seconds, stamps.min().isoformat()
