"""Logs that aren't text: Excel workbooks, Parquet files, data frames."""

from __future__ import annotations

import io
import zipfile
from collections.abc import Callable, Iterator, Sequence
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta
from typing import IO, Any

import numpy as np

from ..errors import InputError, TauError
from ..progress import Watch, step
from .dialects import MISSING
from .header import named_columns
from .layout import kind_of_texts
from .records import Column
from .text import Batch

__all__ = ["ParquetSource", "read_parquet", "workbook_as_text"]

LARGEST_UNPACKED = 1_000_000_000
_MOST_PACKED = 2000  # times; a workbook's XML packs about 10 to 30 to one
_MOST_CELLS = 5_000_000
_ROWS_AT_ONCE = 1 << 18


def workbook_as_text(file: IO[bytes], where: str, watch: Watch) -> tuple[bytes, tuple[str, ...]]:
    """Return a workbook's first sheet of two columns or more as tab separated text, and notes.

    Raises
    ------
    InputError
        Where it is no workbook, or would unpack to more than `LARGEST_UNPACKED` bytes.
    """
    _check_archive(file, where)
    from openpyxl import load_workbook

    try:
        book = load_workbook(file, read_only=True, data_only=True, keep_links=False)
        try:
            return _first_sheet(book, where, watch)
        finally:
            book.close()
    except TauError:
        raise
    except Exception as e:  # noqa: BLE001 - a damaged workbook makes its reader raise anything
        what = f"is no readable workbook ({type(e).__name__})"
        raise InputError(where, what, "save it again as .xlsx, or export it as CSV") from None


def _check_archive(file: IO[bytes], where: str) -> None:
    """Refuse an archive that is none, is no workbook, or unpacks to too much."""
    try:
        with zipfile.ZipFile(file) as archive:
            members = archive.infolist()
    except (zipfile.BadZipFile, OSError, ValueError, NotImplementedError):
        what = "starts like a workbook and is damaged"
        raise InputError(where, what, "save it again as .xlsx, or export it as CSV") from None
    if not any(m.filename == "[Content_Types].xml" for m in members):
        raise InputError(where, "is an archive and no workbook", "unpack it and give the log in it")
    unpacked = sum(m.file_size for m in members)
    worst = max((m.file_size / max(m.compress_size, 1) for m in members), default=0.0)
    if unpacked > LARGEST_UNPACKED or worst > _MOST_PACKED:
        raise InputError(
            where,
            f"would unpack to {unpacked / 1e6:.0f} MB, up to {worst:.0f} times its size",
            f"at most {LARGEST_UNPACKED / 1e6:.0f} MB are unpacked; export the log as CSV",
        )
    file.seek(0)


def _first_sheet(book: Any, where: str, watch: Watch) -> tuple[bytes, tuple[str, ...]]:
    out = io.BytesIO()
    names = [sheet.title for sheet in book.worksheets]
    for sheet in book.worksheets:
        sheet.reset_dimensions()
        out.seek(0)
        out.truncate()
        wide = cells = widest = 0
        for i, row in enumerate(sheet.iter_rows(values_only=True)):
            cells += len(row)
            if cells > _MOST_CELLS:
                what = f"holds more than {_MOST_CELLS} cells"
                raise InputError(where, what, "export the log as CSV")
            if i % 5000 == 0:
                step(watch, i, max(i, 1) + 5000, "reading the workbook")
            texts = [_cell(value) for value in row]
            wide += sum(t != "" for t in texts) >= 2
            widest = max(widest, len(texts))  # empty cells at a row's end aren't in the file
            texts += [""] * (widest - len(texts) if any(texts) else 0)
            out.write(("\t".join(texts) + "\n").encode("utf-8", "replace"))
        if wide >= 2:
            rest = [n for n in names if n != sheet.title]
            note = f'of the workbook\'s {len(names)} sheets the first with rows, "{sheet.title}", '
            return out.getvalue(), (note + "was read",) if rest else ()
    raise InputError(where, "holds no sheet with two columns", "give a log in columns")


def _cell(value: Any) -> str:
    """Return a cell as text that is read back as the same number or stamp."""
    if value is None:
        return ""
    if isinstance(value, datetime):
        return value.isoformat(sep=" ")
    if isinstance(value, timedelta):
        return repr(value.total_seconds())
    if isinstance(value, time | date):
        return value.isoformat()
    if isinstance(value, bool):
        return str(int(value))
    if isinstance(value, int | float):
        return repr(value)
    return " ".join(str(value).split())


@dataclass
class ParquetSource:
    """The columns of a Parquet file; they have their types already."""

    open: Callable[[], AbstractContextManager[IO[bytes]]]
    where: str
    names: tuple[str, ...]
    rows: int

    def batches(self, numbers: Sequence[int], watch: Watch) -> Iterator[Batch]:
        """Yield the columns with these numbers (from 1), piece by piece."""
        names = [self.names[n - 1] for n in numbers]
        first = 1
        with self.open() as stream, _told(self.where):
            file = _parquet_file(stream)
            for piece in file.iter_batches(batch_size=_ROWS_AT_ONCE, columns=names):
                step(watch, first, max(self.rows, 1), "reading the log")
                rows = np.arange(first, first + piece.num_rows, dtype=np.int64)
                first += piece.num_rows
                yield Batch(rows, [_plain(piece.column(name)) for name in names])


def read_parquet(
    opened: Callable[[], AbstractContextManager[IO[bytes]]], where: str
) -> tuple[ParquetSource, tuple[Column, ...]]:
    """Return a Parquet file's columns and where their values come from.

    Raises
    ------
    InputError
        Where it is no Parquet file, or holds a column twice.
    """
    with opened() as stream, _told(where):
        file = _parquet_file(stream)
        schema, rows = file.schema_arrow, int(file.metadata.num_rows)
        head = next(file.iter_batches(batch_size=400), None)
        names = tuple(str(n) for n in schema.names)
        kinds = [
            _kind(one.type, None if head is None else head.column(i))
            for i, one in enumerate(schema)
        ]
    if len(set(names)) < len(names):
        raise InputError(where, "holds two columns of one name", "rename one of them")
    if not rows or "number" not in kinds:
        raise InputError(where, "holds no column of numbers", "give a log with numbers in it")
    columns = named_columns(names, [""] * len(names), kinds)
    return ParquetSource(opened, where, names, rows), columns


def _parquet_file(stream: IO[bytes]) -> Any:
    from pyarrow import parquet

    return parquet.ParquetFile(stream)


@contextmanager
def _told(where: str) -> Iterator[None]:
    """Say a damaged file in our words."""
    import pyarrow as pa

    try:
        yield
    except TauError:
        raise
    except (pa.ArrowException, OSError, EOFError, OverflowError, ValueError, LookupError) as e:
        what = f"is no readable Parquet file ({type(e).__name__})"
        raise InputError(where, what, "write it again, or export it as CSV") from None


def _kind(kind: Any, values: Any) -> str:
    """Return a column's kind from its type; texts are looked at."""
    from pyarrow import types as t

    if t.is_dictionary(kind):
        kind = kind.value_type
    if any(test(kind) for test in (t.is_timestamp, t.is_date, t.is_time)):
        return "stamp"
    numeric = (t.is_integer, t.is_floating, t.is_decimal, t.is_boolean, t.is_duration)
    if any(test(kind) for test in numeric):
        return "number"
    if values is not None and (t.is_string(kind) or t.is_large_string(kind)):
        texts = [str(x).strip() for x in values.to_pylist() if x is not None]
        return kind_of_texts(texts, ".", MISSING)
    return "text"


def _plain(array: Any) -> Any:
    """Categories as the values they stand for."""
    import pyarrow as pa

    return array.dictionary_decode() if pa.types.is_dictionary(array.type) else array
