"""From choices and what they came to, to the screen: one pure function, `screen_of`."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import MappingProxyType
from typing import Any

from ..errors import InputError
from ..session.checks import check
from ..session.choices import Choices
from ..session.stages import Resolved
from . import words
from .answer import Answer, report_of
from .candidates import model_field
from .code import code_of
from .fields import Typed, field_shown, missing_words
from .parts import PARTS, Part
from .picture import curve_of, full_of, markers_of, plot_of, step_of
from .screen import (
    UNDER_WAY,
    FieldShown,
    History,
    PartShown,
    ProgressShown,
    ResultShown,
    Screen,
    Status,
)

__all__ = ["State", "done_parts", "screen_of"]

_EMPTY: Mapping[str, Any] = MappingProxyType({})


@dataclass(frozen=True)
class State:
    """What the page stands on, besides what the choices come to.

    Attributes
    ----------
    choices : Choices
        What was chosen.
    typed : mapping of str to Typed
        Texts in fields that can't be used; they stay, with the reason.
    unfolded, more : mapping of str to bool
        By part: whether the user unfolded it, and its further choices. Where they said nothing, a
        part is unfolded when it was not done as the log was opened (``done_at_first``).
    earlier : mapping of str to mapping
        What ``circuit`` and ``law`` held under whatever kind: another kind loses nothing.
    view_s : (low, high) or None
        The times in view; None for the whole log.
    dark, width, ratio
        The page's theme, the plot's width in pixels, the screen's pixel ratio.
    run_file, folder : str
        Where to save to.
    report : bool
        Whether the report is to be seen on the page.
    """

    choices: Choices = field(default_factory=Choices)
    typed: Mapping[str, Typed] = field(default_factory=lambda: _EMPTY)
    unfolded: Mapping[str, bool] = field(default_factory=lambda: _EMPTY)
    more: Mapping[str, bool] = field(default_factory=lambda: _EMPTY)
    earlier: Mapping[str, Mapping[str, Any]] = field(default_factory=lambda: _EMPTY)
    done_at_first: frozenset[str] = frozenset()
    view_s: tuple[float, float] | None = None
    dark: bool = False
    width: int = 1000
    ratio: float = 1.0
    run_file: str = ""
    folder: str = ""
    save_problems: Mapping[str, str] = field(default_factory=lambda: _EMPTY)
    saved: str = ""
    notice: str = ""
    report: bool = False
    offer: str = ""
    undo: bool = False
    redo: bool = False
    stopped: bool = False
    progress: ProgressShown | None = None
    answer: Answer | None = None

    def but(self, **changes: Any) -> State:
        """Return a copy with some fields changed."""
        return replace(self, **changes)


def screen_of(state: State, found: Resolved) -> Screen:
    """Return everything that the page shows.

    Parameters
    ----------
    state : State
        What the page stands on.
    found : Resolved
        What its choices come to, as far as that is known.
    """
    parts = tuple(_part(part, state, found) for part in PARTS)
    answer, estimates = state.answer, found.get("estimates")
    fresh = found.get("result") is not None
    curve = curve_of(found)
    step = step_of(found, state.choices)
    shown = None
    if answer is not None and answer.trace is found.get("trace"):
        shown = answer.estimate
    plot = None if curve is None else plot_of(state, curve, found, shown)
    return Screen(
        parts=parts,
        plot=plot,
        markers=() if curve is None else markers_of(state.choices, curve, step, estimates),
        full_s=(0.0, 1.0) if curve is None else full_of(curve),
        status=_status(state, found),
        progress=state.progress,
        result=ResultShown() if answer is None else replace(answer.shown, stale=not fresh),
        code=code_of(state),
        report=report_of(found) if state.report else "",
        history=History(state.undo, state.redo),
        offer=state.offer,
        can_fit=bool(found.pending) and found.pending[0].stage == "estimates",
        can_save=fresh,
    )


def done_parts(found: Resolved) -> frozenset[str]:
    """Name the parts that a log or a run file has settled by itself; they begin folded."""
    return frozenset(p.name for p in PARTS if p.folds and p.stages[-1] in found.values)


def _part(part: Part, state: State, found: Resolved) -> PartShown:
    error = _error(part, state.choices, found)
    fields = _fields(part, state, found)
    blamed = any(f.problem for f in fields)
    problem = ""
    if error is not None and not missing_words(error) and not _place_of(error, state.choices):
        problem = words.error_words(error)
    unfolded = state.unfolded.get(part.name, part.name not in state.done_at_first)
    return PartShown(
        name=part.name,
        title=part.title,
        words=_words(part, state, found, error),
        fields=fields,
        unfolded=unfolded or blamed or bool(problem),
        more=state.more.get(part.name, False)
        or any(f.place == "more" and f.problem for f in fields),
        problem=problem,
        notes=words.notes_of(part.name, found),
    )


def _error(part: Part, choices: Choices, found: Resolved) -> InputError | None:
    """The first error of a part; none while it waits for an earlier one."""
    first = next((found.errors[s] for s in part.stages if s in found.errors), None)
    if first is not None:
        try:
            check(choices, part.tables)
        except InputError as e:
            return e
    return first


def _fields(part: Part, state: State, found: Resolved) -> tuple[FieldShown, ...]:
    """The part's fields, each with what any stage says against it."""
    columns = words.column_options(found.get("log"))
    against = {
        place[1]: words.error_words(error)
        for error in found.errors.values()
        if not missing_words(error) and (place := _place_of(error, state.choices))
    }
    out = []
    for name, more in part.fields(state.choices):
        problem = against.get(name, "")
        if name == "model":
            tried = () if state.answer is None else state.answer.tried
            shown = model_field(state.choices.model, tried)
        elif name in words.STEP_FIELDS:
            shown = words.step_field(name, state, found)
            shown = shown if shown.problem else replace(shown, problem=problem)
        else:
            absent = words.absent_words(name, state.choices, found)
            shown = field_shown(
                name, state.choices, state.typed, columns, absent=absent, problem=problem
            )
        out.append(replace(shown, place="more" if more else "main"))
    if part.name == "save":
        out += words.save_fields(state)
    return tuple(out)


def _words(part: Part, state: State, found: Resolved, error: InputError | None) -> str:
    """Say in a few words how far a part is."""
    if any(name in state.typed for name, _ in part.fields(state.choices)):
        return "can't read a field, see below"
    if error is not None:
        place = _place_of(error, state.choices)
        where = "below" if place is None or place[0] is part else place[0].title
        return missing_words(error) or f"can't be used, see {where}"
    if part.stages[-1] in found.values:
        return words.done_words(part.name, state, found)
    pending = {p.stage for p in found.pending}
    if pending & set(part.stages):
        return "stopped" if state.stopped else "under way"
    return part.waits_for or "needs: a log"


def _place_of(error: InputError, choices: Choices) -> tuple[Part, str] | None:
    """The part and the field that an error is about: ``[circuit] counts.bits``, say."""
    found = re.search(r"\[(\w+)\] ([\w.]+)$", error.where)
    key = f"{found[1]}.{found[2]}" if found else ""
    for part in PARTS:
        for name, _ in part.fields(choices):
            if key and key == words.STEP_FIELDS.get(name, name):
                return part, name
    return None


def _status(state: State, found: Resolved) -> Status:
    if state.notice:
        return Status(state.notice, "problem")
    if state.progress is not None:
        return Status(f"{state.progress.words} ...".capitalize(), "busy")
    if state.saved:
        return Status(state.saved)
    if "result" in found.values and state.answer is not None:
        return Status(state.answer.shown.headline)
    for part in PARTS:
        error = _error(part, state.choices, found)
        if error is not None:
            need = missing_words(error)
            if need:
                return Status(f"{part.title}: {need}")
            return Status(f"{part.title}: {words.error_words(error)}", "problem")
    if state.stopped:
        return Status("Stopped. Fit starts it again.")
    if found.pending:  # it starts as soon as the hand rests
        return Status(
            f"{UNDER_WAY.get(found.pending[0].stage, 'working')} ...".capitalize(), "busy"
        )
    return Status(Path(state.choices.log.file or "").name)
