"""Delimited text, read piece by piece: the columns asked for, as texts, with their row numbers.

Arrow's parser does the work; what it can't take (blanks as delimiter, odd quotes, rows of another
width) is mended before or after it, and counted.
"""

from __future__ import annotations

import codecs
import io
import re
from collections.abc import Callable, Iterator, Sequence
from contextlib import AbstractContextManager
from dataclasses import dataclass, field
from typing import IO, Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from ..progress import Watch, step
from .header import split_fields
from .layout import SPLIT_STAMP, Layout

__all__ = ["Batch", "TextSource", "pieces"]

PIECE_BYTES = 1 << 23
_LONGEST_ROW = 1 << 22
_BLANKS = re.compile(rb"[ \t]+")
_BLANKS_OR_QUOTED = re.compile(rb'("[^"\n]*")|[ \t]+')
_AT_ROW_ENDS = re.compile(rb"^\t+|\t+$", re.MULTILINE)
_SPLIT_STAMP = re.compile(SPLIT_STAMP.pattern.encode())


@dataclass
class Batch:
    """Some rows: their numbers in the file, and per column an Arrow array of values.

    ``odd_rows`` counts rows left out because they have another number of fields.
    """

    rows: NDArray[np.int64]
    fields: list[Any]
    odd_rows: int = 0
    odd_example: int = 0


@dataclass
class TextSource:
    """A text log on disk or in memory, laid out in a known way."""

    open: Callable[[], AbstractContextManager[IO[bytes]]]
    size: int
    encoding: str
    layout: Layout
    where: str
    _found: dict[str, Any] = field(default_factory=dict)

    def batches(self, numbers: Sequence[int], watch: Watch) -> Iterator[Batch]:
        """Yield the columns with these numbers (from 1), piece by piece."""
        line, done = 0, 0
        skip = self.layout.header_rows
        with self.open() as file:
            for whole, size in pieces(file, self.encoding, self.where):
                piece = whole
                done += size
                step(watch, min(done, self.size), self.size, "reading the log")
                count = piece.count(b"\n")
                first = line + 1
                line += count
                if skip:
                    cut = min(skip, count)
                    piece, first, skip = _without(piece, cut), first + cut, skip - cut
                if piece:
                    yield self._batch(piece, first, numbers)

    def _batch(self, piece: bytes, first: int, numbers: Sequence[int]) -> Batch:
        """Parse one piece whose first line has this number in the file."""
        import pyarrow as pa

        delimiter, piece = self._prepared(piece)
        width = self.layout.width
        rows, piece = _filled(piece, first, width)
        if not piece:
            return Batch(rows, [pa.array([], pa.string()) for _ in numbers])
        parsed = _parsed(piece, (width, delimiter), numbers)
        if parsed is None or len(parsed[0][0]) + len(parsed[1]) != rows.size:
            # A quote inside a field runs on over line ends: row by row none can.
            lines = piece.decode("utf-8", "replace").split("\n")[:-1]
            empty = pa.array([], pa.string())
            parsed = [empty] * len(numbers), list(enumerate(lines, 1))
        fields, odd = parsed
        if not odd:
            return Batch(rows, fields)
        return _mended(rows, fields, odd, (width, delimiter), numbers)

    def _prepared(self, piece: bytes) -> tuple[str, bytes]:
        """Return a piece that Arrow can parse, and its delimiter."""
        if b"\0" in piece:
            piece = piece.replace(b"\0", b"")
        if b'"' in piece:
            piece = _with_even_quotes(piece)
        if self.layout.joined:
            piece = _SPLIT_STAMP.sub(rb"\1.\2", piece)
        if self.layout.delimiter != " ":
            return self.layout.delimiter, piece
        if b'"' in piece:
            piece = _BLANKS_OR_QUOTED.sub(lambda m: m[1] or b"\t", piece)
        else:
            piece = _BLANKS.sub(b"\t", piece)
        return "\t", _AT_ROW_ENDS.sub(b"", piece)


def _parsed(
    piece: bytes, shape: tuple[int, str], numbers: Sequence[int]
) -> tuple[list[Any], list[tuple[int, str]]] | None:
    """Return a piece's columns by Arrow's parser, and its rows of another width."""
    import pyarrow as pa
    from pyarrow import csv

    width, delimiter = shape
    odd: list[tuple[int, str]] = []

    def put_aside(row: Any) -> str:
        odd.append((int(row.number), str(row.text)))
        return "skip"

    names = [f"f{i}" for i in range(1, width + 1)]
    wanted = [names[n - 1] for n in numbers]
    try:
        table = csv.read_csv(
            io.BytesIO(piece),
            read_options=csv.ReadOptions(
                use_threads=False, column_names=names, block_size=len(piece) + 1
            ),
            parse_options=csv.ParseOptions(
                delimiter=delimiter,
                quote_char='"' if b'"' in piece else False,
                ignore_empty_lines=False,
                invalid_row_handler=put_aside,
            ),
            convert_options=csv.ConvertOptions(
                column_types=dict.fromkeys(names, pa.string()),
                include_columns=wanted,
                strings_can_be_null=False,
                check_utf8=False,
            ),
        )
    except pa.ArrowInvalid:
        return None
    return [table.column(name).combine_chunks() for name in wanted], odd


def pieces(file: IO[bytes], encoding: str, where: str) -> Iterator[tuple[bytes, int]]:
    """Yield whole lines as UTF-8 with plain line ends, and how many bytes of the file they took."""
    wide = encoding.startswith(("utf-16", "utf-32", "utf_16", "utf_32"))
    decoder = codecs.getincrementaldecoder(encoding)("replace") if wide else None
    rest = b""
    first = True
    while True:
        block = file.read(PIECE_BYTES)
        data = block
        if decoder is not None:
            try:
                data = _encoded(decoder.decode(block, final=not block))
            except UnicodeError:
                how = "leave encoding under [log] read out, or give another"
                raise InputError(where, f"is no text in {encoding}", how) from None
        if first and data[:3] == b"\xef\xbb\xbf":
            data = data[3:]
        first = False
        data = rest + data
        if not block:
            if data:
                yield _plain(data, encoding, wide) + (b"" if data[-1:] in b"\r\n" else b"\n"), 0
            return
        cut = max(data.rfind(b"\n"), data.rfind(b"\r", 0, len(data) - 1)) + 1
        rest = data[cut:]
        if len(rest) > _LONGEST_ROW + PIECE_BYTES:
            raise InputError(where, "holds a row of more than 10 MB", "give a log in rows")
        if cut:
            yield _plain(data[:cut], encoding, wide), len(block)


def _encoded(text: str) -> bytes:
    return text.lstrip("\ufeff").encode("utf-8", "replace")


def _plain(data: bytes, encoding: str, wide: bool) -> bytes:
    """Whole lines as valid UTF-8, a plain line feed at each end."""
    if b"\r" in data:
        data = data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
    if wide or data.isascii():
        return data
    if encoding.startswith("utf-8"):
        try:
            data.decode("utf-8")
        except UnicodeDecodeError:
            return data.decode("utf-8", "replace").encode("utf-8")
        return data
    return data.decode(encoding, "replace").encode("utf-8", "replace")


def _without(piece: bytes, lines: int) -> bytes:
    """Drop a piece's first lines."""
    at = 0
    for _ in range(lines):
        at = piece.index(b"\n", at) + 1
    return piece[at:]


def _filled(piece: bytes, first: int, width: int) -> tuple[NDArray[np.int64], bytes]:
    """Drop empty lines, those with only separators included; return the others' row numbers."""
    ends = np.flatnonzero(np.frombuffer(piece, np.uint8) == 10)
    rows = np.arange(first, first + ends.size, dtype=np.int64)
    lengths = np.diff(ends, prepend=-1) - 1
    # A row with two fields in it is longer than its separators by two at least.
    short = [
        i
        for i in np.flatnonzero(lengths <= width)
        if not piece[ends[i] - lengths[i] : ends[i]].strip(b' \t,;|"')
    ]
    if not short:
        return rows, piece
    lines = np.array(piece.split(b"\n")[:-1], dtype=object)
    kept = np.delete(np.arange(ends.size), short)
    return rows[kept], b"\n".join([*lines[kept], b""]) if kept.size else b""


def _with_even_quotes(piece: bytes) -> bytes:
    """Take the quotes out of lines that hold an odd number: they would swallow what follows."""
    data = np.frombuffer(piece, np.uint8)
    ends = np.flatnonzero(data == 10)
    line = np.searchsorted(ends, np.flatnonzero(data == 34))
    odd = np.flatnonzero(np.bincount(line, minlength=ends.size) % 2)
    if not odd.size:
        return piece
    lines = piece.split(b"\n")
    for i in odd:
        lines[i] = lines[i].replace(b'"', b"")
    return b"\n".join(lines)


def _mended(
    rows: NDArray[np.int64],
    fields: list[Any],
    odd: list[tuple[int, str]],
    shape: tuple[int, str],
    numbers: Sequence[int],
) -> Batch:
    """Put rows of another width back where only empty fields are too many or too few."""
    import pyarrow as pa

    width, delimiter = shape
    kept, values, lost = [], [], []
    for number, text in odd:
        row = int(rows[number - 1])
        cells = split_fields(text, delimiter)
        while len(cells) > width and not cells[-1]:
            cells.pop()
        if len(cells) > width or len([c for c in cells if c]) < 2:
            if text.strip():
                lost.append(row)
            continue
        cells += [""] * (width - len(cells))
        kept.append(row)
        values.append([cells[n - 1] for n in numbers])
    normal = np.delete(rows, np.array([n - 1 for n, _ in odd]))
    batch = Batch(normal, fields, len(lost), lost[0] if lost else 0)
    if not kept:
        return batch
    batch.rows = np.concatenate((normal, np.array(kept, np.int64)))
    order = np.argsort(batch.rows, kind="stable")
    batch.rows = batch.rows[order]
    batch.fields = [
        pa.concat_arrays([f, pa.array([v[i] for v in values], pa.string())]).take(pa.array(order))
        for i, f in enumerate(fields)
    ]
    return batch
