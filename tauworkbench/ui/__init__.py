"""The bench: views, presenter, runner, and behind the views the widgets.

Only ``widgets`` knows ipywidgets, and only ``runner`` knows threads.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .workbench import Workbench as Workbench

__all__ = ["Workbench"]


def __getattr__(name: str) -> Any:
    if name != "Workbench":
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from .workbench import Workbench

    return Workbench
