"""A logger's file to a `Log`."""

from __future__ import annotations

import hashlib
import os
import re
import stat
from dataclasses import replace
from pathlib import Path

import numpy as np

from ..errors import InputError
from ..progress import SILENT, Watch, step
from .record import Column, Log, Reading
from .sniff import decode, sniff

__all__ = ["LARGEST_BYTES", "read_log"]

LARGEST_BYTES = 2_000_000_000
_HEAD_LINES = 200
_UNIT = re.compile(r"^(?P<name>.*?)\s*[\[(]\s*(?P<unit>[^\[\]()]*?)\s*[\])]\s*$")


def read_log(
    path: str | os.PathLike[str], *, reading: Reading | None = None, watch: Watch = SILENT
) -> Log:
    """Read a log file; what is not given in ``reading`` is found out.

    Raises
    ------
    InputError
        No regular file, too large, binary, empty, or without a row of numbers.
    """
    path = Path(path)
    data = _bytes(path)
    step(watch, 0.2, 1.0, f"reading {path.name}")
    given = reading or Reading()
    text, encoding = decode(data, given.encoding)
    lines = text.splitlines()
    found = sniff(lines[:_HEAD_LINES], given)
    rows = _rows(lines[found.first_line :], found.reading.delimiter or ",", path)
    width = len(rows[0])
    columns = _columns(found.header, found.units, width)
    cells = tuple(np.array([r[i] for r in rows], dtype=object) for i in range(width))
    missing = frozenset(str(m) for m in given.missing or ())
    return Log(
        path, columns, hashlib.sha256(data).hexdigest(),
        replace(found.reading, encoding=encoding), len(rows), cells,
        first_row=found.first_line + 1, missing=missing,
    )  # fmt: skip


def _bytes(path: Path) -> bytes:
    try:
        info = path.stat()
    except (OSError, ValueError):
        raise InputError(str(path), "there is no such file", "check the path") from None
    if stat.S_ISDIR(info.st_mode):
        raise InputError(str(path), "is a folder", "give a file")
    if not stat.S_ISREG(info.st_mode):
        raise InputError(str(path), "is no regular file", "give a file")
    if info.st_size > LARGEST_BYTES:
        raise InputError(
            str(path), f"has {info.st_size} bytes, more than {LARGEST_BYTES}", "cut it into parts"
        )
    if info.st_size == 0:
        raise InputError(str(path), "is empty", "give a log with samples")
    try:
        data = path.read_bytes()
    except OSError as error:
        raise InputError(str(path), f"can't be read ({error.strerror})", "check it") from None
    if b"\x00" in data[:4096] and not data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise InputError(str(path), "is binary", "export the log as text")
    return data


def _rows(lines: list[str], delimiter: str, path: Path) -> list[list[str]]:
    from .sniff import split

    rows = [split(x, delimiter) for x in lines if x.strip()]
    if not rows:
        raise InputError(str(path), "holds no row of numbers", "give a log with samples")
    width = len(rows[0])
    return [(r + [""] * width)[:width] for r in rows]


def _columns(header: tuple[str, ...], units: tuple[str, ...], width: int) -> tuple[Column, ...]:
    out = []
    for i in range(width):
        name = header[i].strip() if i < len(header) else ""
        match = _UNIT.match(name)
        unit = match["unit"] if match else None
        if units and units[i]:
            unit = units[i].strip("[]() ")
        out.append(Column(i + 1, name, match["name"].strip() if match else name, unit or None))
    return tuple(out)
