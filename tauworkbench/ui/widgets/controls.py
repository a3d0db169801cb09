"""One field on the page: a control with its label above and its help, or its problem, beneath."""

from __future__ import annotations

from collections.abc import Callable
from html import escape
from typing import Any

import ipywidgets as w

from ..screen import FieldShown
from .guard import Guard

__all__ = ["Control", "button", "html"]

_CHOOSE = "choose ..."


def html(value: str = "", *classes: str) -> Any:
    """Return an HTML widget with classes of ours."""
    widget = w.HTML(value)
    for name in classes:
        widget.add_class(name)
    return widget


def button(words: str, call: Callable[[], None], guard: Guard, *classes: str, tip: str = "") -> Any:
    """Return a button that calls, guarded."""
    widget = w.Button(description=words, tooltip=tip or words)
    for name in ("tau-button", *classes):
        widget.add_class(name)
    widget.on_click(guard(lambda _: call()))
    return widget


class Control:
    """A field; ``report(name, text)`` hears of what is typed or chosen."""

    def __init__(self, field: FieldShown, report: Callable[[str, Any], None], guard: Guard) -> None:
        self.name = field.name
        self._guard = guard
        self.widget = _WIDGETS[field.control](field)
        self.widget.tooltip = f"{field.help} {field.key}".strip()
        self._help = html()
        self.box = w.VBox([self.widget, self._help])
        self.box.add_class("tau-field")
        self.box.add_class("tau-field-" + field.name.replace(".", "-").replace("_", "-"))
        self.set(field)
        name = field.name
        self.widget.observe(guard(lambda change: report(name, change["new"])), "value")

    def set(self, field: FieldShown) -> None:
        """Show the field, quietly."""
        with self._guard:
            if self.widget.value != field.value:
                self.widget.value = field.value
            if field.control != "choice" and self.widget.placeholder != field.absent:
                self.widget.placeholder = field.absent
            if field.control == "choice":
                self.widget.options = _options(field)
                self.widget.value = field.value
            self._help.value = _help(field)


def _text(field: FieldShown) -> Any:
    return w.Text(description=field.label, continuous_update=False)


def _suggestions(field: FieldShown) -> Any:
    options = tuple(value for value, _ in field.options)
    return w.Combobox(
        description=field.label, options=options, ensure_option=False, continuous_update=False
    )


def _choice(field: FieldShown) -> Any:
    return w.Dropdown(description=field.label, options=_options(field), value=field.value)


def _options(field: FieldShown) -> tuple[tuple[str, str], ...]:
    nothing = (field.absent or _CHOOSE, "")
    return (nothing, *((words, value) for value, words in field.options))


def _help(field: FieldShown) -> str:
    if field.problem:
        return f'<div class="tau-help tau-problem">Not used: {escape(field.problem)}</div>'
    key = f" <code>{escape(field.key)}</code>" if field.key else ""
    return f'<div class="tau-help">{escape(field.help)}{key}</div>'


_WIDGETS: dict[str, Callable[[FieldShown], Any]] = {
    "text": _text,
    "suggestions": _suggestions,
    "choice": _choice,
}
