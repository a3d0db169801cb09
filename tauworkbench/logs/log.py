"""A log that was found readable: its columns by name, and their values when asked for."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

from ..errors import InputError
from ..progress import SILENT, Watch
from .dialects import MISSING
from .numbers import Growing, to_numbers
from .records import Column, FloatArray, Reading, Repair

if TYPE_CHECKING:
    from .text import Batch

__all__ = ["Log", "Source", "find_column"]

_DELIMITERS = {"\t": "tabs", " ": "blanks", ",": "commas", ";": "semicolons", "|": "bars"}


class Source(Protocol):
    """Where a log's values come from."""

    def batches(self, numbers: Sequence[int], watch: Watch) -> Iterator[Batch]:
        """Yield the columns with these numbers (from 1), piece by piece."""


@dataclass(frozen=True, eq=False)
class Log:
    """A log's columns and how it is read; values are read from the file when asked for.

    Attributes
    ----------
    path : str
        The file.
    columns : tuple of Column
    sha256 : str
        Of the file's bytes.
    reading : Reading
        What was found, with what was given in its place.
    rows : int
        Filled rows after the header; rows found unreadable later are among them.
    source : Source
        Where the values come from.
    kind : str
        ``"text"``, ``"Excel"``, ``"Parquet"`` or ``"data frame"``.
    repairs : tuple of Repair
    cautions : tuple of str
        What was odd about the file as a whole.
    """

    path: str
    columns: tuple[Column, ...]
    sha256: str
    reading: Reading
    rows: int
    source: Source
    kind: str = "text"
    repairs: tuple[Repair, ...] = ()
    cautions: tuple[str, ...] = ()

    def column(self, key: str | int, where: str | None = None) -> Column:
        """Return the column that a key names: full header, header without unit, or number."""
        return find_column(self.columns, key, where or self.path)

    def numbers(self, key: str | int, watch: Watch = SILENT) -> FloatArray:
        """Return a column's values as logged, NaN where there is no number; shape (rows,)."""
        number = self.column(key).number
        decimal, missing = self.reading.decimal or ".", self.missing
        out = Growing(self.rows)
        for batch in self.source.batches([number], watch):
            out.add(to_numbers(batch.fields[0], decimal, missing).values)
        return out.finish()

    @property
    def missing(self) -> tuple[str, ...]:
        """Texts that stand for "no value", in lower case."""
        given = self.reading.missing
        return MISSING if given is None else ("nan", *(m.casefold() for m in given))

    def describe(self) -> tuple[str, ...]:
        """Return what was found, in words, a line each."""
        reading = self.reading
        how = self.kind
        if self.kind == "text":
            between = _DELIMITERS.get(reading.delimiter or "", f'"{reading.delimiter}"')
            sign = "comma" if reading.decimal == "," else "point"
            head = reading.header_rows
            how = f"text in {reading.encoding}, {between} between fields, decimal {sign}, " + (
                f"{head} row{'s' if head != 1 else ''} before the first sample"
                if head
                else "no header"
            )
        lines = [f"{self.rows} rows, {len(self.columns)} columns: {how}"]
        for c in self.columns:
            unit = f" in {c.unit}" if c.unit else ", unit not stated"
            kind = (
                ", time stamps" if c.kind == "stamp" else (", text" if c.kind == "text" else unit)
            )
            lines.append(f"column {c.number}: {c.short_name or 'no name'}{kind}")
        return (*lines, *(r.words for r in self.repairs), *self.cautions)


def find_column(columns: Sequence[Column], key: str | int, where: str) -> Column:
    """Return the column that a key names.

    Raises
    ------
    InputError
        For a name that no column has (with the nearest), or that several have.
    """
    text = " ".join(str(key).split())
    for attribute in ("name", "short_name"):
        found = [c for c in columns if getattr(c, attribute) == text and text]
        if len(found) == 1:
            return found[0]
        if found:
            which = ", ".join(f"{c.number} ({c.name})" for c in found[:6])
            raise InputError(
                where, f'"{text}" names {len(found)} columns', f"give one's number or name: {which}"
            )
    if text.isdecimal() and 1 <= int(text[:9]) <= len(columns):
        return columns[int(text[:9]) - 1]
    raise InputError(where, f'there is no column "{text[:80]}"', _nearest(columns, text))


def _nearest(columns: Sequence[Column], text: str) -> str:
    names = [c.short_name for c in columns if c.short_name]
    if text.isdecimal() or not names:
        return f"the columns are numbered from 1 to {len(columns)}"
    folded = {n.casefold(): n for n in reversed(names)}
    near = difflib.get_close_matches(text.casefold(), folded, n=1, cutoff=0.5)
    if near:
        return f'did you mean "{folded[near[0]]}"?'
    shown = ", ".join(f'"{n}"' for n in names[:8])
    return f"the columns are {shown}{' and more' if len(names) > 8 else ''}"
