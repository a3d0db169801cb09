"""The rows above the first sample: names and units of the columns."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from itertools import pairwise

from ..units import dimension, parse_unit
from .dialects import COMMENT_MARKS, TIME_WORDS
from .records import Column

__all__ = ["header_of", "named_columns", "split_fields"]

_BRACKETED = re.compile(
    r"^(?P<name>.*?)\s*(?:\[(?P<a>[^\[\]]*)\]|\((?P<b>[^()]*)\))\s*$", re.DOTALL
)
_LONGEST_NAME = 400  # the pattern may need the square of it
_QUOTED_WORDS = re.compile(r'"([^"]*)"|(\S+)')


def split_fields(line: str, delimiter: str) -> list[str]:
    """Return a line's fields without outer blanks and quotes."""
    if delimiter == " ":
        return [a or b for a, b in _QUOTED_WORDS.findall(line)]
    if '"' in line:
        try:
            row = next(csv.reader([line], delimiter=delimiter, skipinitialspace=True), [])
        except csv.Error:
            row = line.split(delimiter)
    else:
        row = line.split(delimiter)
    return [field.strip() for field in row]


def named_columns(
    names: Sequence[str], units: Sequence[str], kinds: Sequence[str]
) -> tuple[Column, ...]:
    """Return columns with short names and units taken from their headers."""
    out = []
    for i, (name, row_unit, kind) in enumerate(zip(names, units, kinds, strict=True)):
        full = " ".join(name.split())
        short, unit = _bracketed(full)
        out.append(Column(full, short, parse_unit(row_unit) or unit, i + 1, kind))
    return tuple(out)


def _bracketed(name: str) -> tuple[str, str]:
    """Return a header without its bracketed unit, and the unit."""
    match = _BRACKETED.match(name) if len(name) <= _LONGEST_NAME else None
    if match is None or not match["name"]:
        return name, ""
    unit = parse_unit(match["a"] if match["a"] is not None else match["b"])
    if unit is None and match["a"] is None:
        return name, ""  # "(left)" is a word, not a unit
    return match["name"].strip(), unit or ""


def header_of(
    table: Sequence[Sequence[str]], lines: Sequence[str], width: int, delimiter: str
) -> tuple[list[str], list[str], tuple[str, ...]]:
    """Return names and units of a row's fields from the rows before the first sample.

    Parameters
    ----------
    table : sequence of rows
        The rows of ``lines``, then the first samples.
    lines : sequence of str
        What stands before the first sample.
    width : int
        The fields to be named.
    delimiter : str

    Returns
    -------
    names, units : list of str
        Empty where there is none.
    notes : tuple of str
        What was taken for granted.
    """
    none = [""] * width
    above = [
        fields
        for row, line in zip(table, lines, strict=False)
        if (fields := _header_fields(row, line, width, delimiter)) is not None
    ]
    if not above:
        return none, none, ()
    units = none
    if len(above) > 1 and _is_units(above[-1]):
        units = _fitted(above[-1], width)
        above = above[:-1]
    names = _fitted(above[-1], width)
    filled = [n for n in names if n]
    if len(above) > 1 and len(set(filled)) < len(filled):
        names = _joined(_fitted(above[-2], width), names)
    if len(above[-1]) != width - 1:
        return names, units, ()
    which = "first"
    if not _lacks_first(above[-1], table[len(lines) :]):
        names, units = ([*x[1:], ""] if not x[0] else x for x in (names, units))
        which = "last"
    words = (
        f"the header names {width - 1} of {width} columns and the {which} was taken as the one "
        "without a name; check the columns, or number them"
    )
    return names, units, (words,)


def _lacks_first(names: Sequence[str], samples: Sequence[Sequence[str]]) -> bool:
    """Whether a header that is one short leaves out the first column.

    It does where that is a running number, or where its own first name is none of a time.
    """
    first = [row[0] for row in samples[:20] if row and row[0]]
    if len(first) > 1 and all(f.isascii() and f.isdigit() and len(f) < 10 for f in first):
        numbers = [int(f) for f in first]
        if all(b - a == 1 for a, b in pairwise(numbers)):
            return True
    unit = _bracketed(names[0])[1]
    says_time = any(w in names[0].casefold() for w in TIME_WORDS) or names[0].strip() == "t"
    return not (says_time or (unit and dimension(unit) == "time"))


def _header_fields(row: Sequence[str], line: str, width: int, delimiter: str) -> list[str] | None:
    """Return a row's fields if it can be a header of rows this wide."""
    fields = list(row)
    mark = next((m for m in COMMENT_MARKS if line.lstrip().startswith(m)), None)
    if mark:
        fields = split_fields(line.lstrip().lstrip(mark).strip(), delimiter)
    trimmed = _trimmed(fields)
    if len(trimmed) < 2 or len(fields) < width - 1 or len(trimmed) > width:
        return None
    return fields


def _trimmed(fields: Sequence[str]) -> list[str]:
    out = list(fields)
    while out and not out[-1]:
        out.pop()
    return out


def _fitted(fields: Sequence[str], width: int) -> list[str]:
    """Bring a header to the rows' width: one short, the first column is the unnamed one."""
    out = list(fields)[:width]
    return [""] * (width - len(out)) + out


def _is_units(fields: Sequence[str]) -> bool:
    filled = [f for f in fields if f]
    return bool(filled) and all(parse_unit(f) is not None or f[0] + f[-1] == "[]" for f in filled)


def _joined(groups: Sequence[str], names: Sequence[str]) -> list[str]:
    """Put the name of its run, which stands above the first of its columns, before each name."""
    out, last = [], ""
    for group, name in zip(groups, names, strict=True):
        last = group or last
        out.append(f"{last} {name}".strip() if name else name)
    return out
