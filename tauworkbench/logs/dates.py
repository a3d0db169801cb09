"""What a whole column of dates tells, stamps of no known form, and dates in words."""

from __future__ import annotations

import re
import warnings
from collections import Counter
from collections.abc import Iterable
from datetime import UTC, date, datetime, timedelta
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from .records import FloatArray
from .stamps import FORMS, form_of

__all__ = ["by_continuity", "by_dateutil", "clock_words", "commonest", "date_words", "day_first_of"]

_EPOCH_DAY = date(1970, 1, 1)
_DEFAULTS = (datetime(2000, 1, 1), datetime(2001, 2, 2))
_DAY_S = 86400.0


def by_continuity(
    one: NDArray[np.int64],
    two: NDArray[np.int64],
    second: FloatArray,
    both: NDArray[np.bool_],
    place: tuple[str, str],
) -> tuple[NDArray[np.int64], str]:
    """Choose the order in which the log runs on; None is needed where elapsed times agree."""
    elapsed = [(d - d[0]) * _DAY_S + second[both] for d in (one[both], two[both])]
    where, name = place
    if np.allclose(elapsed[0], elapsed[1], rtol=0, atol=1e-6):
        a, b = (date_words(int(d[both][0]), 0.0)[:10] for d in (one, two))
        note = f'the date in "{name}" may be {a} or {b}; no elapsed time depends on it'
        return one, note
    largest = [float(np.max(np.abs(np.diff(e)))) for e in elapsed]
    for day, mine, other, words in (
        (one, largest[0], largest[1], "day"), (two, largest[1], largest[0], "month"),
    ):  # fmt: skip
        if mine < 0.5 * _DAY_S and other > 20 * _DAY_S:
            note = (
                f'the dates in "{name}" were read {words} first: the log then runs on without a '
                f"gap, and else one of {other / _DAY_S:.0f} days; day_first overrules it"
            )
            return day, note
    raise InputError(
        where,
        f'the dates in "{name}" may have the day or the month first, and no row tells which',
        "say so with day_first under [log] read",
    )


def commonest(texts: Any) -> str:
    """Return the form of most of a column's first texts."""
    head = [str(t) for t in texts.slice(0, 400).to_pylist() if t]
    count = Counter(f for f in map(form_of, head) if f is not None)
    if not count:
        return "year first"
    best = count.most_common(1)[0][0]
    longer = {"clock": "elapsed hours"}.get(best)
    if longer and any(form_of(t) is None and ":" in t for t in head):
        return longer
    return best


def day_first_of(texts: Iterable[str]) -> bool | None:
    """Return whether numeric dates have the day first, as far as these stamps tell."""
    found = set()
    for text in texts:
        form = form_of(text)
        match = re.match(FORMS[form], text) if form is not None else None
        groups = match.groupdict() if match is not None else {}
        if "a" in groups and max(int(groups["a"]), int(groups["b"])) > 12:
            found.add(int(groups["a"]) > 12)
    return found.pop() if len(found) == 1 else None


def by_dateutil(text: str, day_first: bool) -> datetime | None:
    """Return a complete stamp in UTC or without a zone; None for what is none."""
    from dateutil import parser

    if len(text) > 48 or sum(c.isdigit() for c in text) < 6 or ":" not in text:
        return None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # a zone's name that isn't known is passed over
            one, two = (
                parser.parse(text, dayfirst=day_first, default=default) for default in _DEFAULTS
            )
            if one != two:
                return None  # dateutil would put today's date where there is none
            return one if one.tzinfo is None else one.astimezone(UTC)
    except (ValueError, OverflowError, TypeError, AttributeError):
        return None


def clock_words(second: float) -> str:
    """Return a time of day [s] as ``hh:mm:ss``, with what there is of parts of a second."""
    whole = int(second)
    rest = f"{second - whole:.6f}"[1:].rstrip("0").rstrip(".")
    return f"{whole // 3600:02d}:{whole // 60 % 60:02d}:{whole % 60:02d}{rest}"


def date_words(day: int, second: float) -> str:
    """Return a date and time, from days since 1970-01-01 and seconds [s], in ISO 8601."""
    extra, second = divmod(second, _DAY_S)
    try:
        shown = (_EPOCH_DAY + timedelta(days=day + int(extra))).isoformat()
    except OverflowError:
        shown = f"day {day}"
    return f"{shown}T{clock_words(second)}"
