"""Widgets with a part that runs in the browser; they need anywidget, and the page can do without.

What the hand does comes as messages; what the page shows goes as traits. So nothing is echoed,
and the kernel's state is the truth.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import anywidget
import traitlets

from ..drawing import Picture
from ..screen import Marker

__all__ = ["CodeText", "PageHelper", "PlotPane", "UploadPane"]

_STATIC = Path(__file__).parent / "static"


def _script(name: str) -> str:
    return (_STATIC / name).read_text(encoding="utf-8")


class PlotPane(anywidget.AnyWidget):
    """A picture whose markers the browser moves.

    Parameters
    ----------
    on_message : callable
        ``on_message(content)`` with what `plot.js` sends.
    """

    _esm = _script("plot.js")
    png = traitlets.Bytes(b"").tag(sync=True)
    size = traitlets.List([1000, 460]).tag(sync=True)
    box = traitlets.List([0.07, 0.07, 0.98, 0.9]).tag(sync=True)
    limits = traitlets.List([0.0, 1.0]).tag(sync=True)
    full = traitlets.List([0.0, 1.0]).tag(sync=True)
    markers: Any = traitlets.List([]).tag(sync=True)
    answered = traitlets.Int(0).tag(sync=True)
    unit = traitlets.Unicode("s").tag(sync=True)
    alt = traitlets.Unicode("").tag(sync=True)

    def __init__(self, on_message: Callable[[dict[str, Any]], None]) -> None:
        super().__init__()
        self.on_msg(lambda *args: on_message(args[1]))

    def show(self, picture: Picture) -> None:
        """Show a picture; all that belongs to it goes in one message."""
        with self.hold_sync():
            self.size = list(picture.size)
            self.box = list(picture.box)
            self.limits = list(picture.limits)
            self.alt = picture.alt
            self.png = picture.png

    def place(self, markers: tuple[Marker, ...]) -> None:
        """Place the markers."""
        self.markers = [
            {"name": m.name, "label": m.label, "x": m.x, "given": m.given} for m in markers
        ]


class PageHelper(anywidget.AnyWidget):
    """Keeps notebook shortcuts away, tells the theme, reads the status aloud."""

    _esm = _script("page.js")
    words = traitlets.Unicode("").tag(sync=True)

    def __init__(self, on_message: Callable[[dict[str, Any]], None]) -> None:
        super().__init__()
        self.on_msg(lambda *args: on_message(args[1]))


class CodeText(anywidget.AnyWidget):
    """Text with a button that copies it."""

    _esm = _script("code.js")
    title = traitlets.Unicode("").tag(sync=True)
    text = traitlets.Unicode("").tag(sync=True)


class UploadPane(anywidget.AnyWidget):
    """A file of any size, in pieces.

    Parameters
    ----------
    label : str
        Beside the button.
    on_piece : callable
        ``on_piece(content, data) -> bool``: take a message of `upload.js`; False stops.
    """

    _esm = _script("upload.js")
    label = traitlets.Unicode("").tag(sync=True)
    accept = traitlets.Unicode("").tag(sync=True)

    def __init__(
        self, label: str, accept: str, on_piece: Callable[[dict[str, Any], bytes], bool]
    ) -> None:
        super().__init__(label=label, accept=accept)
        self._on_piece = on_piece
        self.on_msg(self._heard)

    def _heard(self, _: Any, content: dict[str, Any], buffers: list[Any]) -> None:
        more = self._on_piece(content, bytes(buffers[0]) if buffers else b"")
        self.send({"type": "ack", "more": more})
