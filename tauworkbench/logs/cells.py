"""Cells of text to numbers."""

from __future__ import annotations

import numpy as np

from ..records import FloatArray
from .record import TextArray

__all__ = ["MISSING", "is_number", "to_numbers"]

# What loggers write for a sample that isn't there; compared without case and outer blanks.
MISSING = frozenset({"", "nan", "na", "n/a", "null", "none", "m", "-", "--", "#n/a", "inf", "-inf"})


def to_numbers(cells: TextArray, decimal: str, missing: frozenset[str]) -> FloatArray:
    """Return numbers, nan where a cell is missing or no number."""
    import pandas as pd

    text = pd.Series(cells, dtype="object").astype(str).str.strip()
    if decimal == ",":
        text = text.str.replace(".", "", regex=False).str.replace(",", ".", regex=False)
    gone = text.str.lower().isin(MISSING | {m.lower() for m in missing})
    out = np.array(pd.to_numeric(text.where(~gone), errors="coerce"), dtype=float)
    out[~np.isfinite(out)] = np.nan
    return out


def is_number(cell: str, decimal: str) -> bool:
    """Whether one cell is a number or stands for a missing one."""
    word = cell.strip().strip('"').strip()
    if word.lower() in MISSING:
        return True
    try:
        float(word.replace(",", ".") if decimal == "," else word)
    except ValueError:
        return False
    return True
