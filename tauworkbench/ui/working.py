"""Costly stages beside the page: which work is under way, and what may start by itself."""

from __future__ import annotations

from collections.abc import Callable

from ..session.stages import Pending
from .runner import Runner
from .screen import UNDER_WAY, ProgressShown

__all__ = ["Work"]

_WAIT_S = 0.25  # a fit starts when the hand has rested this long


class Work:
    """Hands pending stages to the runner, one at a time.

    Parameters
    ----------
    on_progress : callable
        ``on_progress(ProgressShown or None)``.
    on_end : callable
        ``on_end(error)``: a stage has ended and its outcome is kept; or something broke.
    threads : bool
        Whether a worker thread may be used.
    """

    def __init__(
        self,
        on_progress: Callable[[ProgressShown | None], None],
        on_end: Callable[[Exception | None], None],
        threads: bool,
    ) -> None:
        self._on_progress, self._on_end = on_progress, on_end
        self._runner = Runner(on_progress, self._ended, threads)
        self._pending: tuple[Pending, ...] = ()
        self._left = ""  # the key of work that was stopped, or that broke: not again by itself

    @property
    def stopped(self) -> bool:
        """Whether what is pending waits for the user."""
        return bool(self._pending) and self._pending[0].key == self._left

    def follow(self, pending: tuple[Pending, ...]) -> None:
        """Start what is pending once the hand rests; stop what nobody waits for any more."""
        self._pending = pending
        keys = [p.key for p in pending]
        if self._runner.key is not None and self._runner.key not in keys:
            self._runner.cancel()
            self._on_progress(None)
        if pending and keys[0] not in (self._runner.key, self._left):
            self._runner.later("work", _WAIT_S, lambda: self._start(keys[0]))

    def now(self) -> None:
        """Start what is pending at once, also what was stopped."""
        self._left = ""
        if self._pending:
            self._start(self._pending[0].key)

    def stop(self) -> None:
        """Stop; it starts again when the choices change, or when asked."""
        self._left = self._pending[0].key if self._pending else ""
        self._runner.cancel()
        self._on_progress(None)

    def close(self) -> None:
        """Stop everything."""
        self._pending = ()
        self._runner.close()

    def _start(self, key: str) -> None:
        first = next((p for p in self._pending if p.key == key), None)
        if first is None or key in (self._runner.key, self._left):
            return
        self._on_progress(ProgressShown(UNDER_WAY.get(first.stage, first.stage)))
        self._runner.start(first)

    def _ended(self, key: str, error: Exception | None) -> None:
        if error is not None:
            self._left = key
        self._on_progress(None)
        self._on_end(error)
