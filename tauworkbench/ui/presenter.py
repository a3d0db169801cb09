"""The presenter: takes what the user does, resolves the choices, sets on the page what changed.

It knows no widget, and it computes nothing itself: `session.stages` does, and `show.screen_of`
says what the page shows of it.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path
from types import MappingProxyType
from typing import Any

from ..errors import InputError
from ..session.choices import Choices
from ..session.memory import Memory
from ..session.run_file import read_choices
from ..session.stages import Resolved, resolve
from . import moves
from .answer import answer_of
from .autosave import Autosave, Kept, state_folder
from .past import Past
from .saving import Saver, free_run_file
from .screen import ProgressShown, Screen
from .setting import set_difference
from .show import State, done_parts, screen_of
from .views import BenchView
from .words import error_words
from .working import Work

__all__ = ["Presenter"]

_NOTHING: Mapping[str, Any] = MappingProxyType({})


class Presenter:
    """Stands between the choices and a page.

    Parameters
    ----------
    view : BenchView
        The page; its ``on_change`` is set.
    autosave : Autosave
        Where the choices are kept between sessions.
    threads : bool
        Whether long work may run in a thread.
    on_bug : callable
        ``on_bug(error)`` for whatever isn't the user's doing.
    """

    def __init__(
        self,
        view: BenchView,
        *,
        autosave: Autosave | None = None,
        threads: bool = True,
        on_bug: Callable[[Exception], None] | None = None,
    ) -> None:
        self._view = view
        self._autosave = autosave or Autosave()
        self._on_bug = on_bug
        self._memory = Memory()
        self._work = Work(self._on_progress, self._on_end, threads)
        self._state = State()
        self._found: Resolved = resolve(self._state.choices, self._memory)
        self._screen = Screen()
        self._past = Past()
        self._saver = Saver(state_folder())
        self._kept: Kept | None = None
        self._looked_for = ""  # the log whose kept work was looked for
        self._beginning = False  # whether the log just opened has yet to be read
        view.on_change = self.on_change

    @property
    def state(self) -> State:
        """What the page stands on."""
        return self._state

    @property
    def found(self) -> Resolved:
        """What the choices come to, as far as that is known."""
        return self._found

    def open(self, source: Path | None) -> None:
        """Open a run file or a log; nothing opens an empty page.

        What can't be used leaves the page as it was, with the reason.
        """
        if source is None:
            self._offer(self._autosave.find(None))
            self._resolve()
            return
        try:
            opened: Path | None = None
            if source.suffix.lower() == ".toml":
                choices = replace(read_choices(source, complete=False), source="")
                opened, run_file = source, source.absolute()
            else:
                choices = moves.with_log(Choices(), source)
                run_file = free_run_file(source.absolute())
        except InputError as e:
            self.refuse(e)
            return
        self._saver.begin(opened)
        self._begin(choices, str(run_file))

    def refuse(self, error: InputError) -> None:
        """Show an error that no field is to blame for."""
        self.say(error_words(error))

    def say(self, words: str) -> None:
        """Show that something went wrong, until the user does something else."""
        self._change(notice=words)
        self._show()

    def complete(self) -> Resolved:
        """Do here and now what is pending; for scripts and tests."""
        while self._found.pending:
            self._work.stop()
            self._found.pending[0].run()
            self._resolve()
        return self._found

    def close(self) -> None:
        """Stop whatever runs."""
        self._work.close()

    def on_change(self, name: str, value: Any) -> None:
        """Take what the user did; `views.BenchView` lists the names."""
        head, _, rest = name.partition(".")
        if head in ("view", "room", "dark", "fold", "more"):
            self._state = moves.looked(self._state, head, rest, value, self._found)
            self._refresh()
            return
        self._change(notice="", saved="")
        if head == "do":
            self._ACTIONS[rest](self)
        elif head == "save":
            self._state = self._saver.typed(self._state, rest, str(value))
            self._refresh()
        elif head == "upload" or name == "log.file":
            self._open_typed(str(value))
        else:
            choices, typed = moves.chosen_anew(self._state, self._found, name, value)
            self._change(typed=MappingProxyType(typed))
            self._choose(choices)

    def _open_typed(self, typed: str) -> None:
        """Take another log and keep all other choices; or open another run file."""
        if not typed.strip():
            self._choose(self._state.choices.but("log", file=None))
            return
        path = self._state.choices.folder / Path(typed.strip()).expanduser()
        if path.suffix.lower() == ".toml":
            self.open(path)
            return
        try:
            known = self._saver.opened is not None
            choices = moves.with_log(self._state.choices, path, keep_folder=known)
        except InputError as e:
            self._change(typed=MappingProxyType(moves.refused(self._state, "log.file", typed, e)))
            self._refresh()
            return
        if not known:
            self._state = self._saver.named(self._state, str(free_run_file(path.absolute())))
        typed_still = {k: v for k, v in self._state.typed.items() if k != "log.file"}
        self._change(view_s=None, typed=MappingProxyType(typed_still))
        self._beginning = self._beginning or self._found.get("log") is None
        self._choose(choices)

    def _fit(self) -> None:
        self._work.now()
        self._refresh()

    def _stop(self) -> None:
        self._work.stop()
        self._refresh()

    def _undo(self) -> None:
        self._go_to(self._past.back(self._state.choices))

    def _redo(self) -> None:
        self._go_to(self._past.forth(self._state.choices))

    def _go_to(self, choices: Choices) -> None:
        self._change(choices=choices, typed=_NOTHING)
        self._resolve()
        self._keep()

    def _take_up(self) -> None:
        kept = self._kept
        self._leave()
        if kept is not None:
            run_file = Path(kept.run_file)
            self._saver.opened = run_file if run_file.is_file() else None
            self._state = self._saver.named(self._state, kept.run_file)
            self._choose(kept.choices)

    def _leave(self) -> None:
        self._kept = None
        self._change(offer="")
        self._refresh()

    def _save_run_file(self) -> None:
        self._state = self._saver.run_file(self._state)
        self._resolve()

    def _save_result(self) -> None:
        result = self._found.get("result")
        if result is not None:
            self._state = self._saver.result(self._state, result)
        self._refresh()

    def _show_report(self) -> None:
        self._change(report=not self._state.report)
        self._refresh()

    _ACTIONS: Mapping[str, Callable[[Presenter], None]] = MappingProxyType(
        {
            "fit": _fit,
            "stop": _stop,
            "undo": _undo,
            "redo": _redo,
            "take_up": _take_up,
            "leave": _leave,
            "save_run_file": _save_run_file,
            "save_result": _save_result,
            "show_report": _show_report,
        }
    )

    def _change(self, **changes: Any) -> None:
        self._state = self._state.but(**changes)

    def _begin(self, choices: Choices, run_file: str) -> None:
        """Begin with other choices: an opening, which is no change to take back."""
        self._past = Past()
        self._looked_for = ""
        self._state = State(
            dark=self._state.dark, width=self._state.width, ratio=self._state.ratio, choices=choices
        )
        self._state = self._saver.named(self._state, run_file)
        self._beginning = True
        self._resolve()

    def _choose(self, choices: Choices) -> None:
        if choices == self._state.choices:
            self._resolve()
            return
        self._past.add(self._state.choices)
        earlier = moves.remembered(self._state, self._state.choices)
        self._change(choices=choices, earlier=earlier)
        self._resolve()
        self._keep()

    def _keep(self) -> None:
        log = self._found.get("log")
        if log is not None:
            self._autosave.keep(self._state.choices, self._state.run_file, log.sha256)
            if self._autosave.problem:
                self.say(self._autosave.problem)

    def _resolve(self) -> None:
        self._found = resolve(self._state.choices, self._memory)
        log = self._found.get("log")
        if log is not None and self._beginning:
            self._beginning = False
            self._change(done_at_first=done_parts(self._found))
        if log is not None and self._looked_for != log.sha256:
            self._looked_for = log.sha256
            self._offer(self._autosave.find(log.sha256))
        self._refresh()

    def _offer(self, kept: Kept | None) -> None:
        if kept is not None and not kept.same_as(self._state.choices):
            self._kept = kept
            self._change(offer=kept.words)

    def _refresh(self) -> None:
        answer = answer_of(self._found, self._state.choices, self._state.answer)
        self._change(undo=self._past.has_past, redo=self._past.has_future, answer=answer)
        self._work.follow(self._found.pending)
        self._show()

    def _show(self) -> None:
        self._change(stopped=self._work.stopped)
        old, self._screen = self._screen, screen_of(self._state, self._found)
        set_difference(self._view, old, self._screen)

    def _on_progress(self, progress: ProgressShown | None) -> None:
        self._change(progress=progress)
        self._show()

    def _on_end(self, error: Exception | None) -> None:
        if error is not None and self._on_bug is not None:
            self._on_bug(error)
        self._resolve()
