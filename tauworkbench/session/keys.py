"""All keys of a run file and of a campaign file, said once.

The table serves the checks of `choices`, the comments that ``new`` writes, ``tauworkbench help
KEY`` and the help beside a field of the bench. Which circuit or law takes which of its keys is
*not* said here: the circuits and laws themselves know, and `keys_of_kind` asks them.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator
from dataclasses import MISSING, dataclass, fields
from typing import Any

from .key_table import ROWS

__all__ = [
    "KEYS",
    "RUN_TABLES",
    "Key",
    "default",
    "key",
    "keys_of",
    "keys_of_kind",
    "kinds",
    "nearest",
    "tables",
]


@dataclass(frozen=True)
class Key:
    """One key of a table.

    Attributes
    ----------
    table, name : str
        E.g. ``"log"`` and ``"noise_u"``; a table within a table is ``"circuit.counts"``.
    takes : str
        A name in `choices`' table of readers: ``number``, ``whole``, ``switch``, ``text``,
        ``column``, ``number or column``, ``path``, ``pair``, ``numbers``, ``texts``, ``units``,
        ``table``, or ``word`` for nothing but ``words``.
    meaning : str
        One plain sentence.
    unit : str
        Empty for none.
    default : object
        What an absent key means; None for "not used" or "not known".
    words : tuple
        Values allowed beside what ``takes`` allows.
    above, low, high : float or None
        Limits of a number: greater than, at least, at most.
    required : bool
        Whether every run file must give it.
    example : str
        A value as TOML, for `new` and for help.
    """

    table: str
    name: str
    takes: str
    meaning: str
    unit: str = ""
    default: Any = None
    words: tuple[Any, ...] = ()
    above: float | None = None
    low: float | None = None
    high: float | None = None
    required: bool = False
    example: str = ""

    @property
    def address(self) -> str:
        """``[log] noise_u``; a key of a table within is ``[circuit] counts.bits``."""
        table, _, inner = self.table.partition(".")
        return f"[{table}] {inner + '.' if inner else ''}{self.name}"

    @property
    def allowed(self) -> str:
        """What may stand there, in words."""
        if self.name == "kind" and not self.words:
            return " or ".join(map(toml_word, kinds(self.table)))
        parts = [_TAKES[self.takes]] if self.takes != "word" else []
        parts += [toml_word(w) for w in self.words]
        limits = [
            f"{sign} {limit:g}"
            for sign, limit in ((">", self.above), (">=", self.low), ("<=", self.high))
            if limit is not None
        ]
        if limits:
            parts[0] += " " + " and ".join(limits)
        return " or ".join(parts) + (f" [{self.unit}]" if self.unit else "")


_TAKES = {
    "number": "a number",
    "whole": "a whole number",
    "switch": "true or false",
    "text": "a text",
    "column": "a column's header or its number from 1",
    "number or column": "a number, or a column",
    "path": "a file, relative to this file",
    "pair": "two increasing numbers",
    "numbers": "a list of numbers",
    "texts": "a list of texts",
    "units": "a table of a role or a column and its unit",
    "table": "a table",
}

KEYS: tuple[Key, ...] = tuple(
    Key(table, name, takes, meaning, **rest)
    for table, rows in ROWS.items()
    for name, takes, meaning, rest in rows
)
_INDEX = {(k.table, k.name): k for k in KEYS}
RUN_TABLES = ("log", "reference", "circuit", "law", "test", "model", "recover")


def key(table: str, name: str) -> Key:
    """Return the key of that table (``"log"``, ``"circuit.counts"``) and name."""
    return _INDEX[table, name]


def default(table: str, name: str) -> Any:
    """Return what an absent key means."""
    return _INDEX[table, name].default


def keys_of(table: str) -> dict[str, Key]:
    """Return the keys of one table by name, in order."""
    return {k.name: k for k in KEYS if k.table == table}


def tables() -> Iterator[str]:
    """Name each table, once and in order."""
    yield from dict.fromkeys(k.table for k in KEYS)


def kinds(table: str) -> dict[str, type]:
    """Return the kinds that ``[circuit]`` or ``[law]`` knows, by name."""
    if table == "circuit":
        from ..circuits import CIRCUITS

        return dict(CIRCUITS)
    from ..laws import LAWS

    return dict(LAWS)


def keys_of_kind(table: str, kind: str) -> dict[str, bool]:
    """Return the keys that one kind of circuit or law takes, and whether it needs each."""
    return {
        f.name: f.default is MISSING and f.default_factory is MISSING
        for f in fields(kinds(table)[kind])
        if f.init
    }


def nearest(word: str, known: Iterable[str]) -> str:
    """Return the nearest known word, or an empty text when none is near."""
    lower = {str(k).lower(): str(k) for k in known}
    found = difflib.get_close_matches(str(word).lower()[:80], lower, n=1, cutoff=0.6)
    return lower[found[0]] if found else ""


def toml_word(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    return f'"{value}"' if isinstance(value, str) else str(value)
