"""What the commands print: progress on a terminal, cautions, and nothing under ``--quiet``."""

from __future__ import annotations

import argparse
import shutil
import signal
import sys
import threading
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from typing import NoReturn

from ..progress import Watch

__all__ = ["add_out", "add_quiet", "progress", "say_cautions"]

_EVERY_S = 0.1


def add_quiet(parser: argparse.ArgumentParser) -> None:
    """Add ``--quiet``."""
    parser.add_argument("--quiet", action="store_true", help="print nothing but errors")


def add_out(parser: argparse.ArgumentParser) -> None:
    """Add ``--out DIR``."""
    parser.add_argument(
        "--out",
        metavar="DIR",
        help="the folder to write to; by default one beside the input, named after it",
    )


def say_cautions(cautions: Iterable[str], quiet: bool) -> None:
    """Print each caution as one line of stderr."""
    if not quiet:
        for caution in cautions:
            line = " ".join(str(caution).split())
            print(f"tauworkbench: caution: {line}", file=sys.stderr)


@contextmanager
def progress(quiet: bool) -> Iterator[Watch]:
    """Watch over the block: show progress on a terminal only, erased at its end; notice Ctrl-C.

    `KeyboardInterrupt` alone is not to be relied on: a library that is being imported may swallow
    it (seen). The watch remembers, so that the work stops at its next report.
    """
    line = _Line(shown=not quiet and sys.stderr.isatty())
    before = None
    if threading.current_thread() is threading.main_thread():
        before = signal.signal(signal.SIGINT, line.interrupt)
    try:
        yield line
    finally:
        if before is not None:
            signal.signal(signal.SIGINT, before)
        line.erase()


class _Line:
    """A watch that keeps one line of a terminal up to date, or shows nothing."""

    def __init__(self, shown: bool) -> None:
        self._shown = shown
        self._last = 0.0
        self._width = 0
        self._stopped = False

    def interrupt(self, _signal: int, _frame: object) -> NoReturn:
        """Remember that the user wants to stop, and say so to whatever runs now."""
        self._stopped = True
        raise KeyboardInterrupt

    def report(self, done: float, total: float, words: str) -> None:
        """Show the share done and the words, ten times a second at most."""
        now = time.monotonic()
        if not self._shown or now - self._last < _EVERY_S:
            return
        self._last = now
        share = f"{min(max(done / total, 0.0), 1.0):4.0%} " if total > 0 else ""
        text = f"{share}{words}"[: shutil.get_terminal_size().columns - 1]
        sys.stderr.write("\r" + text.ljust(self._width))
        sys.stderr.flush()
        self._width = len(text)

    def cancelled(self) -> bool:
        """Return whether Ctrl-C was pressed."""
        return self._stopped

    def erase(self) -> None:
        """Leave the line as it was found."""
        if self._width:
            sys.stderr.write("\r" + " " * self._width + "\r")
            sys.stderr.flush()
        self._width = 0
