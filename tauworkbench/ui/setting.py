"""From one screen to the next: only what differs is set."""

from __future__ import annotations

from .screen import Screen
from .views import BenchView

__all__ = ["set_difference"]

# The plot before its markers, the answer before the line that speaks of it.
_SET = (
    "full_s",
    "plot",
    "markers",
    "result",
    "code",
    "report",
    "history",
    "offer",
    "can_fit",
    "can_save",
    "progress",
    "status",
)


def set_difference(view: BenchView, old: Screen, new: Screen) -> None:
    """Set on a page what a new screen shows otherwise than the old one.

    Parameters
    ----------
    view : BenchView
        The page.
    old, new : Screen
        An old one without parts is a page on which nothing was set yet.
    """
    before = {part.name: part for part in old.parts}
    for part in new.parts:
        was = before.get(part.name)
        if was == part:
            continue
        if was is None or [f.shape for f in was.fields] != [f.shape for f in part.fields]:
            view.set_fields(part)
        else:
            for one, other in zip(was.fields, part.fields, strict=True):
                if one != other:
                    view.set_field(other)
        view.set_part(part)
    for name in _SET:
        value = getattr(new, name)
        if not old.parts or getattr(old, name) != value:
            getattr(view, f"set_{name}")(value)
