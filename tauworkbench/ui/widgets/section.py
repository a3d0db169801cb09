"""One part of the page: its heading with words, its fields, and whatever stands in it besides."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from html import escape
from typing import Any

import ipywidgets as w

from ..screen import FieldShown, Note, PartShown
from .controls import Control, button, html
from .guard import Guard

__all__ = ["Section"]


class Section:
    """A part; ``report`` hears of its fields, of folding and of "more choices".

    Parameters
    ----------
    name : str
        The part's name.
    extras : sequence of widgets
        What stands in it besides its fields, beneath them.
    always : sequence of widgets
        What stays in sight when it is folded.
    """

    def __init__(
        self,
        name: str,
        report: Callable[[str, Any], None],
        guard: Guard,
        extras: Sequence[Any] = (),
        always: Sequence[Any] = (),
    ) -> None:
        self._name, self._report, self._guard = name, report, guard
        self._controls: dict[str, _Shaped] = {}
        self._unfolded = self._more = True
        self._head = html("", "tau-head")
        self._fold = button("Fold", self._turn, guard, "tau-small", "tau-fold")
        self._grids = {place: w.Box() for place in ("main", "more", "last")}
        for grid in self._grids.values():
            grid.add_class("tau-grid")
        self._more_button = button("More choices", self._turn_more, guard, "tau-small", "tau-more")
        self._problem = html("", "tau-part-problem")
        self._notes = html("", "tau-notes")
        self._body = w.VBox(
            [
                self._grids["main"],
                self._more_button,
                self._grids["more"],
                self._grids["last"],
                self._problem,
                self._notes,
                *extras,
            ]
        )
        self._body.add_class("tau-body")
        head = w.HBox([self._head, self._fold])
        head.add_class("tau-head-row")
        self.box = w.VBox([head, self._body, *always])
        self.box.add_class("tau-part")
        self.box.add_class(f"tau-part-{name}")

    def set_fields(self, part: PartShown) -> None:
        """Show other fields; a control whose field is the same in shape stays."""
        old = self._controls
        self._controls = {}
        for field in part.fields:
            kept = old.pop(field.name, None)
            if kept is not None and kept.shape == field.shape:
                kept.set(field)
                self._controls[field.name] = kept
            else:
                self._controls[field.name] = _Shaped(field, self._report, self._guard)
                if kept is not None:
                    old[field.name] = kept
        with self._guard:
            for place, grid in self._grids.items():
                grid.children = [
                    self._controls[f.name].box for f in part.fields if f.place == place
                ]
        for control in old.values():
            control.close()

    def has(self, name: str) -> bool:
        """Return whether a field stands here."""
        return name in self._controls

    def set_field(self, field: FieldShown) -> None:
        """Show one field."""
        self._controls[field.name].set(field)

    def set_part(self, part: PartShown) -> None:
        """Show words, problem and notes; fold or unfold."""
        self._unfolded, self._more = part.unfolded, part.more
        self._head.value = (
            f'<h3 class="tau-title">{escape(part.title)}</h3>'
            f'<span class="tau-words">{escape(part.words)}</span>'
        )
        self._fold.description = "Fold" if part.unfolded else "Change"
        self._fold.tooltip = f"{self._fold.description}: {part.title}"
        self._body.layout.display = "" if part.unfolded else "none"
        count = sum(f.place == "more" for f in part.fields)
        self._more_button.layout.display = "" if count else "none"
        self._more_button.description = "Fewer choices" if part.more else f"More choices ({count})"
        self._grids["more"].layout.display = "" if part.more and count else "none"
        self._problem.value = (
            f'<div class="tau-problem" role="alert">{escape(part.problem)}</div>'
            if part.problem
            else ""
        )
        self._problem.layout.display = "" if part.problem else "none"
        self._notes.value = "".join(_note(note) for note in part.notes)
        self._notes.layout.display = "" if part.notes else "none"

    def _turn(self) -> None:
        self._report(f"fold.{self._name}", not self._unfolded)

    def _turn_more(self) -> None:
        self._report(f"more.{self._name}", not self._more)


class _Shaped(Control):
    """A control that knows its shape, and can be closed."""

    def __init__(self, field: FieldShown, report: Callable[[str, Any], None], guard: Guard) -> None:
        self.shape = field.shape
        super().__init__(field, report, guard)

    def close(self) -> None:
        """Close the widgets behind it."""
        for child in self.box.children:
            child.close()
        self.box.close()


def _note(note: Note) -> str:
    lines = "".join(f"<li>{escape(line)}</li>" for line in note.lines)
    return (
        f'<details class="tau-note"><summary>{escape(note.title)} ({len(note.lines)})</summary>'
        f"<ul>{lines}</ul></details>"
    )
