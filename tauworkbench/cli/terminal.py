"""What the commands print: progress on a terminal, cautions, and nothing under ``--quiet``."""

from __future__ import annotations

import argparse
import shutil
import sys
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager

from ..progress import SILENT, Watch

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
    """Show progress while the block runs: on a terminal only, erased at its end."""
    if quiet or not sys.stderr.isatty():
        yield SILENT
        return
    line = _Line()
    try:
        yield line
    finally:
        line.erase()


class _Line:
    """A watch that keeps one line of a terminal up to date."""

    def __init__(self) -> None:
        self._last = 0.0
        self._width = 0

    def report(self, done: float, total: float, words: str) -> None:
        """Show the share done and the words, ten times a second at most."""
        now = time.monotonic()
        if now - self._last < _EVERY_S:
            return
        self._last = now
        share = f"{min(max(done / total, 0.0), 1.0):4.0%} " if total > 0 else ""
        text = f"{share}{words}"[: shutil.get_terminal_size().columns - 1]
        sys.stderr.write("\r" + text.ljust(self._width))
        sys.stderr.flush()
        self._width = len(text)

    def cancelled(self) -> bool:
        """Return False: Ctrl-C comes as `KeyboardInterrupt`."""
        return False

    def erase(self) -> None:
        """Leave the line as it was found."""
        if self._width:
            sys.stderr.write("\r" + " " * self._width + "\r")
            sys.stderr.flush()
        self._width = 0
