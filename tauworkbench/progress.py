"""How long work reports where it is and learns that it should stop.

A `Watch` is passed down, never global. The core calls `report` now and then and asks `cancelled`
between pieces of work; `step` does both and raises `Cancelled`.
"""

from __future__ import annotations

from typing import Protocol

from .errors import Cancelled

__all__ = ["SILENT", "Silent", "Watch", "step"]


class Watch(Protocol):
    """What long work needs of whoever waits for it."""

    def report(self, done: float, total: float, words: str) -> None:
        """Say that ``done`` of ``total`` (any unit) is behind us, and what is being done."""

    def cancelled(self) -> bool:
        """Return whether the user has asked to stop."""


class Silent:
    """A watch that shows nothing and never stops."""

    def report(self, done: float, total: float, words: str) -> None:
        """Show nothing."""

    def cancelled(self) -> bool:
        """Return False."""
        return False


SILENT: Watch = Silent()


def step(watch: Watch, done: float, total: float, words: str) -> None:
    """Report progress and raise `Cancelled` when the user has asked to stop."""
    watch.report(done, total, words)
    if watch.cancelled():
        raise Cancelled(f"stopped while {words}")
