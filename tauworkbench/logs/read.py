"""From a path to a `Log`: what kind of file it is, how it is laid out, its hash."""

from __future__ import annotations

import hashlib
import io
import os
import stat
from collections.abc import Callable, Iterator, Sequence
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import IO

import numpy as np

from ..errors import InputError
from ..progress import SILENT, Watch, step
from .encoding import encoding_of
from .layout import Layout, sniff
from .log import Log
from .records import Reading
from .tables import read_parquet, workbook_as_text
from .text import PIECE_BYTES, TextSource, pieces

__all__ = ["LARGEST_BYTES", "read_log"]

LARGEST_BYTES = 4_000_000_000
_HEAD_BYTES = 1 << 17
_HEAD_LINES = 600


def read_log(
    path: str | os.PathLike[str],
    *,
    reading: Reading = Reading(),  # noqa: B008 - frozen
    columns: Sequence[str | int] | None = None,
    watch: Watch = SILENT,
) -> Log:
    """Find out how a log is to be read, and its columns.

    Delimited text, Excel and Parquet are told apart by their bytes, not by their names. Values are
    read later, column by column, by `to_channels` and `Log.numbers`.

    Parameters
    ----------
    path : path
        A file of at most `LARGEST_BYTES`.
    reading : Reading
        What overrules what would be found.
    columns : sequence of column keys, optional
        Refuse the log at once where one of these is not in it.
    watch : Watch
        Progress and cancelling.

    Raises
    ------
    InputError
        Where the file isn't a readable log.
    """
    file = _File.of(path)
    with file.open() as stream:
        head = stream.read(_HEAD_BYTES)
    kind = next((k for mark, k in _KINDS if head.startswith(mark)), _text_log)
    log = kind(file, head, reading, watch)
    for key in columns or ():
        log.column(key)
    return log


@dataclass(frozen=True)
class _File:
    """A regular file as it was when it was first looked at."""

    path: str
    size: int
    changed_ns: int

    @classmethod
    def of(cls, path: str | os.PathLike[str]) -> _File:
        name = os.fspath(path)
        try:
            facts = Path(name).stat()
        except FileNotFoundError:
            raise InputError(name, "is not there", "give the path of a log") from None
        except (OSError, ValueError) as e:
            raise InputError(
                name, f"can't be read ({_reason(e)})", "give a readable file"
            ) from None
        if stat.S_ISDIR(facts.st_mode):
            raise InputError(name, "is a folder", "give one file in it")
        if not stat.S_ISREG(facts.st_mode):
            raise InputError(name, "is no ordinary file", "copy the log into a file")
        if facts.st_size > LARGEST_BYTES:
            how = f"at most {LARGEST_BYTES / 1e9:g} GB are read; cut the log into parts"
            raise InputError(name, f"has {facts.st_size / 1e9:.1f} GB", how)
        if facts.st_size == 0:
            raise InputError(name, "is empty", "give a log with rows in it")
        return cls(name, facts.st_size, facts.st_mtime_ns)

    @contextmanager
    def open(self) -> Iterator[IO[bytes]]:
        try:
            stream = Path(self.path).open("rb")  # noqa: SIM115 - closed below
        except OSError as e:
            what = f"can't be read ({_reason(e)})"
            raise InputError(self.path, what, "give a readable file") from None
        with stream:
            facts = os.fstat(stream.fileno())
            if (facts.st_size, facts.st_mtime_ns) != (self.size, self.changed_ns):
                how = "read it again when the logger has finished"
                raise InputError(self.path, "changed while it was being read", how)
            yield stream


def _reason(error: Exception) -> str:
    return getattr(error, "strerror", None) or type(error).__name__


def _text_log(file: _File, head: bytes, reading: Reading, watch: Watch) -> Log:
    encoding = encoding_of(head, reading.encoding, file.path)
    with file.open() as stream:
        lines = _head_lines(stream, encoding, file.path)
    layout = sniff(lines, reading, file.path)
    sha256, filled = _counted(file.open, file.size, watch)
    source = TextSource(file.open, file.size, encoding, layout, file.path)
    found = _found(layout, reading, encoding)
    rows = filled - sum(bool(line.strip()) for line in lines[: layout.header_rows])
    return Log(
        file.path, layout.columns, sha256, found, max(rows, 0), source, cautions=layout.notes
    )


def _excel_log(file: _File, _head: bytes, reading: Reading, watch: Watch) -> Log:
    with file.open() as stream:
        data, notes = workbook_as_text(stream, file.path, watch)
    lines = _head_lines(io.BytesIO(data), "utf-8", file.path)
    layout = sniff(lines, replace(reading, delimiter="\t"), file.path)
    sha256, _ = _counted(file.open, file.size, watch)

    def opened() -> IO[bytes]:
        return io.BytesIO(data)

    _, filled = _counted(opened, len(data), watch)
    source = TextSource(opened, len(data), "utf-8", layout, file.path)
    found = replace(_found(layout, reading, None), delimiter=None)
    rows = filled - sum(bool(line.strip()) for line in lines[: layout.header_rows])
    notes = (*notes, *layout.notes)
    return Log(
        file.path, layout.columns, sha256, found, max(rows, 0), source, "Excel", cautions=notes
    )


def _parquet_log(file: _File, _head: bytes, reading: Reading, watch: Watch) -> Log:
    source, columns = read_parquet(file.open, file.path)
    sha256, _ = _counted(file.open, file.size, watch)
    found = Reading(day_first=reading.day_first, missing=reading.missing)
    return Log(file.path, columns, sha256, found, source.rows, source, "Parquet")


# The first bytes of files that are no text.
_KINDS: tuple[tuple[bytes, Callable[[_File, bytes, Reading, Watch], Log]], ...] = (
    (b"PK\x03\x04", _excel_log),
    (b"PAR1", _parquet_log),
)


def _found(layout: Layout, reading: Reading, encoding: str | None) -> Reading:
    """Return how a log is read: what was found, what was given in its place."""
    return Reading(
        delimiter=layout.delimiter,
        decimal=layout.decimal,
        encoding=encoding,
        header_rows=layout.header_rows,
        day_first=layout.day_first,
        missing=reading.missing,
    )


def _head_lines(stream: IO[bytes], encoding: str, where: str) -> list[str]:
    """Return the first lines; the last, which may be cut, only where it is the file's only one."""
    head = stream.read(_HEAD_BYTES)
    whole = len(head) < _HEAD_BYTES
    out = b"".join(piece for piece, _ in pieces(io.BytesIO(head), encoding, where))
    lines = out.decode("utf-8", "replace").replace("\0", "").split("\n")[:-1]
    if not whole and len(lines) > 1:
        lines.pop()
    return lines[:_HEAD_LINES]


def _counted(
    opened: Callable[[], AbstractContextManager[IO[bytes]]], size: int, watch: Watch
) -> tuple[str, int]:
    """Return a file's SHA-256, and how many of its lines are filled."""
    digest = hashlib.sha256()
    lines = blank = done = 0
    last_end, last = -1, b""
    with opened() as stream:
        while block := stream.read(PIECE_BYTES):
            digest.update(block)
            data = np.frombuffer(block, np.uint8)
            ends = np.flatnonzero(data == 10)
            if ends.size:
                gaps = np.diff(ends + done, prepend=last_end)
                before = data[ends - 1]
                blank += int(np.count_nonzero((gaps == 1) | ((gaps == 2) & (before == 13))))
                last_end = int(ends[-1]) + done
            lines += ends.size
            done += len(block)
            last = block[-1:]
            step(watch, done, size, "looking through the log")
    if last != b"\n":
        lines += 1
    return digest.hexdigest(), lines - blank
