"""What a text log's first lines tell: dialect, header, units, columns."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace

from ..errors import InputError
from .dates import day_first_of
from .dialects import DIALECTS, MISSING
from .header import header_of, named_columns, split_fields
from .records import Column, Reading
from .stamps import is_stamp

__all__ = ["SPLIT_STAMP", "Layout", "kind_of_texts", "sniff"]

_NUMBER = {
    ".": re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?"),
    ",": re.compile(r"[+-]?(\d+,?\d*|,\d+)([eE][+-]?\d+)?"),
}
_MOST_COLUMNS = 4096
_LONGEST_NUMBER = 64  # a pattern may need the square of a field's length
SPLIT_STAMP = re.compile(r"(:\d\d),(\d{3})(?=,)")


@dataclass(frozen=True)
class Layout:
    """How the rows of a text log are laid out.

    ``header_rows`` counts physical lines before the first sample, ``width`` the fields of a row.
    ``joined``: a comma before the milliseconds is no delimiter.
    """

    delimiter: str
    decimal: str
    header_rows: int
    width: int
    columns: tuple[Column, ...]
    missing: tuple[str, ...]
    notes: tuple[str, ...] = ()
    joined: bool = False
    day_first: bool | None = None


def sniff(lines: Sequence[str], given: Reading, where: str) -> Layout:
    """Find dialect, header and columns from a log's first lines.

    Raises
    ------
    InputError
        Where no two columns of numbers are found.
    """
    _check_delimiter(given.delimiter)
    layout = _laid_out(lines, given, where)
    if layout.delimiter == "," and _splits_stamps(lines, layout):
        joined = [SPLIT_STAMP.sub(r"\1.\2", line) for line in lines]
        layout = replace(_laid_out(joined, given, where), joined=True)
    return layout


def _check_delimiter(given: str | None) -> None:
    if given is None or (len(given) == 1 and given.isascii() and not given.isalnum()
                         and given not in '\r\n".+-'):  # fmt: skip
        return
    how = 'give one sign such as ";", or " " for any run of blanks'
    raise InputError("[log] read delimiter", f'"{given}" can be no delimiter', how)


def _splits_stamps(lines: Sequence[str], layout: Layout) -> bool:
    """Whether commas stand before the milliseconds of unquoted stamps between commas.

    A column after the stamps always holds three digits, and has no name or tells stamps apart that
    are else the same.
    """
    table = [split_fields(line, ",") for line in lines[layout.header_rows :]]
    rows = [r for r in table if len(r) == layout.width]
    stamps = [c.number for c in layout.columns if c.kind == "stamp"]
    if not rows or not stamps or stamps[0] >= layout.width:
        return False
    at = stamps[0]
    if not all(re.fullmatch(r"\d{3}", r[at]) and r[at - 1].count(":") == 2 for r in rows):
        return False
    named = sum(bool(c.name) for c in layout.columns)
    if named:
        return named == layout.width - 1
    return len({r[at - 1] for r in rows}) < len(rows)


def _laid_out(lines: Sequence[str], given: Reading, where: str) -> Layout:
    delimiter, decimal = _dialect(lines, given, where)
    missing = tuple(MISSING if given.missing is None else map(str.casefold, given.missing))
    table = [split_fields(line, delimiter) for line in lines]
    kinds = _kinds(table, decimal, missing)
    start = _first_sample(table, kinds, decimal, missing)
    if given.header_rows is not None:
        start = given.header_rows
        if start >= len(lines):
            raise InputError(
                where, f"has fewer than {start + 1} rows", "give a smaller [log] read header_rows"
            )
    width = len(kinds)
    names, units, notes = _named(table, lines, start, kinds, delimiter)
    while len(kinds) > 2 and kinds[-1] == "empty" and not names[len(kinds) - 1]:
        kinds = kinds[:-1]
    columns = named_columns(names[: len(kinds)], units[: len(kinds)], kinds)
    if all(k not in ("number", "stamp") for k in kinds):
        raise InputError(where, "holds no column of numbers", "give a log with numbers in it")
    stamps = (
        row[c.number - 1]
        for c in columns
        if c.kind == "stamp"
        for row in table[start:]
        if len(row) == width
    )
    day_first = day_first_of(stamps) if given.day_first is None else given.day_first
    return Layout(delimiter, decimal, start, width, columns, missing, notes, day_first=day_first)


def _named(
    table: Sequence[Sequence[str]],
    lines: Sequence[str],
    start: int,
    kinds: Sequence[str],
    delimiter: str,
) -> tuple[list[str], list[str], tuple[str, ...]]:
    """Return names, units and notes for all fields of a row.

    Empty fields at the rows' ends may be columns that the header names, or only separators that it
    lacks: then its names belong to the fields before them.
    """
    width = len(kinds)
    least = max((i + 1 for i, k in enumerate(kinds) if k != "empty"), default=width)
    for named in range(width, least - 1, -1):
        found = header_of(table, lines[:start], named, delimiter)
        names, units, notes = found
        if named == least or (names[0] and names[-1]):
            rest = [""] * (width - named)
            return [*names, *rest], [*units, *rest], notes
    raise AssertionError("the last width is always taken")


def _dialect(lines: Sequence[str], given: Reading, where: str) -> tuple[str, str]:
    """Return the delimiter and decimal sign that explain most fields of most lines."""
    candidates = _candidates(given)
    # The later half: samples, whatever stands before them.
    filled = [line for line in lines if line.strip()]
    filled = filled[len(filled) // 2 :][-400:]
    best, best_score = None, 0.0
    for delimiter, decimal in candidates:
        score = _score(filled, delimiter, decimal)
        if score > best_score + 1e-9:
            best, best_score = (delimiter, decimal), score
    if best is None:
        raise InputError(
            where,
            "holds no rows with a time and a number beside it",
            "give a log in columns, or say how to read it under [log] read",
        )
    return best


def _candidates(given: Reading) -> list[tuple[str, str]]:
    pairs = list(DIALECTS)
    if given.delimiter is not None:
        pairs = [(given.delimiter, "."), (given.delimiter, ",")]
    if given.decimal is not None:
        pairs = [(d, s) for d, s in pairs if s == given.decimal]
    return pairs


def _score(lines: Sequence[str], delimiter: str, decimal: str) -> float:
    """Share of lines of the commonest width, times the share of their fields that are values."""
    shares: dict[int, list[float]] = {}
    for line in lines:
        fields = split_fields(line, delimiter)
        if len(fields) < 2 or len(fields) > _MOST_COLUMNS:
            continue
        filled = [f for f in fields if f and f.casefold() not in MISSING]
        good = sum(_is_value(f, decimal) for f in filled)
        if good and 2 * good >= len(filled):
            shares.setdefault(len(fields), []).append(good / len(filled))
    return max((sum(s) / len(lines) for s in shares.values()), default=0.0)


def _is_value(field: str, decimal: str) -> bool:
    return is_stamp(field) or _is_number(field, decimal)


def _is_number(field: str, decimal: str) -> bool:
    return len(field) <= _LONGEST_NUMBER and _NUMBER[decimal].fullmatch(field) is not None


def _kind(field: str, decimal: str, missing: Sequence[str]) -> str:
    if not field:
        return "empty"
    if is_stamp(field):
        return "stamp"
    if _is_number(field, decimal):
        return "number"
    return "missing" if field.casefold() in missing else "text"


def _kinds(table: Sequence[Sequence[str]], decimal: str, missing: Sequence[str]) -> tuple[str, ...]:
    """Return each column's kind by the majority of the later rows."""
    rows = [r for r in table if any(_is_value(f, decimal) for f in r)]
    wide = [r for r in rows if len(r) > 1]
    width = Counter(len(r) for r in wide[len(wide) // 2 :]).most_common(1)[0][0]
    same = [r for r in rows if len(r) == width]
    return tuple(
        kind_of_texts(column, decimal, missing)
        for column in zip(*same[len(same) // 2 :], strict=True)
    )


def kind_of_texts(texts: Sequence[str], decimal: str, missing: Sequence[str]) -> str:
    """Return what most of a column's texts are: stamp, number, text; or that all are empty."""
    count = Counter(_kind(text, decimal, missing) for text in texts)
    kinds = ("stamp", "number", "text")
    most = max(kinds, key=lambda k: count[k])
    if count[most]:
        return most
    return "number" if count["missing"] else "empty"


def _first_sample(
    table: Sequence[Sequence[str]], kinds: Sequence[str], decimal: str, missing: Sequence[str]
) -> int:
    """Return the index of the first row whose fields are of their columns' kinds."""
    for i, row in enumerate(table):
        if len(row) < 2 or abs(len(row) - len(kinds)) > 1:
            continue
        pairs = [
            (_kind(f, decimal, missing), k)
            for f, k in zip(row, kinds, strict=False)
            if k in ("number", "stamp")
        ]
        values = sum(found == kind for found, kind in pairs)
        strange = sum(found == "text" for found, _ in pairs)
        if values and not strange:
            return i
    return 0
