"""Writing what the page holds: the run file and the result."""

from __future__ import annotations

import shutil
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING

from ..errors import InputError
from ..session.choices import Choices
from ..session.run_file import save_choices
from ..session.store import default_folder
from .words import error_words

if TYPE_CHECKING:
    from ..session.saved import RunResult
    from .show import State

__all__ = ["Saver", "free_run_file"]


def free_run_file(log: Path) -> Path:
    """Return a name beside a log for its run file, under which nothing is yet."""
    target, number = log.with_suffix(".toml"), 1
    while target.exists():
        number += 1
        target = log.with_name(f"{log.stem}_{number}.toml")
    return target


class Saver:
    """Where a page saves to, and the saving.

    Attributes
    ----------
    opened : Path or None
        The run file that the page was opened on, or saved to: it may be replaced without asking.
    """

    def __init__(self, own: Path) -> None:
        self.opened: Path | None = None
        self._own = own  # the bench's own folder: a log kept there is copied beside the run file
        self._refused = ""  # the name that was refused because such a file is there
        self._folder_typed = False

    def begin(self, opened: Path | None) -> None:
        """Begin with another run file, or with none."""
        self.opened, self._refused, self._folder_typed = opened, "", False

    def named(self, state: State, run_file: str) -> State:
        """Name the run file, and the folder after it unless that was typed."""
        folder = state.folder
        if not self._folder_typed:
            folder = str(default_folder(run_file)) if run_file else ""
        return state.but(run_file=run_file, folder=folder, save_problems=MappingProxyType({}))

    def typed(self, state: State, which: str, text: str) -> State:
        """Take a name that was typed: ``which`` is ``run_file`` or ``folder``."""
        self._folder_typed = self._folder_typed or which == "folder"
        problems = {k: v for k, v in state.save_problems.items() if k != f"save.{which}"}
        return state.but(**{which: text}, save_problems=MappingProxyType(problems))

    def run_file(self, state: State) -> State:
        """Write the run file; one that stands there unopened only when asked a second time."""
        again, self._refused = self._refused == state.run_file, ""
        try:
            path = self._path(state, again)
            choices = _with_log_beside(state.choices, path.parent, self._own)
            save_choices(choices, path)
        except InputError as e:
            self._refused = state.run_file
            return _refused(state, "save.run_file", e)
        self.opened = path
        state = self.named(state, str(path.absolute()))
        return state.but(choices=choices.moved(path.parent), saved=f"Saved the run file {path}")

    def result(self, state: State, result: RunResult) -> State:
        """Write a result's files."""
        try:
            if not state.folder.strip():
                raise InputError("folder", "no name is given", "type one")
            typed = Path(state.folder.strip()).expanduser()
            folder = result.save(state.choices.folder / typed)
        except InputError as e:
            return _refused(state, "save.folder", e)
        return state.but(saved=f"Saved report, result and trace in {folder}")

    def _path(self, state: State, again: bool) -> Path:
        typed = state.run_file.strip()
        if not typed:
            raise InputError("run file", "no name is given", "type one, such as plunge.toml")
        path = state.choices.folder / Path(typed).expanduser()
        if path.suffix != ".toml":
            path = path.with_name(path.name + ".toml")
        known = self.opened is not None and path.absolute() == self.opened.absolute()
        if path.exists() and not known and not again:
            raise InputError(
                str(path), "is there already and isn't the file that was opened",
                "type another name, or press Save run file again to replace it",
            )  # fmt: skip
        return path


def _refused(state: State, field: str, error: InputError) -> State:
    return state.but(save_problems=MappingProxyType({field: error_words(error)}))


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
