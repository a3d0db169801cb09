"""A time column's fields to seconds: numbers in a unit, epochs, stamps.

A collector takes the column piece by piece; what can only be judged on the whole file (which of
two numbers is the day, a clock that runs over midnight) is settled when all of it has been seen.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import UTC, date, datetime, timedelta
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..units import convert
from .dates import by_continuity, by_dateutil, clock_words, commonest, date_words
from .numbers import Growing, NumberTaker
from .records import FloatArray
from .stamps import FORMS, Parts, is_dated, parts_of

__all__ = ["NumberTimes", "StampTimes", "Times", "epoch_unit"]

_EPOCH_DAY = date(1970, 1, 1)
_EPOCH_FROM_S, _EPOCH_TO_S = 9.46e8, 4.1e9  # 2000 to 2099
_MOST_ODD = 100_000
_DAY_S, _DAY_NS = 86400.0, 86_400_000_000_000


@dataclass
class Times:
    """A time column in seconds.

    Attributes
    ----------
    seconds : ndarray, shape (n,)
        From some fixed start; NaN where unreadable [s].
    kind : str
        ``"number"``, ``"date"`` or ``"clock"`` (without a date).
    origin : str
        The words for log time 0, the earliest time.
    start_day : int
        The day (since 1970-01-01) on which ``seconds`` start; for dates.
    zoned : bool
        Whether the stamps tell their zone, so that no daylight saving is in them.
    unreadable, example : int, str
        Fields neither missing nor a time.
    notes : list of str
        What was taken for granted.
    """

    seconds: FloatArray
    kind: str
    origin: str = ""
    start_day: int = 0
    zoned: bool = False
    unreadable: int = 0
    example: str = ""
    notes: list[str] = field(default_factory=list)

    @property
    def first_s(self) -> float:
        """The earliest time [s]; NaN without any."""
        good = np.isfinite(self.seconds)
        return float(np.min(self.seconds, where=good, initial=np.inf)) if good.any() else np.nan


def epoch_unit(values: FloatArray) -> str | None:
    """Return the unit in which numbers count from 1970-01-01, told by their size; else None."""
    good = np.isfinite(values)
    if not good.any():
        return None
    low = float(np.min(values, where=good, initial=np.inf))
    high = float(np.max(values, where=good, initial=-np.inf))
    for unit, factor in (("s", 1.0), ("ms", 1e-3), ("us", 1e-6), ("ns", 1e-9)):
        if low * factor > _EPOCH_FROM_S and high * factor < _EPOCH_TO_S:
            return unit
    return None


class NumberTimes:
    """A time column of numbers in a unit; without one only an epoch is understood."""

    def __init__(
        self, unit: str | None, decimal: str, missing: tuple[str, ...], expected: int = 0
    ) -> None:
        self._unit = unit
        self._taker = NumberTaker(decimal, missing, expected)

    def add(self, column: Any) -> None:
        """Take the column's next piece."""
        self._taker.add(column)

    def finish(self, where: str, name: str) -> Times:
        """Return all times.

        Raises
        ------
        InputError
            Where the unit isn't known.
        """
        values = self._taker.finish()
        notes = []
        unit = self._unit
        if unit is None:
            unit = epoch_unit(values)
            if unit is None:
                raise InputError(
                    where, f'the unit of the time column "{name}" is not stated',
                    'give it, as in units = { time = "s" }',
                )  # fmt: skip
            notes.append(f'the numbers in "{name}" were taken as {unit} since 1970-01-01')
        seconds = convert(values, unit, "s")
        out = Times(
            seconds,
            "number",
            notes=notes,
            unreadable=self._taker.unreadable.size,
            example=self._taker.example,
        )
        first = out.first_s
        out.origin = f'{first:.9g} s in "{name}"' if np.isfinite(first) else ""
        if epoch_unit(seconds) == "s":
            stamp = datetime(1970, 1, 1, tzinfo=UTC) + timedelta(seconds=first)
            out.origin = stamp.isoformat().replace("+00:00", "Z")
        return out


class StampTimes:
    """A time column of stamps."""

    def __init__(self, day_first: bool | None, expected: int = 0) -> None:
        self._given = day_first
        self._form: str | None = None
        self._days: list[tuple[NDArray[np.int64], NDArray[np.int64]]] = []
        self._seconds = Growing(expected)
        self._dated: bool | None = None
        self._zoned = False
        self._odd = 0
        self._unreadable, self._example = 0, ""

    def add(self, column: Any) -> None:
        """Take the column's next piece."""
        import pyarrow as pa
        import pyarrow.compute as pc

        if pa.types.is_temporal(column.type):
            self._add_typed(column)
            return
        texts = pc.utf8_trim(pc.cast(column, pa.string()), " \t\xa0'\"")
        if self._form is None:
            self._form = commonest(texts)
        parts = parts_of(texts, self._form)
        if self._dated is None and np.isfinite(parts.second).any():
            self._dated = parts.dated
        days = [parts.day_first, parts.month_first]
        bad = np.flatnonzero(np.isnan(parts.second))
        if bad.size:
            days = [days[0].copy(), days[1].copy()]
            self._others(texts, bad, days, parts.second)
        self._zoned |= parts.zoned
        same = days[0] is days[1]
        self._days.append((days[0], days[0] if same else days[1]))
        self._seconds.add(parts.second)

    def _add_typed(self, column: Any) -> None:
        import pyarrow as pa
        import pyarrow.compute as pc

        self._dated = not pa.types.is_time(column.type)
        self._zoned |= bool(getattr(column.type, "tz", None))
        if self._dated:
            column = pc.cast(column, pa.timestamp("ns", getattr(column.type, "tz", None)))
        else:
            column = pc.cast(column, pa.time64("ns"))
        whole = pc.cast(column, pa.int64())
        valid = np.asarray(pc.is_valid(whole).to_numpy(zero_copy_only=False), dtype=bool)
        values = np.asarray(pc.fill_null(whole, 0).to_numpy(zero_copy_only=False), dtype=np.int64)
        day = values // _DAY_NS
        second = (values - day * _DAY_NS) / 1e9
        second[~valid] = np.nan
        self._days.append((day, day))
        self._seconds.add(second)

    def _others(
        self, texts: Any, rows: NDArray[np.int64], days: list[NDArray[np.int64]],
        second: FloatArray,
    ) -> None:  # fmt: skip
        """Read by the other forms, then by dateutil, what the column's own form didn't fit."""
        import pyarrow as pa

        for form in FORMS:
            if not rows.size:
                return
            if form == self._form or is_dated(form) is not (self._dated is not False):
                continue
            parts = parts_of(texts.take(pa.array(rows)), form)
            good = np.isfinite(parts.second)
            if good.any():
                at = rows[good]
                days[0][at], days[1][at] = parts.day_first[good], parts.month_first[good]
                second[at] = parts.second[good]
                self._dated, self._zoned = parts.dated, self._zoned or parts.zoned
                rows = rows[~good]
        for i in rows:
            self._odd_stamp(str(texts[int(i)].as_py()), int(i), days, second)

    def _odd_stamp(
        self, text: str, i: int, days: list[NDArray[np.int64]], second: FloatArray
    ) -> None:
        if not text or text.casefold() in ("nan", "na", "n/a", "null", "none", "nat", "-"):
            return
        stamp = None
        if self._odd < _MOST_ODD and self._dated is not False:
            self._odd += 1
            stamp = by_dateutil(text, bool(self._given))
        if stamp is None:
            self._unreadable += 1
            self._example = self._example or text[:40]
            return
        self._dated = True
        self._zoned |= stamp.tzinfo is not None
        plain = stamp.replace(tzinfo=None)
        days[0][i] = days[1][i] = (plain.date() - _EPOCH_DAY).days
        midnight = datetime.combine(plain.date(), datetime.min.time())
        second[i] = (plain - midnight).total_seconds()

    def finish(self, where: str, name: str) -> Times:
        """Return all times.

        Raises
        ------
        InputError
            Where nothing tells which of two numbers is the day, and the elapsed times depend on it.
        """
        second: FloatArray = self._seconds.finish()
        out = Times(
            second, "date" if self._dated else "clock", zoned=self._zoned,
            unreadable=self._unreadable, example=self._example,
        )  # fmt: skip
        if out.kind == "clock":
            first = out.first_s
            if np.isfinite(first):
                out.origin = f"{clock_words(float(second[np.isfinite(second)][0]))} by the log's "
                out.origin += "clock, which shows no date"
            return out
        day, note = self._settled(second, where, name)
        if note:
            out.notes.append(note)
        second[day == Parts.NONE] = np.nan
        good = np.isfinite(second)
        if not good.any():
            return out
        out.start_day = int(day[good].min())
        second += (day - out.start_day) * _DAY_S
        second[~good] = np.nan
        first = out.first_s
        out.origin = date_words(out.start_day, first) + ("Z" if out.zoned else "")
        return out

    def _settled(self, second: FloatArray, where: str, name: str) -> tuple[NDArray[np.int64], str]:
        """Return the days in the order that the file or its reader settles, and a note."""
        one = np.concatenate([d for d, _ in self._days])
        if all(d is m for d, m in self._days):
            return one, ""
        two = np.concatenate([m for _, m in self._days])
        self._days.clear()
        if self._given is not None:
            return (one, "") if self._given else (two, "")
        seen = np.isfinite(second)
        as_day, as_month = ((x != Parts.NONE) & seen for x in (one, two))
        if as_day.sum() != as_month.sum():
            return (one, "") if as_day.sum() > as_month.sum() else (two, "")
        if np.array_equal(one[seen], two[seen]):
            return one, ""
        both = as_day & as_month
        return by_continuity(one, two, second, both, (where, name))
