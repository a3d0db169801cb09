"""What a log is once it is read: columns of text, and how they were found."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..records import FloatArray

__all__ = ["Channels", "Column", "Log", "Reading", "Repair"]

TextArray = NDArray[np.object_]


@dataclass(frozen=True)
class Reading:
    """How a file is read; None stands for what is to be found out."""

    delimiter: str | None = None
    decimal: str | None = None
    encoding: str | None = None
    header_rows: int | None = None
    day_first: bool | None = None
    missing: tuple[str, ...] | list[str] | None = None


@dataclass(frozen=True)
class Repair:
    """Something mended, counted: for the cautions and to be shown on a plot."""

    kind: str
    count: int
    words: str
    times_s: tuple[float, ...] = ()


@dataclass(frozen=True)
class Column:
    """One column: its number from 1, header, header without unit, and the unit written there."""

    number: int
    name: str
    short_name: str
    unit: str | None


@dataclass(frozen=True, eq=False)
class Log:
    """A file's columns as text, with what was found out about it."""

    path: Path
    columns: tuple[Column, ...]
    sha256: str
    reading: Reading
    rows: int
    cells: tuple[TextArray, ...]
    first_row: int = 1
    repairs: tuple[Repair, ...] = ()
    cautions: tuple[str, ...] = ()
    missing: frozenset[str] = field(default_factory=frozenset)

    def column(self, key: str | int, where: str = "column") -> Column:
        """Find a column by its header, its header without the unit, or its number from 1."""
        word = str(key).strip()
        for same in (
            [c for c in self.columns if c.name == word],
            [c for c in self.columns if c.short_name == word],
            [c for c in self.columns if str(c.number) == word],
        ):
            if len(same) == 1:
                return same[0]
            if same:
                raise InputError(
                    where,
                    f'"{word}" is the name of {len(same)} columns',
                    f"give its number: {', '.join(str(c.number) for c in same)}",
                )
        names = [c.short_name or c.name or str(c.number) for c in self.columns]
        near = difflib.get_close_matches(word, names, n=1)
        how = f'did you mean "{near[0]}"?' if near else f"the columns are {', '.join(names[:20])}"
        raise InputError(where, f'"{word}" is not a column of {self.path.name}', how)

    def text(self, key: str | int) -> TextArray:
        """Return a column's cells as they stand, without outer blanks."""
        return self.cells[self.column(key).number - 1]

    def numbers(self, key: str | int) -> FloatArray:
        """Return a column as numbers, nan where a cell is none; shape (rows,)."""
        from .cells import to_numbers

        return to_numbers(self.text(key), self.reading.decimal or ".", self.missing)

    def describe(self) -> tuple[str, ...]:
        """Say in words what was found."""
        r = self.reading
        names = {",": "commas", ";": "semicolons", "\t": "tabs", " ": "blanks"}
        delimiter = names.get(r.delimiter or "", r.delimiter or "none")
        return (
            f"{self.rows} rows, {len(self.columns)} columns, apart by {delimiter}, decimal "
            f'"{r.decimal}", {r.encoding}, {r.header_rows} rows before the first sample',
        )


@dataclass(frozen=True, eq=False)
class Channels:
    """The columns in use as numbers on one time base.

    Attributes
    ----------
    time_s : ndarray, shape (n,)
        Log time, strictly increasing [s].
    values : mapping of str to ndarray
        By role, in ``units``.
    units, written : mapping of str to str
        The unit that the values have, and the one that they were written in.
    rows : ndarray of int, shape (n,)
        The file's row of each sample, from 1.
    time_origin : str
        What log time 0 was.
    """

    time_s: FloatArray
    values: Mapping[str, FloatArray]
    units: Mapping[str, str]
    written: Mapping[str, str]
    rows: NDArray[np.intp]
    time_origin: str
    repairs: tuple[Repair, ...] = ()
    cautions: tuple[str, ...] = ()
