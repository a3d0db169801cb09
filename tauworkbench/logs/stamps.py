"""Time stamps as text: which form they have, and the seconds that they mean.

A form is a regular expression with named groups, an entry of `FORMS`; the arithmetic is said once.
The expressions run in Python's `re` and in Arrow's RE2 alike.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .records import FloatArray

__all__ = ["FORMS", "Parts", "form_of", "is_dated", "is_stamp", "parts_of"]

_YMD = r"(?P<y>\d{4})[-/.](?P<mo>\d{1,2})[-/.](?P<d>\d{1,2})"
_ABY = r"(?P<a>\d{1,2})[-/.](?P<b>\d{1,2})[-/.](?P<y>\d{4}|\d{2})"
_D_NAME_Y = r"(?P<d>\d{1,2})[- /.]+(?P<name>[A-Za-zäé]{3,9})\.?[- /.,]+(?P<y>\d{4}|\d{2})"
_NAME_D_Y = r"(?P<name>[A-Za-zäé]{3,9})\.? +(?P<d>\d{1,2}),? +(?P<y>\d{4})"
_COMPACT = r"(?P<y>(?:19|20)\d\d)(?P<mo>[01]\d)(?P<d>[0-3]\d)"
_BETWEEN = r"(?:[T_,;]\s?|-|\s+)"
_CLOCK = (
    r"(?P<H>\d{1,2}):(?P<M>\d{1,2})(?::(?P<S>\d{1,2})(?P<f>[.,:]\d{1,9})?)?"
    r"(?:\s?(?P<half>[AaPp]\.?\s?[Mm]\.?))?"
)
_ZONE = r"(?:\s?(?P<z>Z|z|UTC|GMT|[+-]\d{2}:?\d{2}|[+-]\d{2}))?"
_COMPACT_CLOCK = r"(?P<H>[0-2]\d)(?P<M>[0-5]\d)(?P<S>[0-6]\d)(?P<f>[.,]\d{1,9})?"
_ELAPSED = r"(?P<H>\d{1,5}):(?P<M>[0-5]\d):(?P<S>[0-5]\d)(?P<f>[.,]\d{1,9})?"

# Order of preference where two fit.
FORMS: Mapping[str, str] = MappingProxyType(
    {
        "year first": f"^{_YMD}{_BETWEEN}{_CLOCK}{_ZONE}$",
        "numeric date": f"^{_ABY}{_BETWEEN}{_CLOCK}{_ZONE}$",
        "compact": f"^{_COMPACT}[T_ -]?{_COMPACT_CLOCK}{_ZONE}$",
        "day, month name": f"^{_D_NAME_Y}{_BETWEEN}{_CLOCK}{_ZONE}$",
        "month name, day": f"^{_NAME_D_Y}{_BETWEEN}{_CLOCK}{_ZONE}$",
        "clock before date": f"^{_CLOCK}\\s+{_ABY}$",
        "clock before year": f"^{_CLOCK}\\s+{_YMD}$",
        "clock": f"^{_CLOCK}$",
        "elapsed hours": f"^{_ELAPSED}$",
        "elapsed minutes": r"^(?P<M>\d{1,4}):(?P<S>[0-5]\d)(?P<f>[.,]\d{1,9})$",
    }
)
_COMPILED = {name: re.compile(text) for name, text in FORMS.items()}
_WITHOUT_DATE = ("clock", "elapsed hours", "elapsed minutes")
_MOST_LETTERS = 48

# The first three letters tell the month in English, German, French and Spanish, as far as they do.
_MONTHS: dict[str, int] = {
    word: number
    for number, words in enumerate(
        ("jan ene", "feb fév fev", "mar mär mrz", "apr avr abr", "may mai", "jun", "jul",
         "aug ago aoû aou", "sep set", "oct okt", "nov", "dec dez dic déc"), 1,
    )
    for word in words.split()
}  # fmt: skip


class Parts:
    """Stamps taken apart: ``day`` (days since 1970-01-01, either order), ``second`` of the day.

    Attributes
    ----------
    day_first, month_first : ndarray of int64, shape (n,)
        The same array where the form leaves no doubt; -2**62 where that order gives no date.
    second : ndarray of float, shape (n,)
        Seconds since midnight, in UTC where a zone was stated [s]; NaN where unreadable.
    dated, zoned : bool
        Whether there was a date; whether a zone.
    """

    NONE = -(2**62)

    def __init__(
        self,
        day_first: NDArray[np.int64],
        month_first: NDArray[np.int64],
        second: NDArray[np.float64],
        dated: bool,
        zoned: bool,
    ) -> None:
        self.day_first, self.month_first, self.second = day_first, month_first, second
        self.dated, self.zoned = dated, zoned


def is_stamp(text: str) -> bool:
    """Return whether a text is a time stamp of a known form."""
    return form_of(text) is not None


def form_of(text: str) -> str | None:
    """Return the name of the form that a text has."""
    if len(text) > _MOST_LETTERS or (":" not in text and not text[:8].isdigit()):
        return None
    for name, pattern in _COMPILED.items():
        match = pattern.match(text)
        if match and _in_range(name, match.groupdict()):
            return name
    return None


def _in_range(name: str, groups: Mapping[str, str | None]) -> bool:
    hour = int(groups.get("H") or 0)
    return name in _WITHOUT_DATE[1:] or hour <= 24


def parts_of(texts: Any, form: str) -> Parts:
    """Take an Arrow array of texts apart by one form.

    Texts of another form have no ``second`` (NaN).
    """
    import pyarrow.compute as pc

    found = pc.extract_regex(texts, FORMS[form])
    names = {field.name for field in found.type}
    matched = pc.is_valid(found).to_numpy(zero_copy_only=False).astype(bool)

    def column(name: str) -> Any:
        return pc.fill_null(pc.struct_field(found, name), "")

    def whole(name: str, default: int = 0) -> NDArray[np.int64]:
        if name not in names:
            return np.full(len(texts), default, np.int64)
        values = column(name)
        values = pc.if_else(pc.equal(values, ""), str(default), values)
        return np.asarray(pc.cast(values, "int64").to_numpy(zero_copy_only=False))

    hour, minute, whole_second = whole("H"), whole("M"), whole("S")
    if "half" in names:
        hour = _twelve_hours(hour, column("half"))
    good = matched & (minute < 60) & (whole_second <= 60)
    good &= (hour <= 24) | (form in _WITHOUT_DATE[1:])
    second: FloatArray = np.asarray(
        hour * 3600.0 + minute * 60.0 + whole_second + _fraction(column, names), dtype=np.float64
    )
    zoned = False
    if "z" in names:
        offset, zoned = _zone(column("z"))
        second -= offset
    second[~good] = np.nan
    dated = form not in _WITHOUT_DATE
    none = np.zeros(len(texts), np.int64)
    if not dated:
        return Parts(none, none, second, False, zoned)
    days = _days(whole, column, names)
    return Parts(*days, second, True, zoned)


def _days(whole: Any, column: Any, names: set[str]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    year = whole("y")
    year = np.where(year < 100, year + np.where(year < 70, 2000, 1900), year)
    if "a" in names:
        a, b = whole("a"), whole("b")
        return _day(year, b, a), _day(year, a, b)
    month = _month(column("name")) if "name" in names else whole("mo")
    day = _day(year, month, whole("d"))
    return day, day


def _day(
    year: NDArray[np.int64], month: NDArray[np.int64], day: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Days since 1970-01-01; `Parts.NONE` where there is no such date."""
    good = (month >= 1) & (month <= 12) & (day >= 1) & (day <= 31)
    months = (year - 1970) * 12 + np.where(good, month, 1) - 1
    first = months.astype("datetime64[M]").astype("datetime64[D]")
    date = first + (np.where(good, day, 1) - 1).astype("timedelta64[D]")
    good &= date.astype("datetime64[M]").astype(np.int64) == months
    return np.where(good, date.astype(np.int64), Parts.NONE)


def _by_text(texts: Any, meaning: Any) -> NDArray[np.float64]:
    """Translate each distinct text once."""
    import pyarrow.compute as pc

    coded = pc.dictionary_encode(texts)
    table = np.array([meaning(str(x)) for x in coded.dictionary.to_pylist()] or [0.0], float)
    return np.asarray(table[coded.indices.to_numpy(zero_copy_only=False)])


def _month(texts: Any) -> NDArray[np.int64]:
    def meaning(text: str) -> float:
        word = text.casefold()
        return _MONTHS.get(word[:3], 0) if not word.startswith(("juil", "juill")) else 7

    return _by_text(texts, meaning).astype(np.int64)


def _twelve_hours(hour: NDArray[np.int64], texts: Any) -> NDArray[np.int64]:
    """12 a.m. is midnight and 12 p.m. noon."""
    half = _by_text(texts, lambda t: {"a": 0.0, "p": 12.0}.get(t[:1].casefold(), -1.0))
    return np.where(half < 0, hour, hour % 12 + half.astype(np.int64))


def _fraction(column: Any, names: set[str]) -> NDArray[np.float64] | float:
    import pyarrow.compute as pc

    if "f" not in names:
        return 0.0
    digits = pc.utf8_slice_codeunits(column("f"), 1)
    text = pc.binary_join_element_wise("0.", digits, "0", "")
    return np.asarray(pc.cast(text, "float64").to_numpy(zero_copy_only=False))


def _zone(texts: Any) -> tuple[NDArray[np.float64], bool]:
    """Return seconds to subtract for UTC, and whether any zone was stated."""

    def meaning(text: str) -> float:
        if not text or text[0] not in "+-":
            return 0.0
        digits = text[1:].replace(":", "").ljust(4, "0")
        value = int(digits[:2]) * 3600.0 + int(digits[2:4]) * 60.0
        return -value if text[0] == "-" else value

    import pyarrow.compute as pc

    stated = bool(pc.any(pc.not_equal(texts, "")).as_py())
    return _by_text(texts, meaning), stated


def is_dated(form: str) -> bool:
    """Return whether stamps of this form hold a date."""
    return form not in _WITHOUT_DATE
