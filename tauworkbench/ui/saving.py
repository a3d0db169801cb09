"""Writing what the page holds: the run file and the result."""

from __future__ import annotations

import shutil
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from ..session.choices import Choices
from ..session.run_file import save_choices
from ..session.store import default_folder

if TYPE_CHECKING:
    from ..session.saved import RunResult

__all__ = ["free_run_file", "result_folder", "save_result", "save_run_file"]


def free_run_file(log: Path) -> Path:
    """Return a name beside a log for its run file, under which nothing is yet."""
    target, number = log.with_suffix(".toml"), 1
    while target.exists():
        number += 1
        target = log.with_name(f"{log.stem}_{number}.toml")
    return target


def result_folder(run_file: str) -> str:
    """Return the folder beside a run file that the command line would write to."""
    return str(default_folder(run_file)) if run_file else ""


def save_run_file(
    choices: Choices, typed: str, opened: Path | None, own: Path, replace_it: bool
) -> tuple[Choices, Path]:
    """Write a run file; return the choices as they stand in it, and its path.

    Parameters
    ----------
    choices : Choices
        What to write.
    typed : str
        The path, relative to the choices' folder.
    opened : Path or None
        The run file that the page was opened on, or saved to before; another file of that name is
        not replaced unless ``replace_it``.
    own : Path
        The bench's own folder: a log kept there (an upload) is copied beside the run file.
    replace_it : bool
        Whether the user has been asked.

    Raises
    ------
    InputError
        Where it can't be written, or would replace a file that wasn't opened.
    """
    if not typed.strip():
        raise InputError("run file", "no name is given", "type one, such as plunge.toml")
    path = choices.folder / Path(typed.strip()).expanduser()
    if path.suffix != ".toml":
        path = path.with_name(path.name + ".toml")
    known = opened is not None and path.absolute() == opened.absolute()
    if path.exists() and not known and not replace_it:
        raise InputError(
            str(path), "is there already and isn't the file that was opened",
            "type another name, or press Save run file again to replace it",
        )  # fmt: skip
    choices = _with_log_beside(choices, path.parent, own)
    save_choices(choices, path)
    return replace(choices.moved(path.parent), source=""), path


def save_result(result: RunResult, typed: str, base: Path) -> Path:
    """Write a result's files into a folder and return it.

    Raises
    ------
    InputError
        Where it can't be written.
    """
    if not typed.strip():
        raise InputError("folder", "no name is given", "type one")
    return result.save(base / Path(typed.strip()).expanduser())


def _with_log_beside(choices: Choices, folder: Path, own: Path) -> Choices:
    """Copy a log out of the bench's own folder, so that the run file outlives it."""
    if choices.log.file is None:
        return choices
    log = choices.path(choices.log.file).absolute()
    if own.absolute() not in log.parents:
        return choices
    target = folder / log.name
    try:
        if not target.exists():
            shutil.copyfile(log, target)
    except OSError as e:
        raise InputError(
            str(target), f"the log can't be copied there: {e.strerror}", "give another folder"
        ) from None
    return choices.but("log", file=str(target.absolute()))
