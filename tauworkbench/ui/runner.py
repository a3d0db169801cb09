"""Long work beside the page: the only threads of the package.

On a kernel's loop a job runs in a worker thread, and what it reports is handed back to that loop;
where there is no loop, or no thread is to be had, it runs in place, with the same calls.
"""

from __future__ import annotations

import asyncio
import threading
import time
from collections.abc import Callable
from typing import Protocol

from ..errors import Cancelled
from .screen import ProgressShown

__all__ = ["Home", "Job", "Runner"]

_EVERY_S = 0.1  # no more progress than the eye can follow


class _Work(Protocol):
    """What the runner runs: `session.stages.Pending` is one."""

    @property
    def key(self) -> str:
        """Two works with the same key are the same."""

    def run(self, watch: Job) -> None:
        """Do it."""


class Job:
    """One work under way; it is the `Watch` that the work reports to."""

    def __init__(self, work: _Work, tell: Callable[[ProgressShown], None]) -> None:
        self.key = work.key
        self._work = work
        self._tell = tell
        self._stop = threading.Event()
        self._last = 0.0

    def report(self, done: float, total: float, words: str) -> None:
        """Pass progress on, ten times a second at most."""
        now = time.monotonic()
        if now - self._last < _EVERY_S or self._stop.is_set():
            return
        self._last = now
        share = min(max(done / total, 0.0), 1.0) if total > 0 else None
        self._tell(ProgressShown(words, share))

    def cancelled(self) -> bool:
        """Return whether it should stop."""
        return self._stop.is_set()

    def cancel(self) -> None:
        """Ask it to stop; what it still says is not listened to."""
        self._stop.set()

    def run(self) -> Exception | None:
        """Do the work; return what went wrong, if anything did."""
        try:
            self._work.run(self)
        except Cancelled:
            return None
        except Exception as e:  # noqa: BLE001 - whatever it is, the page must say so
            return e
        return None


class Home:
    """The thread and the loop on which the page lives: everything is set there and only there.

    A front end may deliver what the user does in another thread of the kernel (JupyterLab does).
    """

    def __init__(self) -> None:
        self._loop = _running_loop()
        self._thread = threading.get_ident()

    @property
    def here(self) -> bool:
        """Whether this is the page's own thread."""
        return self._loop is None or threading.get_ident() == self._thread

    def run(self, call: Callable[[], None]) -> None:
        """Call on the page's own thread: at once if this is it, else as soon as it is free."""
        if self.here or self._loop is None:
            call()
        elif not self._loop.is_closed():
            self._loop.call_soon_threadsafe(call)


class Runner:
    """Runs one job at a time; a new one cancels the old one.

    Parameters
    ----------
    on_progress : callable
        ``on_progress(ProgressShown)``, on the kernel's loop.
    on_end : callable
        ``on_end(key, error)`` when a job that wasn't cancelled has ended; on the kernel's loop.
    threads : bool
        Whether to use a worker thread where a loop runs.
    """

    def __init__(
        self,
        on_progress: Callable[[ProgressShown], None],
        on_end: Callable[[str, Exception | None], None],
        threads: bool = True,
    ) -> None:
        self._on_progress, self._on_end = on_progress, on_end
        self._loop = _running_loop() if threads else None
        self._job: Job | None = None
        self._timers: dict[str, asyncio.TimerHandle] = {}

    @property
    def key(self) -> str | None:
        """The key of the job under way."""
        return None if self._job is None else self._job.key

    def start(self, work: _Work) -> None:
        """Start a work, unless it is the one already under way."""
        if self.key == work.key:
            return
        self.cancel()
        job = self._job = Job(work, self._heard)
        if self._loop is None or not self._thread(job):
            self._ended(job, job.run())

    def cancel(self) -> None:
        """Stop the job under way; nothing more is heard of it."""
        if self._job is not None:
            self._job.cancel()
        self._job = None

    def later(self, name: str, wait_s: float, call: Callable[[], None]) -> None:
        """Call once nothing of that name has been asked for during ``wait_s`` [s].

        Without a loop it calls at once.
        """
        if name in self._timers:
            self._timers.pop(name).cancel()
        if self._loop is None:
            call()
            return

        def due() -> None:
            self._timers.pop(name, None)
            call()

        self._timers[name] = self._loop.call_later(wait_s, due)

    def close(self) -> None:
        """Stop everything."""
        self.cancel()
        for timer in self._timers.values():
            timer.cancel()
        self._timers.clear()

    def _thread(self, job: Job) -> bool:
        def work() -> None:
            error = job.run()
            self._post(lambda: self._ended(job, error))

        try:
            threading.Thread(target=work, name="tauworkbench", daemon=True).start()
        except RuntimeError:  # a Python without threads, as in a browser
            return False
        return True

    def _post(self, call: Callable[[], None]) -> None:
        """Call on the kernel's loop; a loop that is gone listens to nothing."""
        if self._loop is None:
            call()
        elif not self._loop.is_closed():
            self._loop.call_soon_threadsafe(call)

    def _heard(self, progress: ProgressShown) -> None:
        job = self._job
        self._post(lambda: self._on_progress(progress) if job is self._job else None)

    def _ended(self, job: Job, error: Exception | None) -> None:
        if job is not self._job:
            return
        self._job = None
        self._on_end(job.key, error)


def _running_loop() -> asyncio.AbstractEventLoop | None:
    try:
        return asyncio.get_running_loop()
    except RuntimeError:
        return None
