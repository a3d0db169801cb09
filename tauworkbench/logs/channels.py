"""From a log's columns to channels: one unit each, one strictly increasing time base."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..progress import SILENT, Watch
from ..units import canonical, convert, dimension, parse_unit
from .clock import NumberTimes, StampTimes, Times
from .log import Log
from .numbers import Growing, NumberTaker
from .records import Channels, Column
from .timebase import Use, Work, check_enough, fill, look_through, merge, on_log_time, order

__all__ = ["to_channels"]


@dataclass(frozen=True)
class _Role:
    """What a column is used for.

    ``absent`` says what happens where it has no value: the row is dropped, the value before is
    held, a line is drawn, or it stays absent. ``assumed`` is its unit where none is stated.
    """

    where: str
    absent: str
    kind: str | None = None
    assumed: str | None = None


_ROLES = MappingProxyType(
    {
        "signal": _Role("[log] signal", "drop"),
        "reference": _Role("[reference] column", "line"),
        "supply": _Role("[circuit] supply", "hold", "voltage", "V"),
        "current": _Role("[circuit] current", "hold", "current", "A"),
        "marker": _Role("[test] onset", "keep", None, "1"),
        "speed": _Role("[recover] speed", "hold", "speed"),
    }
)


def to_channels(
    log: Log,
    roles: Mapping[str, str | int],
    units: Mapping[str, str] = MappingProxyType({}),
    *,
    object: Mapping[str, Any] | None = None,  # noqa: A002 - the run file's own word
    watch: Watch = SILENT,
) -> Channels:
    """Take the columns in use as numbers in one unit each, on log time.

    Parameters
    ----------
    log : Log
        From `read_log`.
    roles : mapping of role to column key
        ``time`` and ``signal``; ``reference``, ``supply``, ``current``, ``marker``, ``speed``.
    units : mapping of str to str
        By role or by column key; overrules the log's own, with a caution where they differ.
    object : mapping, optional
        ``column`` and ``value``: which rows of a long-format file to keep.
    watch : Watch
        Progress and cancelling.

    Raises
    ------
    InputError
        Where a column or a unit can't be used, dates are ambiguous, or fewer than 8 samples remain.
    """
    columns = {role: log.column(key, _where(role)) for role, key in roles.items()}
    _check_unit_keys(log, units, columns)
    named = {role: _unit_of(role, column, units) for role, column in columns.items()}
    times, work, chosen = _read(log, columns, named, object, watch)
    work.notes[:0] = [words for _, words in named.values() if words]
    written = {role: unit for role, (unit, _) in named.items() if unit and role != "time"}
    on_log_time(work, times, chosen)
    order(work)
    fill(work, {role: _use(role, columns[role]) for role in work.values})
    merge(work)
    check_enough(log.path, work)
    shown = {}
    for role, unit in written.items():
        shown[role] = unit if role == "marker" else canonical(unit)
        work.values[role] = convert(work.values[role], unit, shown[role])
    look_through(work)
    return Channels(
        work.time_s,
        MappingProxyType(work.values),
        MappingProxyType(shown),
        MappingProxyType(written),
        work.rows,
        times.origin,
        tuple(work.repairs),
        (*log.cautions, *work.notes, *(r.words for r in work.repairs)),
    )


def _use(role: str, column: Column) -> Use:
    return Use(
        column.short_name or f"number {column.number}",
        _where(role),
        _ROLES[role].absent if role in _ROLES else "keep",
    )


def _where(role: str) -> str:
    return _ROLES[role].where if role in _ROLES else f"[log] {role}"


def _check_unit_keys(log: Log, units: Mapping[str, str], columns: Mapping[str, Column]) -> None:
    """Refuse units for a role or a column that isn't there, and units that aren't any."""
    for key, unit in units.items():
        if parse_unit(unit) is None:
            raise InputError(
                f"[log] units.{key}", f'"{unit}" is no unit known here', _nearest_unit(unit)
            )
        if key not in columns and key not in _ROLES and key != "time":
            log.column(key, f"[log] units.{key}")


def _nearest_unit(text: str) -> str:
    known = ("s", "min", "h", "ms", "V", "mV", "A", "mA", "uA", "ohm", "kohm", "degC", "degF",
             "K", "counts", "m/s")  # fmt: skip
    near = difflib.get_close_matches(text, known, n=1, cutoff=0.4)
    return f'did you mean "{near[0]}"?' if near else f"use one such as {', '.join(known)}"


def _unit_of(role: str, column: Column, units: Mapping[str, str]) -> tuple[str | None, str]:
    """Return a column's unit, and a caution where run file and log differ."""
    use = _ROLES.get(role)
    keys = (role, column.name, column.short_name, str(column.number))
    given = next((parse_unit(units[k]) for k in keys if k and k in units), None)
    unit = given or column.unit or (use.assumed if use else None)
    name = column.short_name or f"number {column.number}"
    words = ""
    if given and column.unit and given != column.unit:
        words = (
            f'column "{name}" is in {column.unit} by the log and in {given} by the run file, which '
            "was followed; take the unit out of the run file if it is wrong"
        )
    if unit is None:
        if role == "time":
            return None, ""
        raise InputError(
            _where(role), f'the unit of column "{name}" is not stated',
            f'give it, as in units = {{ {role if role == "signal" else chr(34) + name + chr(34)} = '
            '"V" } under [log]',
        )  # fmt: skip
    wanted = "time" if role == "time" else (use.kind if use else None)
    if wanted and dimension(unit) != wanted and column.kind != "stamp":
        raise InputError(
            _where(role), f'column "{name}" is in {unit}, which is no unit of {wanted}',
            "choose another column, or give its unit under [log] units",
        )  # fmt: skip
    return unit, words


def _read(
    log: Log,
    columns: Mapping[str, Column],
    named: Mapping[str, tuple[str | None, str]],
    chosen: Mapping[str, Any] | None,
    watch: Watch,
) -> tuple[Times, Work, NDArray[np.bool_] | None]:
    """Read all columns in use in one pass."""
    decimal, missing, time = log.reading.decimal or ".", log.missing, columns["time"]
    clock: NumberTimes | StampTimes = StampTimes(log.reading.day_first, log.rows)
    if time.kind == "number":
        clock = NumberTimes(named["time"][0], decimal, missing, log.rows)
    takers = {role: NumberTaker(decimal, missing, log.rows) for role in columns if role != "time"}
    picker = None if chosen is None else _Picker(log, chosen)
    used = [*columns.values(), *([] if picker is None else [picker.column])]
    numbers = list(dict.fromkeys(c.number for c in used))
    rows, odd, odd_row = Growing(log.rows, np.int64), 0, 0
    for batch in log.source.batches(numbers, watch):
        by_number = dict(zip(numbers, batch.fields, strict=True))
        rows.add(batch.rows)
        odd, odd_row = odd + batch.odd_rows, odd_row or batch.odd_example
        clock.add(by_number[time.number])
        for role, taker in takers.items():
            taker.add(by_number[columns[role].number])
        if picker is not None:
            picker.add(by_number[picker.column.number])
    times = clock.finish("[log] time", time.short_name or f"number {time.number}")
    work = Work(times.seconds, {role: t.finish() for role, t in takers.items()}, rows.finish())
    work.notes += times.notes
    work.say("rows of another width", odd, f"{odd} rows with another number of fields than the "
             f"rest were left out, the first is row {odd_row}")  # fmt: skip
    for role, taker in takers.items():
        # Where the time is unreadable too, the row goes anyway.
        count = int(np.isfinite(times.seconds[taker.unreadable]).sum())
        work.say("unreadable", count, f'{count} fields of the {role} column hold no number ("'
                 f'{taker.example}", say) and count as missing')  # fmt: skip
    return times, work, None if picker is None else picker.finish()


class _Picker:
    """Which rows of a long-format file belong to one object."""

    def __init__(self, log: Log, chosen: Mapping[str, Any]) -> None:
        self.column = log.column(chosen["column"], "[log] object")
        self._value = str(chosen["value"]).strip()
        self._masks: list[NDArray[np.bool_]] = []
        self._seen: dict[str, None] = {}

    def add(self, column: Any) -> None:
        """Take the column's next piece."""
        import pyarrow as pa
        import pyarrow.compute as pc

        texts = pc.utf8_trim_whitespace(pc.cast(column, pa.string()))
        if len(self._seen) < 50:
            self._seen |= dict.fromkeys(str(t) for t in pc.unique(texts).to_pylist()[:50] if t)
        mask = pc.fill_null(pc.equal(texts, self._value), False)
        self._masks.append(np.asarray(mask.to_numpy(zero_copy_only=False), dtype=bool))

    def finish(self) -> NDArray[np.bool_]:
        """Return the rows' mask; refuse an object that has none."""
        mask = np.concatenate(self._masks) if self._masks else np.zeros(0, bool)
        if mask.any():
            return mask
        near = difflib.get_close_matches(self._value, list(self._seen), n=1, cutoff=0.6)
        shown = ", ".join(f'"{s}"' for s in list(self._seen)[:10]) or "empty"
        name = self.column.short_name or f"number {self.column.number}"
        raise InputError(
            "[log] object",
            f'no row has "{self._value}" in column "{name}"',
            f'did you mean "{near[0]}"?' if near else f"the values there are {shown}",
        )
