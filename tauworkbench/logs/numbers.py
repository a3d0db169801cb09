"""Fields as numbers: what is missing, what can't be read."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .records import FloatArray

__all__ = ["Growing", "NumberTaker", "to_numbers"]

# What Arrow is asked to read as a number; RE2.
_NUMBER = r"^[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$"


class Growing:
    """One array that grows at its end; parts in a list would need the memory twice when joined.

    Parameters
    ----------
    expected : int
        How many values are expected; memory that isn't filled isn't used either.
    dtype : type
        Of the values.
    """

    def __init__(self, expected: int, dtype: type = float) -> None:
        # A damaged file may promise any number of rows.
        self._array: NDArray[Any] = np.empty(min(max(expected, 16), 1 << 26), dtype)
        self._size = 0

    def add(self, values: NDArray[Any]) -> None:
        """Append values."""
        end = self._size + values.size
        if end > self._array.size:
            longer = np.empty(max(end, self._array.size * 3 // 2), self._array.dtype)
            longer[: self._size] = self._array[: self._size]
            self._array = longer
        self._array[self._size : end] = values
        self._size = end

    def finish(self) -> NDArray[Any]:
        """Return what was added; a view that owns its memory alone."""
        return self._array[: self._size]


@dataclass
class Numbers:
    """Values (NaN where there is none), and which fields were neither number nor missing."""

    values: FloatArray
    unreadable: NDArray[np.intp] = field(default_factory=lambda: np.empty(0, np.intp))
    example: str = ""


class NumberTaker:
    """A column of numbers, taken piece by piece.

    Attributes
    ----------
    example : str
        The first field that was neither a number nor missing.
    """

    def __init__(self, decimal: str, missing: Sequence[str], expected: int) -> None:
        self._decimal, self._missing = decimal, missing
        self._values = Growing(expected)
        self._size = 0
        self._unreadable: list[NDArray[np.intp]] = []
        self.example = ""

    def add(self, column: Any) -> None:
        """Take the column's next piece."""
        found = to_numbers(column, self._decimal, self._missing)
        self._values.add(found.values)
        self._unreadable.append(found.unreadable + self._size)
        self._size += found.values.size
        self.example = self.example or found.example

    @property
    def unreadable(self) -> NDArray[np.intp]:
        """Where fields were neither numbers nor missing."""
        return np.concatenate([np.empty(0, np.intp), *self._unreadable])

    def finish(self) -> FloatArray:
        """Return all values, NaN where there is none."""
        return self._values.finish()


def to_numbers(column: Any, decimal: str, missing: Sequence[str]) -> Numbers:
    """Return an Arrow column as numbers."""
    import pyarrow as pa
    import pyarrow.compute as pc

    if not (pa.types.is_string(column.type) or pa.types.is_large_string(column.type)):
        return Numbers(_typed(column))
    texts = pc.replace_substring(column, ",", ".") if decimal == "," else column
    given = _as_numbers(missing, decimal)
    try:
        values = _finite(pc.cast(texts, pa.float64()))
        if given.size:
            values[np.isin(values, given)] = np.nan
        return Numbers(values)
    except pa.ArrowInvalid:
        pass  # some field is no number
    texts = pc.utf8_trim(texts, " \t\xa0'\"")
    good = pc.match_substring_regex(texts, _NUMBER)
    values = _finite(pc.cast(pc.if_else(good, texts, pa.scalar(None, pa.string())), pa.float64()))
    markers = pa.array(["", *(m.replace(",", ".") for m in missing)], pa.string())
    strange = pc.invert(pc.or_(good, pc.is_in(pc.utf8_lower(texts), value_set=markers)))
    at = np.flatnonzero(strange.to_numpy(zero_copy_only=False))
    example = str(column[int(at[0])].as_py())[:40] if at.size else ""
    if given.size:
        values[np.isin(values, given)] = np.nan
    return Numbers(values, at, example)


def _as_numbers(missing: Sequence[str], decimal: str) -> FloatArray:
    """Return those markers that are numbers, so that -999 also means -999.00."""
    out = []
    for text in missing:
        try:
            out.append(float(text.replace(decimal, ".")))
        except ValueError:
            continue
    return np.array([x for x in out if np.isfinite(x)])


def _typed(column: Any) -> FloatArray:
    """A column that already has a type, durations in seconds; what is no number is missing."""
    import pyarrow as pa
    import pyarrow.compute as pc

    try:
        if pa.types.is_duration(column.type):
            whole = pc.cast(pc.cast(column, pa.duration("ns")), pa.int64())
            return _finite(pc.cast(whole, pa.float64(), safe=False)) / 1e9
        if pa.types.is_boolean(column.type):
            column = pc.cast(column, pa.int8())
        return _finite(pc.cast(column, pa.float64(), safe=False))
    except (pa.ArrowInvalid, pa.ArrowNotImplementedError):
        return np.full(len(column), np.nan)


def _finite(column: Any) -> FloatArray:
    values = np.array(column.to_numpy(zero_copy_only=False), dtype=float)
    values[~np.isfinite(values)] = np.nan
    return values
