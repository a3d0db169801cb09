"""What stages are and how their results are kept: the mechanism, without any stage."""

from __future__ import annotations

import hashlib
import json
import threading
from collections import OrderedDict
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..progress import Watch
from .choices import Choices

__all__ = ["Memory", "Outcome", "Stage", "file_stamp", "stage_key"]

Inputs = Mapping[str, Any]


@dataclass(frozen=True)
class Stage:
    """One step of the chain.

    Attributes
    ----------
    name : str
        What it yields.
    needs : tuple of str
        The stages whose values it takes.
    reads : tuple of str
        The slice of the choices that it reads: ``"law"`` for a table, ``"log.file"`` for a key,
        ``"name"`` for the run's name.
    function : callable
        ``function(choices, inputs, watch) -> value``. It may read no other choice, and it raises
        `InputError` with ``[table] key`` where a choice is to blame.
    files : callable
        ``files(choices)`` names the files that it reads; when one changes, it runs again.
    costly : callable
        ``costly(choices)``: whether it takes too long for a screen to wait.
    """

    name: str
    needs: tuple[str, ...]
    reads: tuple[str, ...]
    function: Callable[[Choices, Inputs, Watch], Any]
    files: Callable[[Choices], tuple[Path, ...]] = lambda _: ()
    costly: Callable[[Choices], bool] = lambda _: False


@dataclass(frozen=True, eq=False)
class Outcome:
    """What a stage yielded: a value, or the reason why there is none."""

    value: Any = None
    error: InputError | None = None


@dataclass
class Memory:
    """The last few outcomes of each stage, by key; arrays are kept by reference.

    Attributes
    ----------
    most : int
        Outcomes kept per stage.
    """

    most: int = 8
    _kept: dict[str, OrderedDict[str, Outcome]] = field(default_factory=dict)
    _lock: threading.Lock = field(default_factory=threading.Lock)

    def get(self, stage: str, key: str) -> Outcome | None:
        """Return a kept outcome, or None."""
        with self._lock:
            kept = self._kept.get(stage, OrderedDict())
            if key in kept:
                kept.move_to_end(key)
            return kept.get(key)

    def keep(self, stage: str, key: str, outcome: Outcome) -> None:
        """Keep an outcome and forget the oldest beyond ``most``."""
        with self._lock:
            kept = self._kept.setdefault(stage, OrderedDict())
            kept[key] = outcome
            kept.move_to_end(key)
            while len(kept) > self.most:
                kept.popitem(last=False)

    def forget(self) -> None:
        """Drop everything, so that each stage runs again."""
        with self._lock:
            self._kept.clear()


def stage_key(stage: Stage, choices: Choices, keys: Mapping[str, str]) -> str:
    """Return an outcome's key: a hash of the slice read, the files' stamps, the inputs' keys."""
    tree = {**choices.to_dict(), "name": choices.name}
    read = {name: _slice(tree, name) for name in stage.reads}
    stamps = [file_stamp(path) for path in stage.files(choices)]
    needed = [keys[name] for name in stage.needs]
    text = json.dumps([stage.name, read, stamps, needed], sort_keys=True)
    return hashlib.sha256(text.encode()).hexdigest()


def file_stamp(path: Path) -> list[Any]:
    """Return a file's absolute path, time of change and size; only the path if there is none."""
    try:
        found = path.stat()
    except (OSError, ValueError):
        return [str(path)]
    return [str(path.absolute()), found.st_mtime_ns, found.st_size]


def _slice(tree: Mapping[str, Any], name: str) -> Any:
    table, _, key = name.partition(".")
    values = tree.get(table)
    return values.get(key) if key and values is not None else values
