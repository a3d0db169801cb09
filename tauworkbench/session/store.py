"""Writing results: a folder holds a complete set of files or the old one, never a mixture."""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

from ..errors import InputError

__all__ = [
    "check_folder",
    "default_folder",
    "json_text",
    "write_files",
    "write_new_text",
    "write_text",
]


def default_folder(source: str | os.PathLike[str]) -> Path:
    """Return the folder beside an input file that is named after it."""
    path = Path(source)
    return path.parent / (path.stem if path.suffix else f"{path.name}_result")


def json_text(data: Any) -> str:
    """Return plain values as a JSON file: indented, UTF-8, every number finite."""
    return json.dumps(data, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def check_folder(folder: str | os.PathLike[str]) -> None:
    """Refuse a folder that can't be written, before long work and not after it.

    Raises
    ------
    InputError
        Where it, or what would hold it, is a file or may not be written.
    """
    path = Path(folder)
    how = "give another with --out"
    with _refused(path):
        if path.exists() and not path.is_dir():
            raise InputError(str(folder), "is a file, not a folder", how)
        nearest = next(p for p in (path, *path.absolute().parents) if p.exists())
        if not nearest.is_dir():
            raise InputError(str(folder), f"{nearest} is a file, not a folder", how)
        if not os.access(nearest, os.W_OK):
            raise InputError(str(folder), f"{nearest} may not be written", how)


def write_files(folder: str | os.PathLike[str], files: Mapping[str, str | Iterable[str]]) -> Path:
    """Write all files of a result, or none.

    They are written beside their place first and renamed when all are complete; should one rename
    fail, the old files are put back.

    Parameters
    ----------
    folder : path
        Made when absent; other files in it are left alone.
    files : mapping of str to str, or to an iterable of str
        Content by name; large ones in pieces.

    Raises
    ------
    InputError
        Where the folder can't be written.
    """
    target = Path(folder)
    with _refused(target):
        check_folder(target)
        made = [p for p in (target, *target.absolute().parents) if not p.exists()]
        target.mkdir(parents=True, exist_ok=True)
        done = False
        try:
            new = Path(tempfile.mkdtemp(prefix=".unfinished-", dir=target))
            try:
                for name, text in files.items():
                    _write(new / name, text)
                _swap(new, target, list(files))
                done = True
            finally:
                shutil.rmtree(new, ignore_errors=True)
        finally:
            if not done:
                for path in made:
                    with suppress(OSError):
                        path.rmdir()
    return target


def write_text(path: str | os.PathLike[str], text: str) -> None:
    """Write one text file by rename.

    Raises
    ------
    InputError
        Where it can't be written.
    """
    file = Path(path)
    with _refused(file):
        handle, name = tempfile.mkstemp(prefix=f".{file.name[:40]}-", dir=file.parent)
        os.close(handle)
        temporary = Path(name)
        try:
            _write(temporary, text)
            mode = file.stat().st_mode if file.exists() else 0o666 & ~_mask()
            temporary.chmod(mode & 0o777)
            temporary.replace(file)
        finally:
            temporary.unlink(missing_ok=True)


def write_new_text(path: str | os.PathLike[str], text: str) -> None:
    """Write a text file that isn't there yet; one that is, even since a moment, stays.

    Raises
    ------
    InputError
        Where it is there, or can't be written.
    """
    file = Path(path)
    with _refused(file):
        try:
            stream = file.open("x", encoding="utf-8", newline="\n")
        except FileExistsError:
            what = "is there already and is never overwritten"
            raise InputError(str(path), what, "move it away, or go on with it") from None
        done = False
        try:
            with stream:
                stream.write(text)
            done = True
        finally:
            if not done:
                file.unlink(missing_ok=True)


def _write(path: Path, text: str | Iterable[str]) -> None:
    with path.open("w", encoding="utf-8", newline="\n") as stream:
        stream.writelines([text] if isinstance(text, str) else text)
        stream.flush()
        os.fsync(stream.fileno())  # the rename must not overtake the content


def _swap(new: Path, target: Path, names: list[str]) -> None:
    """Put new files in the old ones' place; on any failure, Ctrl-C too, put the old ones back."""
    old = new / "old"
    old.mkdir()
    try:
        for name in names:
            if (target / name).exists():
                (target / name).replace(old / name)
        for name in names:
            (new / name).replace(target / name)
    except BaseException:
        for name in names:
            if (old / name).exists():
                (old / name).replace(target / name)
            elif not (new / name).exists():
                (target / name).unlink(missing_ok=True)
        raise


def _mask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


@contextmanager
def _refused(path: Path) -> Iterator[None]:
    try:
        yield
    except (OSError, ValueError) as e:
        if isinstance(e, InputError):
            raise
        reason = e.strerror if isinstance(e, OSError) and e.strerror else str(e)
        how = "give another place, or make room and permission there"
        raise InputError(str(path), f"can't be written: {reason}", how) from None
