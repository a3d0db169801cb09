"""Checks of a circuit's own numbers; every message names the key."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from ..errors import InputError
from ..records import FloatArray

__all__ = ["excitation", "number", "word"]

_BIGGEST = 1e30  # ohm, V or A: beyond this squares overflow, and no circuit has it


def number(key: str, value: Any, *, above: float | None = None, low: float | None = None) -> float:
    """Return a finite number within its limits.

    Raises
    ------
    InputError
        With ``[circuit] key``.
    """
    where = f"[circuit] {key}"
    limit = f" > {above:g}" if above is not None else f" >= {low:g}" if low is not None else ""
    how = f"give a finite number{limit}"
    if isinstance(value, bool) or not isinstance(value, int | float | np.integer | np.floating):
        raise InputError(where, f"{value!r:.60} is no number", how)
    try:
        out = float(value)
    except OverflowError:  # a whole number too big for a float
        out = np.inf
    bad = not abs(out) < _BIGGEST
    if bad or (above is not None and out <= above) or (low is not None and out < low):
        raise InputError(where, f"{value!r:.60} can't stand there", how)
    return out


def excitation(key: str, value: Any) -> float | FloatArray:
    """Return a supply [V] or a current [A]: a number above 0, or one value per sample.

    A column may be zero or missing in places; the samples there give no resistance.
    """
    if np.ndim(value) == 0:
        return number(key, value.item() if isinstance(value, np.ndarray) else value, above=0.0)
    try:
        out = np.array(value, float)
    except (TypeError, ValueError):
        out = np.empty((0, 0))
    if out.ndim != 1:
        what = "is neither a number nor one row of numbers"
        raise InputError(f"[circuit] {key}", what, "give a number, or one value per sample")
    out.setflags(write=False)
    return out


def word(key: str, value: Any, allowed: Iterable[str]) -> str:
    """Return one of the allowed words."""
    allowed = tuple(allowed)
    if value not in allowed:
        how = f"give {' or '.join(repr(a) for a in allowed)}"
        raise InputError(f"[circuit] {key}", f"{value!r:.60} can't stand there", how)
    return str(value)
