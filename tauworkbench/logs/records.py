"""What reading a log hands on: ``Reading``, ``Column``, ``Repair``, ``Channels``."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

__all__ = ["Channels", "Column", "FloatArray", "Reading", "Repair"]

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Reading:
    """How a log is read: what is given overrules what would be found; None is found out.

    Attributes
    ----------
    delimiter : str
        The character between two fields; ``" "`` is any run of blanks and tabs.
    decimal : str
        ``"."`` or ``","``.
    encoding : str
        Of the text.
    header_rows : int
        Rows before the first sample: preamble, comments, header, units.
    day_first : bool
        In stamps such as 03/04/2026.
    missing : tuple of str
        Texts that stand for "no value", besides an empty field and NaN.
    """

    delimiter: str | None = None
    decimal: str | None = None
    encoding: str | None = None
    header_rows: int | None = None
    day_first: bool | None = None
    missing: tuple[str, ...] | None = None

    def __post_init__(self) -> None:
        if self.missing is not None:
            object.__setattr__(self, "missing", tuple(self.missing))


@dataclass(frozen=True)
class Column:
    """One column of a log.

    Attributes
    ----------
    name : str
        The full header without outer blanks; empty without a header.
    short_name : str
        The same without its bracketed unit.
    unit : str
        The unit that the log states, in the spelling of `units`; empty where none is.
    number : int
        From 1.
    kind : str
        ``"number"``, ``"stamp"`` or ``"text"``, from the file's first rows.
    """

    name: str
    short_name: str
    unit: str
    number: int
    kind: str = "number"


@dataclass(frozen=True, eq=False)
class Repair:
    """One kind of thing that was wrong with a log, how often, and where.

    Attributes
    ----------
    kind : str
        ``"spikes"``, ``"duplicates"``, ``"gaps"``, ...
    count : int
        How many samples, rows or places.
    words : str
        The caution, with its numbers.
    times_s : ndarray, shape (m,)
        Log times of (at most the first thousand of) them [s]; empty where they have none.
    values : ndarray, shape (m,)
        The signal set aside there, in its canonical unit; empty where nothing was.
    """

    kind: str
    count: int
    words: str
    times_s: FloatArray = field(default_factory=lambda: np.empty(0))
    values: FloatArray = field(default_factory=lambda: np.empty(0))

    def __str__(self) -> str:
        return self.words


@dataclass(frozen=True, eq=False)
class Channels:
    """The columns in use as numbers on one time base.

    Attributes
    ----------
    time_s : ndarray, shape (n,)
        Log time, strictly increasing: seconds since the earliest valid stamp of the whole file.
    values : mapping of str to ndarray, shape (n,)
        By role, in canonical units; a marker stays in the unit in which it was logged.
    units, written : mapping of str to str
        By role: the unit that ``values`` have, and the unit that the log has.
    rows : ndarray, shape (n,)
        Row of the file, from 1, each sample came from.
    time_origin : str
        What log time 0 was.
    repairs : tuple of Repair
        What was wrong and what was done about it.
    cautions : tuple of str
        The repairs in words, and what else a reader of the result must know.
    """

    time_s: FloatArray
    values: Mapping[str, FloatArray]
    units: Mapping[str, str]
    written: Mapping[str, str]
    rows: NDArray[np.int64]
    time_origin: str
    repairs: tuple[Repair, ...] = ()
    cautions: tuple[str, ...] = ()
