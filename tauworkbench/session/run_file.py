"""Reading a run file, and writing one so that the user's comments survive."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from .checks import check
from .choices import Choices
from .keys import RUN_TABLES
from .store import write_text
from .toml_file import is_plain_file, load

if TYPE_CHECKING:
    from tomlkit import TOMLDocument

__all__ = ["read_choices", "run_file_text", "save_choices"]


def read_choices(path: str | os.PathLike[str], *, complete: bool = True) -> Choices:
    """Read a run file.

    Parameters
    ----------
    path : path
        The TOML file; paths in it are relative to its folder.
    complete : bool
        Whether to refuse a file in which a required choice is missing.

    Raises
    ------
    InputError
        With ``file``, ``file:line`` or ``file [table] key``.
    """
    choices = Choices.from_dict(load(path), folder=Path(path).parent, source=str(path))
    if complete:
        check(choices)
    return choices


def save_choices(choices: Choices, path: str | os.PathLike[str]) -> None:
    """Write a run file; where there is one, its comments and its order stay.

    Raises
    ------
    InputError
        Where the file can't be written, or the one that stands there isn't TOML.
    """
    file = Path(path)
    moved = choices.moved(file.parent)
    write_text(file, run_file_text(moved, file if is_plain_file(file) else None))


def run_file_text(choices: Choices, old: Path | None = None) -> str:
    """Return the choices as TOML, laid over an older file's comments where one is given."""
    import tomlkit

    document = tomlkit.document()
    if old is not None:
        load(old)  # its errors have a place; tomlkit's would not
        document = tomlkit.parse(old.read_text("utf-8-sig"))
    tables = choices.to_dict()
    for name in RUN_TABLES:
        if name in tables:
            _lay_over(document, name, tables[name])
        elif name in document:
            del document[name]
    return tomlkit.dumps(document)


def _lay_over(document: TOMLDocument, name: str, values: Mapping[str, Any]) -> None:
    import tomlkit

    if name not in document:
        document[name] = tomlkit.table()
    table: Any = document[name]
    for old in [k for k in table if k not in values]:
        del table[old]
    for key, value in values.items():
        if key in table and table[key] == value:
            continue
        new = tomlkit.item(_inline(value))
        if key in table:
            new.trivia.comment_ws = table[key].trivia.comment_ws
            new.trivia.comment = table[key].trivia.comment
        table[key] = new


def _inline(value: Any) -> Any:
    import tomlkit

    if not isinstance(value, Mapping):
        return value
    out = tomlkit.inline_table()
    for key, inner in value.items():
        out[key] = _inline(inner)
    return out
