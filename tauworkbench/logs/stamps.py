"""Time stamps as text: which form they have, and the seconds that they mean.

A form is a regular expression with named groups, an entry of `FORMS`; the arithmetic is said once.
The expressions run in Python's `re` and in Arrow's RE2 alike.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
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
    fields = _ByPlace.of(texts, form) or _ByPattern(texts, form)
    hour, minute, whole_second = (fields.whole(name) for name in "HMS")
    if "half" in fields.names:
        hour = _twelve_hours(hour, fields.meant("half", _half))
    good = fields.matched & (minute < 60) & (whole_second <= 60)
    good &= (hour <= 24) | (form in _WITHOUT_DATE[1:])
    second: FloatArray = np.asarray(hour * 3600.0 + minute * 60.0 + whole_second, np.float64)
    if "f" in fields.names:
        second += fields.fraction()
    zoned = False
    if "z" in fields.names:
        second -= fields.meant("z", _offset)
        zoned = fields.any_text("z")
    second[~good] = np.nan
    if form in _WITHOUT_DATE:
        none = np.zeros(second.size, np.int64)
        return Parts(none, none, second, False, zoned)
    return Parts(*_days(fields), second, True, zoned)


class _ByPattern:
    """The groups of a form in texts of any shape."""

    def __init__(self, texts: Any, form: str) -> None:
        import pyarrow.compute as pc

        self._found = pc.extract_regex(texts, FORMS[form])
        self.names = {field.name for field in self._found.type}
        self.matched = np.asarray(pc.is_valid(self._found).to_numpy(zero_copy_only=False), bool)

    def _column(self, name: str) -> Any:
        import pyarrow.compute as pc

        return pc.fill_null(pc.struct_field(self._found, name), "")

    def whole(self, name: str) -> NDArray[np.int64]:
        """Return a group as whole numbers, 0 where it is empty."""
        import pyarrow.compute as pc

        if name not in self.names:
            return np.zeros(self.matched.size, np.int64)
        texts = self._column(name)
        texts = pc.if_else(pc.equal(texts, ""), "0", texts)
        return np.asarray(pc.cast(texts, "int64").to_numpy(zero_copy_only=False))

    def fraction(self) -> FloatArray:
        """Return the parts of a second [s]."""
        import pyarrow.compute as pc

        digits = pc.utf8_slice_codeunits(self._column("f"), 1)
        texts = pc.binary_join_element_wise("0.", digits, "0", "")
        return np.asarray(pc.cast(texts, "float64").to_numpy(zero_copy_only=False))

    def meant(self, name: str, meaning: Callable[[str], float]) -> FloatArray:
        """Translate each distinct text of a group once."""
        import pyarrow.compute as pc

        coded = pc.dictionary_encode(self._column(name))
        table = np.array([meaning(str(x)) for x in coded.dictionary.to_pylist()] or [0.0], float)
        return np.asarray(table[coded.indices.to_numpy(zero_copy_only=False)])

    def any_text(self, name: str) -> bool:
        """Whether the group is filled anywhere."""
        import pyarrow.compute as pc

        return bool(pc.any(pc.not_equal(self._column(name), "")).as_py())


class _ByPlace:
    """The groups of a form in texts that differ in their digits only: 20 times as fast."""

    def __init__(self, letters: NDArray[np.uint8], match: re.Match[str]) -> None:
        self._letters, self._match = letters, match
        self.names = {name for name, text in match.groupdict().items() if text is not None}
        self.matched = np.ones(letters.shape[0], bool)

    @classmethod
    def of(cls, texts: Any, form: str) -> _ByPlace | None:
        """Return the groups, or None where the texts aren't all of one shape."""
        if not len(texts) or texts.null_count:
            return None
        first = str(texts[0].as_py())
        match = _COMPILED[form].match(first)
        if match is None or not first.isascii():
            return None
        _, offsets_buffer, data = texts.buffers()
        offsets = np.frombuffer(offsets_buffer, np.int32)[
            texts.offset : texts.offset + len(texts) + 1
        ]
        if not np.all(np.diff(offsets) == len(first)):
            return None
        letters = np.frombuffer(data, np.uint8)[offsets[0] : offsets[-1]].reshape(-1, len(first))
        for i, letter in enumerate(first):
            column = letters[:, i]
            alike = (column - 48 < 10) if letter.isdigit() else (column == ord(letter))
            if not alike.all():
                return None
        return cls(letters, match)

    def whole(self, name: str) -> NDArray[np.int64]:
        """Return a group as whole numbers, 0 where it is empty."""
        out = np.zeros(self.matched.size, np.int64)
        if name in self.names:
            for i in range(*self._match.span(name)):
                out = out * 10 + (self._letters[:, i] - 48)
        return out

    def fraction(self) -> FloatArray:
        """Return the parts of a second [s]."""
        start, end = self._match.span("f")
        out = np.zeros(self.matched.size, np.int64)
        for i in range(start + 1, end):
            out = out * 10 + (self._letters[:, i] - 48)
        return np.asarray(out / 10.0 ** (end - start - 1))

    def meant(self, name: str, meaning: Callable[[str], float]) -> FloatArray:
        """Translate the one text that the group has; a zone's digits may differ."""
        start, end = self._match.span(name)
        part = self._letters[:, start:end]
        if part.shape[0] and (part != part[0]).any():
            texts = [bytes(row).decode("ascii") for row in part]
            return np.array([meaning(text) for text in texts], float)
        return np.full(self.matched.size, meaning(self._match[name]))

    def any_text(self, name: str) -> bool:
        """Whether the group is filled."""
        return bool(self._match[name])


def _days(fields: _ByPlace | _ByPattern) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the days since 1970-01-01, with the day and with the month first."""
    year = fields.whole("y")
    year = np.where(year < 100, year + np.where(year < 70, 2000, 1900), year)
    if "a" in fields.names:
        a, b = fields.whole("a"), fields.whole("b")
        return _day(year, b, a), _day(year, a, b)
    named = "name" in fields.names
    month = fields.meant("name", _month).astype(np.int64) if named else fields.whole("mo")
    day = _day(year, month, fields.whole("d"))
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


def _month(text: str) -> float:
    word = text.casefold()
    return 7 if word.startswith("juil") else _MONTHS.get(word[:3], 0)


def _half(text: str) -> float:
    """Hours to add; less than 0 where neither half of the day is named."""
    return {"a": 0.0, "p": 12.0}.get(text[:1].casefold(), -1.0)


def _twelve_hours(hour: NDArray[np.int64], half: FloatArray) -> NDArray[np.int64]:
    """12 a.m. is midnight and 12 p.m. noon."""
    return np.where(half < 0, hour, hour % 12 + half.astype(np.int64))


def _offset(text: str) -> float:
    """Seconds that a zone is ahead of UTC."""
    if not text or text[0] not in "+-":
        return 0.0
    digits = text[1:].replace(":", "").ljust(4, "0")
    value = int(digits[:2]) * 3600.0 + int(digits[2:4]) * 60.0
    return -value if text[0] == "-" else value


def is_dated(form: str) -> bool:
    """Return whether stamps of this form hold a date."""
    return form not in _WITHOUT_DATE
