"""What the presenter asks of the page. The widgets are one answer; tests give another."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Protocol

from .screen import (
    Code,
    FieldShown,
    History,
    Marker,
    PartShown,
    PlotShown,
    ProgressShown,
    ResultShown,
    Status,
)

__all__ = ["BenchView"]


class BenchView(Protocol):
    """A page that shows a `screen.Screen` and reports what the user does by one route.

    Setters are quiet: whatever they cause inside the page is never reported back.

    Attributes
    ----------
    on_change : callable
        ``on_change(name, value)``. The names: a field's name with its text; ``marker.NAME`` with a
        time in seconds or None; ``view`` with two times, or ``"all"`` or ``"step"``; ``room`` with
        width in pixels and pixel ratio; ``dark`` with a bool; ``fold.PART`` and ``more.PART`` with
        a bool; ``upload`` with the path of the file; ``do.ACTION`` for buttons.
    """

    on_change: Callable[[str, Any], None]

    def set_fields(self, part: PartShown) -> None:
        """Show other fields in a part."""

    def set_field(self, field: FieldShown) -> None:
        """Show a field's value, its problem and what absence means."""

    def set_part(self, part: PartShown) -> None:
        """Show a part's words, problem and notes, folded or not; its fields stay."""

    def set_plot(self, plot: PlotShown | None) -> None:
        """Show a picture."""

    def set_markers(self, markers: tuple[Marker, ...]) -> None:
        """Place the markers."""

    def set_full_s(self, full_s: tuple[float, float]) -> None:
        """Tell how far the log reaches."""

    def set_status(self, status: Status) -> None:
        """Show one line."""

    def set_progress(self, progress: ProgressShown | None) -> None:
        """Show long work, or none."""

    def set_result(self, result: ResultShown) -> None:
        """Show the answer."""

    def set_code(self, code: Code) -> None:
        """Show the run file and the Python lines."""

    def set_report(self, report: str) -> None:
        """Show the report, a whole HTML document; an empty text shows none."""

    def set_history(self, history: History) -> None:
        """Enable undo and redo."""

    def set_offer(self, offer: str) -> None:
        """Offer earlier work; an empty text offers nothing."""

    def set_can_fit(self, can_fit: bool) -> None:
        """Enable the fit."""

    def set_can_save(self, can_save: bool) -> None:
        """Enable saving a result."""
