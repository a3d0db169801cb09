"""Fitted results kept between campaigns, so that an interrupted one goes on where it stopped.

A result is kept under a hash of everything that it depends on: the content of the log and of the
other files that the run file names, the choices, and the package itself. It is plain JSON in the
user's own cache folder; a file that can't be read counts as absent.
"""

from __future__ import annotations

import hashlib
import json
import os
import tempfile
from collections.abc import Iterator, Mapping
from contextlib import suppress
from functools import cache
from pathlib import Path
from typing import Any

from ..errors import __version__
from .choices import Choices
from .keys import KEYS
from .saved import results_from_dict
from .toml_file import is_plain_file

__all__ = ["Cache", "cache_folder", "result_key"]

_MOST_FILES = 20_000
_PACKAGE = Path(__file__).resolve().parents[1]


def cache_folder() -> Path:
    """Return where results are kept: ``TAUWORKBENCH_CACHE``, or the system's place."""
    named = os.environ.get("TAUWORKBENCH_CACHE")
    if named:
        return Path(named)
    import platformdirs

    return Path(platformdirs.user_cache_path("tauworkbench")) / "results"


def result_key(choices: Choices) -> str | None:
    """Return the hash of what a run's result depends on; None where a file isn't there."""
    try:
        files = {name: _digest(choices.path(name)) for name in _files(choices.to_dict())}
    except (OSError, ValueError):
        return None
    text = json.dumps([_version(), choices.to_dict(), files], sort_keys=True)
    return hashlib.sha256(text.encode()).hexdigest()


class Cache:
    """A folder of results by key.

    Parameters
    ----------
    folder : Path
        Made when something is first kept. One that can't be written only costs the speed.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def get(self, key: str) -> dict[str, Any] | None:
        """Return the content of a ``result.json``, or None."""
        try:
            data = json.loads(self._path(key).read_text("utf-8"))
            results_from_dict(data, key)
        except (OSError, ValueError, RecursionError):  # InputError is a ValueError
            return None
        return dict(data)

    def keep(self, key: str, result: Mapping[str, Any]) -> None:
        """Keep a result, by rename: a reader sees all of it or nothing."""
        with suppress(OSError):
            self.folder.mkdir(parents=True, exist_ok=True)
            handle, name = tempfile.mkstemp(prefix=".unfinished-", dir=self.folder)
            with os.fdopen(handle, "w", encoding="utf-8") as stream:
                json.dump(result, stream, ensure_ascii=False, allow_nan=False)
            Path(name).replace(self._path(key))

    def prune(self, most: int = _MOST_FILES) -> None:
        """Forget the oldest results beyond so many."""
        with suppress(OSError):
            aged = sorted((f.stat().st_mtime, f) for f in self.folder.iterdir() if f.is_file())
            for _, file in aged[: max(len(aged) - most, 0)]:
                file.unlink(missing_ok=True)

    def _path(self, key: str) -> Path:
        return self.folder / f"{key}.json"


def _files(values: Mapping[str, Any], table: str = "") -> Iterator[str]:
    """Name each file that the choices name, in tables within tables too."""
    for name, value in values.items():
        if isinstance(value, Mapping):
            yield from _files(value, name)
        elif isinstance(value, str) and (table, name) in _PATHS:
            yield value


_PATHS = {(k.table.rpartition(".")[2], k.name) for k in KEYS if k.takes == "path"}


def _digest(path: Path) -> str:
    if not is_plain_file(path):
        raise FileNotFoundError(str(path))
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


@cache
def _version() -> str:
    """The package's version and a hash of its source, for those who change it."""
    found = hashlib.sha256()
    for file in sorted(_PACKAGE.rglob("*.py")):
        found.update(file.read_bytes())
    return f"{__version__} {found.hexdigest()[:16]}"
