"""Nothing lost: the choices are kept in the user's state folder and offered again.

The user's own run file is never touched here; it changes only when they save it.
"""

from __future__ import annotations

import hashlib
import json
import os
from contextlib import suppress
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..session.choices import Choices
from ..session.store import write_text

__all__ = ["Autosave", "Kept", "state_folder"]

FORMAT, VERSION = "tauworkbench.bench", 1
_MOST_BYTES = 1_000_000
_OLDER = 5  # earlier sessions' work kept per log


def state_folder() -> Path:
    """Return where the bench keeps its own files: ``TAUWORKBENCH_STATE``, or the system's place."""
    named = os.environ.get("TAUWORKBENCH_STATE")
    if named:
        return Path(named)
    import platformdirs

    return Path(platformdirs.user_state_path("tauworkbench"))


@dataclass(frozen=True)
class Kept:
    """Choices that were kept, with the run file they belong to and when."""

    choices: Choices
    run_file: str
    saved: str

    def same_as(self, choices: Choices) -> bool:
        """Whether these are the same choices, wherever their paths are relative to."""
        here = self.choices.folder
        return choices.moved(here).to_dict() == self.choices.moved(here).to_dict()

    @property
    def words(self) -> str:
        """Say what it is."""
        log = Path(self.choices.log.file or "no log").name
        return f"work on {log} from {self.saved.replace('T', ' ')[:16]}"


class Autosave:
    """Keeps one bench's choices, a file per log and one for the last log of all.

    Failing to write is no error for the user's work: ``problem`` says it, once.
    """

    def __init__(self, folder: Path | None = None) -> None:
        self._folder = (folder or state_folder()) / "bench"
        self._mine: set[Path] = set()
        self.problem = ""

    def keep(self, choices: Choices, run_file: str, log_sha256: str) -> None:
        """Write the choices; what an earlier session left under that name is set aside."""
        data = {
            "format": FORMAT,
            "version": VERSION,
            "saved": datetime.now().astimezone().isoformat(timespec="seconds"),
            "run_file": run_file,
            "folder": str(choices.folder.absolute()),
            "choices": choices.to_dict(),
        }
        text = json.dumps(data, indent=1)
        try:
            self._folder.mkdir(parents=True, exist_ok=True, mode=0o700)
            for path in (self._path(log_sha256), self._folder / "last.json"):
                if path not in self._mine:
                    _set_aside(path)
                    self._mine.add(path)
                write_text(path, text)
        except (OSError, InputError) as e:
            self.problem = f"The choices can't be kept between sessions ({e}); save the run file."

    def find(self, log_sha256: str | None) -> Kept | None:
        """Return what is kept for a log (or, without one, of the last log); None for nothing."""
        path = self._folder / "last.json" if log_sha256 is None else self._path(log_sha256)
        with suppress(OSError, ValueError, TypeError, KeyError, AttributeError, RecursionError):
            if path.stat().st_size > _MOST_BYTES:
                return None
            return _read(json.loads(path.read_text("utf-8")))
        return None

    def _path(self, log_sha256: str) -> Path:
        name = hashlib.sha256(log_sha256.encode()).hexdigest()[
            :32
        ]  # never a path of a file's choosing
        return self._folder / f"{name}.json"


def _read(data: Any) -> Kept | None:
    if data["format"] != FORMAT or data["version"] != VERSION:
        return None
    choices = Choices.from_dict(data["choices"], folder=Path(data["folder"]))
    return Kept(choices, str(data["run_file"]), str(data["saved"]))


def _set_aside(path: Path) -> None:
    for number in range(_OLDER, 0, -1):
        newer = path if number == 1 else path.with_suffix(f".{number - 1}.json")
        if newer.exists():
            newer.replace(path.with_suffix(f".{number}.json"))
