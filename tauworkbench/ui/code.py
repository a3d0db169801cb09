"""Code for every click: the run file and the Python lines that reproduce what the page shows."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from ..session.choices import Choices
from ..session.run_file import run_file_text
from ..session.toml_file import is_plain_file
from .screen import Code

if TYPE_CHECKING:
    from .show import State

__all__ = ["code_of"]

_PYTHON = """\
import tauworkbench as tw

result = tw.fit({path!r})  # the run file above, saved there
for name, time in result.fit.response_time_s.items():
    print(name, "% in", time.value, "s, interval", time.low, "to", time.high, "s")
"""


def code_of(state: State) -> Code:
    """Return the run file's text, as it would be saved, and the lines that run it."""
    if state.choices.log.file is None or not state.run_file:
        return Code()
    path = state.choices.folder / Path(state.run_file).expanduser()
    text = _text(state.choices, path, _stamp(path))
    return Code(text, _PYTHON.format(path=str(path)))


def _stamp(path: Path) -> int:
    return path.stat().st_mtime_ns if is_plain_file(path) else 0


class _ByContent:
    """Choices as a key: they hold mappings, which can't be hashed."""

    def __init__(self, choices: Choices) -> None:
        self.choices = choices
        self._key = repr((choices.to_dict(), choices.folder))

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _ByContent) and self._key == other._key

    def __hash__(self) -> int:
        return hash(self._key)


def _text(choices: Choices, path: Path, stamp: int) -> str:
    return _cached(_ByContent(choices), path, stamp)


@lru_cache(maxsize=8)
def _cached(key: _ByContent, path: Path, stamp: int) -> str:
    moved = key.choices.moved(path.parent)
    try:
        return run_file_text(moved, path if stamp else None)
    except InputError:  # what stands there is no run file; saving says so
        return run_file_text(moved)
