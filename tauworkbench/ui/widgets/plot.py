"""The plot on the page: the best of what this front end has, with the same function."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import ipywidgets as w

from ..drawing import Drawer
from ..screen import Marker, PlotShown
from .controls import html
from .guard import Guard

__all__ = ["Plot", "can_browse"]


def can_browse() -> bool:
    """Return whether widgets with a part in the browser are to be had."""
    try:
        import anywidget  # noqa: F401
    except ImportError:
        return False
    return True


class Plot:
    """A picture; with anywidget its markers can be dragged, else the number fields move them.

    Parameters
    ----------
    report : callable
        ``report(name, value)``: ``marker.NAME``, ``view``, ``room``.
    guard : Guard
        For the messages from the browser.
    plain : bool
        Whether to do without anywidget.
    """

    def __init__(self, report: Callable[[str, Any], None], guard: Guard, plain: bool) -> None:
        self._report = report
        self._drawer = Drawer()
        self.pane: Any = None
        if plain:
            self._image = w.Image(format="png", width=1000, height=460)
            words = "Without anywidget the lines can't be dragged: type the times in the fields."
            self.widget: Any = w.VBox([self._image, html(words, "tau-help")])
        else:
            from .browser import PlotPane

            self.pane = PlotPane(guard(self._heard))
            self.widget = self.pane
        self.widget.add_class("tau-plot-box")

    def show(self, plot: PlotShown | None) -> None:
        """Draw and show."""
        self.widget.layout.display = "none" if plot is None else ""
        if plot is None:
            return
        picture = self._drawer.draw(plot)
        if self.pane is not None:
            self.pane.show(picture)
        else:
            self._image.value = picture.png
            self._image.width, self._image.height = picture.size

    def place(self, markers: tuple[Marker, ...]) -> None:
        """Place the markers."""
        if self.pane is not None:
            self.pane.place(markers)

    def set_full_s(self, full_s: tuple[float, float]) -> None:
        """Tell how far the log reaches."""
        if self.pane is not None:
            self.pane.full = list(full_s)

    def _heard(self, content: dict[str, Any]) -> None:
        kind = content["type"]
        if kind == "marker":
            self._report(f"marker.{content['name']}", content["x"])
        elif kind == "room":
            self._report("room", (content["width"], content["ratio"]))
        elif kind == "view":
            try:
                self._report("view", content.get("what") or (content["low"], content["high"]))
            finally:
                self.pane.answered = content["ask"]  # also where nothing changed
