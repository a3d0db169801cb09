"""Find out how a delimited text file is written, from its head."""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass

from .cells import is_number
from .record import Reading

__all__ = ["Found", "decode", "sniff"]

_DELIMITERS = (";", "\t", ",", " ")
_BOMS = ((b"\xef\xbb\xbf", "utf-8-sig"), (b"\xff\xfe", "utf-16"), (b"\xfe\xff", "utf-16"))


@dataclass(frozen=True)
class Found:
    """Reading completed, the header cells, and the first data line (from 0)."""

    reading: Reading
    header: tuple[str, ...]
    units: tuple[str, ...]
    first_line: int


def decode(data: bytes, encoding: str | None) -> tuple[str, str]:
    """Return the text and its encoding."""
    if encoding is None:
        encoding = next((name for bom, name in _BOMS if data.startswith(bom)), None)
    for name in (encoding,) if encoding else ("utf-8", "cp1252", "latin-1"):
        try:
            return data.decode(name), name
        except (UnicodeDecodeError, LookupError):
            continue
    return data.decode("latin-1"), "latin-1"


def split(line: str, delimiter: str) -> list[str]:
    """Cells of one line."""
    if delimiter == " ":
        return line.split()
    return [c.strip() for c in next(csv.reader([line], delimiter=delimiter), [])]


def sniff(lines: list[str], given: Reading) -> Found:
    """Find delimiter, decimal sign, header and units from the first lines."""
    delimiter = given.delimiter or _delimiter(lines)
    decimal = given.decimal or _decimal(lines, delimiter)
    first = _first_data(lines, delimiter, decimal)
    if given.header_rows is not None:
        first = given.header_rows
    width = len(split(lines[first], delimiter)) if first < len(lines) else 0
    above = [split(x, delimiter) for x in lines[:first] if x.strip()]
    units: list[str] = []
    header: list[str] = []
    if above and len(above[-1]) >= width - 1 and width > 0:
        header = above[-1]
        before = above[-2] if len(above) > 1 else []
        if len(before) >= width - 1 and _all_units(header) and not _all_units(before):
            header, units = before, header
    header = [header[i] if i < len(header) else "" for i in range(width)]
    units = [units[i] if i < len(units) else "" for i in range(width)]
    reading = Reading(
        delimiter, decimal, given.encoding, first, given.day_first, given.missing
    )
    return Found(reading, tuple(header), tuple(units), first)


def _all_units(cells: list[str]) -> bool:
    from ..units import parse_unit

    return all(parse_unit(c) or not c or re.fullmatch(r"[\[(].*[\])]", c) for c in cells)


def _delimiter(lines: list[str]) -> str:
    """The sign that splits the later lines into the same number of cells, more than one."""
    tail = [x for x in lines[-60:] if x.strip()]
    best, score = ",", 0.0
    for sign in _DELIMITERS:
        counts = [len(split(x, sign)) for x in tail]
        if not counts:
            continue
        usual = max(set(counts), key=counts.count)
        agree = counts.count(usual) / len(counts)
        if usual > 1 and agree > score + 1e-9:
            best, score = sign, agree
    return best


def _decimal(lines: list[str], delimiter: str) -> str:
    if delimiter == ",":
        cells = [c for x in lines[-30:] for c in split(x, delimiter)]
    else:
        cells = [c for x in lines[-30:] for c in split(x, delimiter)]
    commas = sum(bool(re.fullmatch(r"\s*[-+]?\d+,\d+\s*", c)) for c in cells)
    points = sum(bool(re.fullmatch(r"\s*[-+]?\d*\.\d+([eE][-+]?\d+)?\s*", c)) for c in cells)
    return "," if commas > points else "."


def _first_data(lines: list[str], delimiter: str, decimal: str) -> int:
    """The first of the lines from which on most cells are numbers or stamps."""
    for i, line in enumerate(lines):
        cells = split(line, delimiter)
        good = [is_number(c, decimal) or bool(re.search(r"\d[:./-]\d", c)) for c in cells]
        if len(cells) > 1 and all(good) and any(c.strip() for c in cells):
            return i
    return 0
