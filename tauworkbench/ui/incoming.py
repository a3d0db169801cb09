"""Logs that come without a path: uploaded in pieces, or as a DataFrame. They become files."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from ..errors import InputError
from .autosave import state_folder

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["MOST_BYTES", "Incoming", "frame_to_file"]

MOST_BYTES = 2_000_000_000


class Incoming:
    """One upload after another, written as its pieces come."""

    def __init__(self, folder: Path | None = None) -> None:
        self._folder = folder
        self._file: IO[bytes] | None = None
        self._part = self._target = Path()
        self._size = 0

    def take(self, content: dict[str, Any], data: bytes) -> Path | None:
        """Take one message of the page; the path once the file is complete.

        Raises
        ------
        InputError
            Where the file is too large, can't be written, or a piece is missing.
        """
        kind = content.get("type")
        try:
            if kind == "start":
                self._start(str(content.get("name", "")), int(content.get("size", 0)))
            elif kind == "piece" and self._file is not None:
                if int(content.get("at", -1)) != self._file.tell():
                    raise InputError("upload", "a piece is missing", "choose the file again")
                self._file.write(data)
            elif kind == "end" and self._file is not None:
                return self._end()
        except OSError as e:
            self.drop()
            how = "make room there, or give the log's path"
            raise InputError(str(self._target), f"can't be written: {e.strerror}", how) from None
        except InputError:
            self.drop()
            raise
        return None

    def drop(self) -> None:
        """Forget an upload that isn't complete."""
        if self._file is not None:
            self._file.close()
            self._part.unlink(missing_ok=True)
        self._file = None

    def _start(self, name: str, size: int) -> None:
        self.drop()
        if size > MOST_BYTES:
            what = f"{size} bytes are more than an upload may have ({MOST_BYTES})"
            raise InputError(_safe(name), what, "give the log's path instead")
        folder = (self._folder or state_folder()) / "uploads"
        folder.mkdir(parents=True, exist_ok=True, mode=0o700)
        self._target, self._size = folder / _safe(name), size
        self._part = self._target.with_name(self._target.name + ".part")
        self._file = self._part.open("wb")

    def _end(self) -> Path:
        assert self._file is not None  # noqa: S101 - for the type checker; `take` looked
        found = self._file.tell()
        self._file.close()
        self._file = None
        if found != self._size:
            self._part.unlink(missing_ok=True)
            what = f"{found} of {self._size} bytes arrived"
            raise InputError(self._target.name, what, "choose the file again")
        target = _free(self._target, self._part)
        self._part.replace(target)
        return target


def frame_to_file(frame: pd.DataFrame, folder: Path | None = None) -> Path:
    """Write a DataFrame as CSV in the state folder, so that a run file can name it.

    A named index becomes the first column; an unnamed one is left out.
    """
    place = (folder or state_folder()) / "frames"
    place.mkdir(parents=True, exist_ok=True, mode=0o700)
    text = frame.to_csv(index=frame.index.name is not None).encode()
    target = place / f"dataframe-{hashlib.sha256(text).hexdigest()[:12]}.csv"
    if not target.exists():
        part = target.with_suffix(".part")
        part.write_bytes(text)
        part.replace(target)
    return target


def _safe(name: str) -> str:
    """A file name of the user's, without any path or sign that a file system minds."""
    last = re.split(r"[/\\]", name)[-1]
    return re.sub(r"[^\w.() -]", "_", last).strip(". ")[-100:] or "log.csv"


def _free(target: Path, part: Path) -> Path:
    """The target, or a numbered one where another file of that name is there already."""
    number, free = 1, target
    while free.exists() and not _same(free, part):
        number += 1
        free = target.with_stem(f"{target.stem}-{number}")
    return free


def _same(one: Path, other: Path) -> bool:
    if one.stat().st_size != other.stat().st_size:
        return False
    with one.open("rb") as a, other.open("rb") as b:
        return (
            hashlib.file_digest(a, "sha256").digest() == hashlib.file_digest(b, "sha256").digest()
        )
