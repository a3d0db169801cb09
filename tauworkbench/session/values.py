"""Checks of single values against their key: each reader takes what TOML gave, or refuses."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

from ..errors import InputError
from .keys import Key, keys_of, nearest
from .toml_file import shown

__all__ = ["read_table", "read_value", "suggestion"]


class _WrongError(Exception):
    """The value isn't of the kind asked for; the text says what it is."""


def read_value(key: Key, value: Any, where: str) -> Any:
    """Return a value in the form that a choice keeps, or say what is wrong with it.

    Parameters
    ----------
    key : Key
        What may stand there.
    value : object
        As TOML or a widget gave it.
    where : str
        For the message: ``file [table] key``.
    """
    if any(type(value) is type(w) and value == w for w in key.words):
        return value
    how = f"give {key.allowed}" + (f", such as {key.example}" if key.example else "")
    try:
        out = _READERS[key.takes](value)
        for number in out if isinstance(out, tuple) else (out,):
            if isinstance(number, int | float) and not isinstance(number, bool):
                _check_limits(key, number)
    except _WrongError as e:
        raise InputError(where, str(e) or f"{shown(value)} can't be used", how) from None
    return out


def read_table(table: str, given: Any, where: str) -> dict[str, Any]:
    """Read one table's keys, the tables within it too.

    Parameters
    ----------
    table : str
        Its name in `keys`, e.g. ``"log"`` or ``"circuit.counts"``.
    given : object
        What TOML gave in its place.
    where : str
        The file and the table: ``run.toml [log]``.
    """
    if not isinstance(given, Mapping):
        raise InputError(where, f"is {shown(given)}, not a table", f"write [{table}] as a table")
    known = keys_of(table)
    out = {}
    for name, value in given.items():
        at = f"{where} {name}" if where.endswith("]") else f"{where}.{name}"
        if name not in known:
            raise InputError(at, "there is no such key", suggestion(name, known))
        if name in ("circuit", "law") and known[name].takes == "table":
            out[name] = read_table(name, value, at)
        elif known[name].takes == "table":
            out[name] = read_table(f"{table}.{name}", value, at)
        else:
            out[name] = read_value(known[name], value, at)
    for name, key in known.items():
        if key.required and name not in out and "." in table:
            raise InputError(f"{where}.{name}", "is missing", f"give {key.allowed}")
    return out


def suggestion(name: str, known: Mapping[str, Any]) -> str:
    """Say which known name an unknown one was probably meant to be."""
    near = nearest(name, known)
    return f'did you mean "{near}"?' if near else f"the keys here are {', '.join(known)}"


def _number(value: Any) -> float:
    if isinstance(value, str):
        hint = " (the decimal sign is a point)" if "," in value else ""
        raise _WrongError(f"{shown(value)} is a text, not a number{hint}")
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise _WrongError(f"{shown(value)} is not a number")
    try:
        out = float(value)
    except OverflowError:
        raise _WrongError("the number is too large") from None
    if not math.isfinite(out):
        raise _WrongError(f"{shown(value)} is not a finite number")
    return out


def _whole(value: Any) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or abs(value) > 2**53:
        raise _WrongError(f"{shown(value)} is not a whole number")
    return value


def _switch(value: Any) -> bool:
    if not isinstance(value, bool):
        raise _WrongError(f"{shown(value)} is neither true nor false")
    return value


def _text(value: Any) -> str:
    if not isinstance(value, str):
        raise _WrongError(f"{shown(value)} is not a text")
    if any(not (c.isprintable() or c in "\t\n") for c in value):
        raise _WrongError(f"{shown(value)} holds a control character")
    return value


def _column(value: Any) -> str:
    if isinstance(value, int) and not isinstance(value, bool):
        if not 1 <= value <= 100_000:
            raise _WrongError(f"{shown(value)} is no column; they count from 1")
        return str(value)
    if isinstance(value, float):
        raise _WrongError(f"{shown(value)} is no column")
    if not _text(value).strip():
        raise _WrongError("the column's name is empty")
    return str(value)


def _number_or_column(value: Any) -> float | str:
    return _column(value) if isinstance(value, str) else _number(value)


def _path(value: Any) -> str:
    if not _text(value).strip():
        raise _WrongError("the path is empty")
    if "\n" in value or len(value) > 4000:
        raise _WrongError(f"{shown(value)} is no path")
    return str(value)


def _list(value: Any) -> list[Any]:
    if not isinstance(value, list | tuple):
        raise _WrongError(f"{shown(value)} is not a list")
    return list(value)


def _numbers(value: Any) -> tuple[float, ...]:
    if not _list(value):
        raise _WrongError("the list is empty")
    return tuple(_number(v) for v in value)


def _pair(value: Any) -> tuple[float, ...]:
    out = _numbers(value)
    if len(out) != 2 or not out[0] < out[1]:
        raise _WrongError(f"{list(out[:3])} is not a start and a later end")
    return out


def _texts(value: Any) -> tuple[str, ...]:
    values = [value] if isinstance(value, str) else _list(value)
    return tuple(str(v) if type(v) in (int, float) else _text(v) for v in values)


def _units(value: Any) -> Mapping[str, str]:
    if not isinstance(value, Mapping):
        raise _WrongError(f"{shown(value)} is not a table")
    return MappingProxyType({str(k): _text(v) for k, v in value.items()})


def _word(value: Any) -> Any:
    raise _WrongError(f"{shown(value)} is not one of the values allowed")


def _check_limits(key: Key, number: float) -> None:
    wrong = (
        (key.above is not None and not number > key.above)
        or (key.low is not None and not number >= key.low)
        or (key.high is not None and not number <= key.high)
    )
    if wrong:
        raise _WrongError(f"{number:g} is out of its limits")


_READERS: dict[str, Callable[[Any], Any]] = {
    "number": _number,
    "whole": _whole,
    "switch": _switch,
    "text": _text,
    "column": _column,
    "number or column": _number_or_column,
    "path": _path,
    "pair": _pair,
    "numbers": _numbers,
    "texts": _texts,
    "units": _units,
    "word": _word,
}
