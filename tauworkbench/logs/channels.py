"""From a log's columns to channels: one unit each, one strictly increasing time base."""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..progress import SILENT, Watch
from ..units import canonical, convert, dimension, parse_unit
from . import repairs as find
from .clock import NumberTimes, StampTimes, Times
from .log import Log
from .numbers import to_numbers
from .records import Channels, Column, FloatArray, Repair

__all__ = ["to_channels"]

FEWEST = 8
_MOST_TIMES = 1000


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


@dataclass
class _Work:
    """The channels while they are being made; never handed out."""

    time_s: FloatArray
    values: dict[str, FloatArray]
    rows: NDArray[np.int64]
    repairs: list[Repair] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)

    def keep(self, mask: NDArray[np.bool_]) -> None:
        """Keep only some samples."""
        if mask.all():
            return
        self.time_s, self.rows = self.time_s[mask], self.rows[mask]
        for role in self.values:
            self.values[role] = self.values[role][mask]

    def say(self, kind: str, count: int, words: str, times_s: Any = ()) -> None:
        """Add a repair, if anything was repaired."""
        if count:
            self.repairs.append(Repair(kind, count, words, np.array(times_s[:_MOST_TIMES], float)))


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
    _on_log_time(work, times, chosen)
    _order(work)
    _fill(work, columns)
    _merge(work)
    _check_enough(log, work)
    shown = {}
    for role, unit in written.items():
        shown[role] = unit if role == "marker" else canonical(unit)
        work.values[role] = convert(work.values[role], unit, shown[role])
    _look_through(work)
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
) -> tuple[Times, _Work, NDArray[np.bool_] | None]:
    """Read all columns in use in one pass."""
    decimal, missing = log.reading.decimal or ".", log.missing
    numbers = list(dict.fromkeys(c.number for c in columns.values()))
    picked = log.column(chosen["column"], "[log] object") if chosen else None
    if picked is not None and picked.number not in numbers:
        numbers.append(picked.number)
    time = columns["time"]
    clock: Any = NumberTimes(named["time"][0], decimal, missing)
    if time.kind != "number":
        clock = StampTimes(log.reading.day_first)
    parts: dict[str, list[FloatArray]] = {r: [] for r in columns if r != "time"}
    strange: dict[str, list[NDArray[np.intp]]] = {r: [] for r in parts}
    examples: dict[str, str] = {}
    total = 0
    rows, masks, odd, odd_row = [], [], 0, 0
    values_seen: dict[str, int] = {}
    for batch in log.source.batches(numbers, watch):
        by_number = dict(zip(numbers, batch.fields, strict=True))
        rows.append(batch.rows)
        odd, odd_row = odd + batch.odd_rows, odd_row or batch.odd_example
        clock.add(by_number[time.number])
        for role, pieces in parts.items():
            found = to_numbers(by_number[columns[role].number], decimal, missing)
            pieces.append(found.values)
            strange[role].append(found.unreadable + total)
            examples[role] = examples.get(role) or found.example
        total += batch.rows.size
        if picked is not None and chosen is not None:
            masks.append(_same(by_number[picked.number], str(chosen["value"]), values_seen))
    name = time.short_name or f"number {time.number}"
    times = clock.finish("[log] time", name)
    work = _Work(times.seconds, {}, np.concatenate(rows) if rows else np.empty(0, np.int64))
    rows.clear()  # a long log's parts are let go as soon as they are joined
    for role in list(parts):
        work.values[role] = np.concatenate(parts.pop(role) or [np.empty(0)])
    work.notes += times.notes
    work.say("rows of another width", odd, f"{odd} rows with another number of fields than the "
             f"rest were left out, the first is row {odd_row}")  # fmt: skip
    for role, parts_of_role in strange.items():
        at = np.concatenate(parts_of_role or [np.empty(0, np.intp)])
        count = int(np.isfinite(times.seconds[at]).sum())  # without a time the row goes anyway
        work.say("unreadable", count, f'{count} fields of the {role} column hold no number ("'
                 f'{examples[role]}", say) and count as missing')  # fmt: skip
    return times, work, _picked(masks, chosen, values_seen)


def _same(column: Any, value: str, seen: dict[str, int]) -> NDArray[np.bool_]:
    """Return the rows of a long-format file that belong to one object."""
    import pyarrow as pa
    import pyarrow.compute as pc

    texts = pc.utf8_trim_whitespace(pc.cast(column, pa.string()))
    for text in pc.unique(texts).to_pylist()[:50]:
        if text and len(seen) < 50:
            seen[str(text)] = 1
    mask = pc.fill_null(pc.equal(texts, value.strip()), False)
    return np.asarray(mask.to_numpy(zero_copy_only=False), dtype=bool)


def _picked(
    masks: Sequence[NDArray[np.bool_]], chosen: Mapping[str, Any] | None, seen: Mapping[str, int]
) -> NDArray[np.bool_] | None:
    if chosen is None:
        return None
    mask = np.concatenate(masks) if masks else np.zeros(0, bool)
    if not mask.any():
        near = difflib.get_close_matches(str(chosen["value"]), list(seen), n=1, cutoff=0.6)
        shown = ", ".join(f'"{s}"' for s in list(seen)[:10]) or "empty"
        raise InputError(
            "[log] object",
            f'no row has "{chosen["value"]}" in column "{chosen["column"]}"',
            f'did you mean "{near[0]}"?' if near else f"the values there are {shown}",
        )
    return mask


def _on_log_time(work: _Work, times: Times, chosen: NDArray[np.bool_] | None) -> None:
    """Let the clock run on, count from the earliest stamp, drop rows without a time."""
    if times.kind == "clock":
        work.time_s, count = find.over_midnight(work.time_s)
        work.say("midnight", count, f"the clock runs over midnight {count} times and has no date; "
                 "each time a day was added")  # fmt: skip
    changes: list[Repair] = []
    if times.kind == "date" and not times.zoned:
        work.time_s, changes = find.clock_changes(work.time_s, times.start_day)
    good = np.isfinite(work.time_s)
    if not good.any():
        raise InputError(
            "[log] time", "the time column holds no time that can be read",
            "choose another column, or say how to read it under [log] read",
        )  # fmt: skip
    first = float(np.min(work.time_s, where=good, initial=np.inf))
    work.time_s -= first
    work.repairs += [Repair(r.kind, r.count, r.words, r.times_s - first) for r in changes]
    if chosen is not None:
        good &= chosen
    lost = int((~np.isfinite(work.time_s) & (chosen if chosen is not None else True)).sum())
    example = f' ("{times.example}", say)' if times.example else ""
    work.say("rows without a time", lost, f"{lost} rows without a readable time{example} were "
             "dropped")  # fmt: skip
    work.keep(good)


def _order(work: _Work) -> None:
    """Sort by time, where it isn't."""
    d = np.diff(work.time_s)
    if not (d < 0).any():
        return
    late = work.time_s < np.maximum.accumulate(work.time_s)
    count = int(late.sum())
    work.say("out of order", count, f"{count} rows came after later ones and were sorted by time",
             work.time_s[late])  # fmt: skip
    order = np.argsort(work.time_s, kind="stable")
    work.time_s, work.rows = work.time_s[order], work.rows[order]
    for role in work.values:
        work.values[role] = work.values[role][order]


def _fill(work: _Work, columns: Mapping[str, Column]) -> None:
    """Deal with absent values, each role in its way."""
    for role, values in work.values.items():
        for number, mask in find.sentinels(values).items():
            values[mask] = np.nan
            work.say("missing", int(mask.sum()), f"{int(mask.sum())} values of {number:g} in the "
                     f"{role} column stand for no value and were set aside; give missing = [] "
                     "under [log] read if they are real", work.time_s[mask])  # fmt: skip
        absent = ~np.isfinite(values)
        count = int(absent.sum())
        if not count:
            continue
        if count == values.size:
            name = columns[role].short_name or f"number {columns[role].number}"
            raise InputError(
                _where(role), f'column "{name}" holds no number', "choose another column"
            )
        how = _ROLES[role].absent if role in _ROLES else "keep"
        if how == "hold":
            work.values[role] = _held(values, absent)
        elif how == "line":
            work.values[role] = np.interp(work.time_s, work.time_s[~absent], values[~absent])
            work.say("drawn through", count, f"{count} absent values of the {role} column were "
                     "drawn as straight lines between its others", work.time_s[absent])  # fmt: skip
    absent = ~np.isfinite(work.values["signal"])
    count = int(absent.sum())
    work.say("missing samples", count, f"{count} rows without a signal were dropped",
             work.time_s[absent])  # fmt: skip
    work.keep(~absent)


def _held(values: FloatArray, absent: NDArray[np.bool_]) -> FloatArray:
    """Each value until the next; before the first, the first."""
    good = np.flatnonzero(~absent)
    at = np.searchsorted(good, np.arange(values.size), side="right") - 1
    return np.asarray(values[good[np.maximum(at, 0)]])


def _merge(work: _Work) -> None:
    """Average rows with one and the same stamp."""
    new = np.r_[True, np.diff(work.time_s) > 0]
    if new.all():
        return
    first = np.flatnonzero(new)
    size = np.diff(np.r_[first, new.size])
    signal = work.values["signal"]
    spread = np.maximum.reduceat(signal, first) - np.minimum.reduceat(signal, first)
    count = int(new.size - first.size)
    words = f"{count} rows repeat the stamp of another and were averaged with it"
    if (spread > 0).any():
        words += f"; their signals differ by up to {float(spread.max()):.4g}"
    if count > 0.3 * new.size:
        words += f"; the stamps are coarser than the log, {new.size / first.size:.3g} rows in each"
    work.say("duplicates", count, words, work.time_s[first[size > 1]])
    for role, values in work.values.items():
        finite = np.isfinite(values)
        number = np.add.reduceat(finite.astype(float), first)
        total = np.add.reduceat(np.where(finite, values, 0.0), first)
        with np.errstate(invalid="ignore", divide="ignore"):
            work.values[role] = np.where(number > 0, total / number, np.nan)
    work.time_s, work.rows = work.time_s[first], work.rows[first]


def _check_enough(log: Log, work: _Work) -> None:
    if work.time_s.size >= FEWEST:
        return
    merged = sum(r.count for r in work.repairs if r.kind == "duplicates")
    if merged and work.time_s.size == 1:
        raise InputError(log.path, "has one and the same time in all rows", "choose another column")
    raise InputError(
        log.path,
        f"holds {work.time_s.size} usable samples, and at least {FEWEST} are needed",
        "give a longer log" if not work.repairs else f"look at this: {work.repairs[0].words}",
    )


def _look_through(work: _Work) -> None:
    """Set spikes aside; note stuck values, gaps, stalls and a reference that is polled slowly."""
    signal = work.values["signal"]
    mask = find.spikes(signal)
    if mask.any():
        count = int(mask.sum())
        words = (
            f"{count} single samples stood far out of the signal and were set aside as spikes, the "
            f"first at {work.time_s[mask][0]:.6g} s"
        )
        work.repairs.append(
            Repair(
                "spikes", count, words, work.time_s[mask][:_MOST_TIMES], signal[mask][:_MOST_TIMES]
            )
        )
        work.keep(~mask)
    if "reference" in work.values:
        found = find.polled(work.time_s, work.values["reference"])
        if found is not None:
            before = work.values["reference"]
            work.values["reference"], period = found
            changed = int(np.count_nonzero(work.values["reference"] != before))
            work.say("polled", changed, f"the reference repeats its values: it was read only every "
                     f"{period:.4g} s, and {changed} repeats were replaced by straight lines "
                     "between its true updates; log it faster if its shape matters")  # fmt: skip
    work.repairs += find.find_stuck(work.time_s, work.values["signal"])
    stalls = find.find_stalls(work.time_s)
    work.repairs += stalls or find.find_gaps(work.time_s)
