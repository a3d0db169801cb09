"""Typed text to a choice's value, and back; ``0,4`` and ``0.4`` are the same number."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from ..errors import InputError
from ..session.keys import Key

__all__ = ["NotANumberError", "number_of", "text_of", "value_of"]


class NotANumberError(ValueError):
    """The text isn't a number; it says what it is."""


def number_of(text: str) -> float:
    """Read a number that was typed, with a decimal point or a decimal comma.

    Raises
    ------
    NotANumberError
        Where it is no number, or could be two.

    Examples
    --------
    >>> number_of("0,4") == number_of(" 0.4 ") == 0.4
    True
    """
    # The thin, narrow and hard spaces that some programs put between thousands.
    bare = "".join(text.split()).replace("\u2212", "-")
    if "," in bare and "." in bare:
        raise NotANumberError(f"{text.strip()} has a comma and a point; write one decimal sign")
    if bare.count(",") > 1 or bare.count(".") > 1:
        raise NotANumberError(f"{text.strip()} has two decimal signs; write one")
    if "_" in bare:
        raise NotANumberError(f"{text.strip()} is not a number")
    try:
        return float(bare.replace(",", "."))
    except ValueError:
        raise NotANumberError(f"{text.strip()[:40]} is not a number") from None


def value_of(key: Key, text: str) -> Any:
    """Return what a key's text means; None for no text.

    The value is still to be checked, as any value of a run file is.

    Raises
    ------
    InputError
        With the key, and what may stand there.
    """
    text = text.strip()
    if not text:
        return None
    for word in key.words:
        if text == text_of(word):
            return word
    try:
        return _READERS.get(key.takes, str)(text)
    except NotANumberError as e:
        raise InputError(key.address, str(e), f"give {key.allowed}") from None


def text_of(value: Any) -> str:
    """Write a value as it would be typed.

    Examples
    --------
    >>> text_of(0.4), text_of(10000.0), text_of(True), text_of((8.0, 1.3))
    ('0.4', '10000', 'yes', '8; 1.3')
    """
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        short = f"{value:.12g}"
        return short if float(short) == value else repr(value)
    if isinstance(value, list | tuple):
        return "; ".join(text_of(v) for v in value)
    if isinstance(value, Mapping):
        return "; ".join(f"{k} = {text_of(v)}" for k, v in value.items())
    return str(value)


def _whole(text: str) -> int:
    number = number_of(text)
    if number != int(number):
        raise NotANumberError(f"{text} is not a whole number")
    return int(number)


def _switch(text: str) -> bool:
    known = {"yes": True, "true": True, "no": False, "false": False}
    if text.lower() not in known:
        raise NotANumberError(f"{text[:40]} is neither yes nor no")
    return known[text.lower()]


def _list(text: str) -> list[str]:
    return [part for part in (p.strip() for p in text.split(";")) if part]


def _numbers(text: str) -> list[float]:
    return [number_of(part) for part in (_list(text) if ";" in text else text.split())]


def _number_or_text(text: str) -> float | str:
    try:
        return number_of(text)
    except NotANumberError:
        return text


_READERS: dict[str, Callable[[str], Any]] = {
    "number": number_of,
    "whole": _whole,
    "switch": _switch,
    "number or column": _number_or_text,
    "numbers": _numbers,
    "pair": _numbers,
    "texts": _list,
}
