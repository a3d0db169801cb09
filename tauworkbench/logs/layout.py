"""What a text log's first lines tell: dialect, header, units, columns."""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace

from ..errors import InputError
from ..units import parse_unit
from .dialects import COMMENT_MARKS, DIALECTS, MISSING
from .records import Column, Reading
from .stamps import is_stamp

__all__ = ["Layout", "kind_of_texts", "named_columns", "sniff", "split_fields"]

_NUMBER = {
    ".": re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?"),
    ",": re.compile(r"[+-]?(\d+,?\d*|,\d+)([eE][+-]?\d+)?"),
}
_BRACKETED = re.compile(
    r"^(?P<name>.*?)\s*(?:\[(?P<a>[^\[\]]*)\]|\((?P<b>[^()]*)\))\s*$", re.DOTALL
)
_QUOTED_WORDS = re.compile(r'"([^"]*)"|(\S+)')
_MOST_COLUMNS = 4096
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
    # Separators at the rows' ends that the header lacks: its names belong to the first columns.
    named = width - 1 if kinds[-1] == "empty" else width
    names, units, notes = _header(table[:start], lines[:start], named, delimiter)
    names, units = (x + [""] * (width - named) for x in (names, units))
    while len(kinds) > 2 and kinds[-1] == "empty" and not names[len(kinds) - 1]:
        kinds = kinds[:-1]
    columns = named_columns(names[: len(kinds)], units[: len(kinds)], kinds)
    if all(k not in ("number", "stamp") for k in kinds):
        raise InputError(where, "holds no column of numbers", "give a log with numbers in it")
    return Layout(delimiter, decimal, start, width, columns, missing, notes)


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
    match = _BRACKETED.match(name)
    if match is None or not match["name"]:
        return name, ""
    unit = parse_unit(match["a"] if match["a"] is not None else match["b"])
    if unit is None and match["a"] is None:
        return name, ""  # "(left)" is a word, not a unit
    return match["name"].strip(), unit or ""


def _dialect(lines: Sequence[str], given: Reading, where: str) -> tuple[str, str]:
    """Return the delimiter and decimal sign that explain most fields of most lines."""
    candidates = _candidates(given)
    filled = [line for line in lines if line.strip()][-400:]
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
    return is_stamp(field) or _NUMBER[decimal].fullmatch(field) is not None


def _kind(field: str, decimal: str, missing: Sequence[str]) -> str:
    if not field:
        return "empty"
    if is_stamp(field):
        return "stamp"
    if _NUMBER[decimal].fullmatch(field):
        return "number"
    return "missing" if field.casefold() in missing else "text"


def _kinds(table: Sequence[Sequence[str]], decimal: str, missing: Sequence[str]) -> tuple[str, ...]:
    """Return each column's kind by the majority of the later rows."""
    rows = [r for r in table if any(_is_value(f, decimal) for f in r)]
    widths = Counter(len(r) for r in rows[len(rows) // 2 :] if len(r) > 1)
    width = widths.most_common(1)[0][0]
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


def _header(
    table: Sequence[Sequence[str]], lines: Sequence[str], width: int, delimiter: str
) -> tuple[list[str], list[str], tuple[str, ...]]:
    """Return names and units of a row's fields from the rows before the first sample."""
    none = [""] * width
    above = [
        fields
        for row, line in zip(table, lines, strict=True)
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
    notes: tuple[str, ...] = ()
    if len(_trimmed(above[-1])) == width - 1 and not names[0]:
        words = (
            f"the header names {width - 1} of {width} columns and the first was taken as the one "
            "without a name; check the columns, or number them"
        )
        notes = (words,)
    return names, units, notes


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
