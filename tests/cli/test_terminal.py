"""Progress on a terminal only, and erased; cautions one line each."""

from __future__ import annotations

import contextlib
import io
import os
import signal
import sys

import pytest

from tauworkbench.cli.terminal import progress, say_cautions
from tauworkbench.errors import Cancelled
from tauworkbench.progress import step


class Terminal(io.StringIO):
    def isatty(self):
        return True


def screen(text: str) -> str:
    """What a terminal shows on its one line after this text."""
    line: list[str] = []
    column = 0
    for character in text:
        if character == "\r":
            column = 0
            continue
        line[column : column + 1] = [character]
        column += 1
    return "".join(line).strip()


def test_progress_is_shown_on_a_terminal_and_erased(monkeypatch):
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setattr("tauworkbench.cli.terminal._EVERY_S", 0.0)
    with progress(quiet=False) as watch:
        watch.report(1, 4, "fitting two poles")
        assert screen(terminal.getvalue()) == "25% fitting two poles"
        watch.report(3, 4, "short")
        assert screen(terminal.getvalue()) == "75% short"
        assert not watch.cancelled()
    assert screen(terminal.getvalue()) == ""


def test_progress_is_erased_on_an_error_too(monkeypatch):
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)

    def stopped():
        with progress(quiet=False) as watch:
            watch.report(1, 4, "fitting")
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        stopped()
    assert screen(terminal.getvalue()) == ""


@pytest.mark.parametrize("quiet", [False, True])
def test_no_progress_off_a_terminal_nor_when_quiet(monkeypatch, quiet):
    where = Terminal() if quiet else io.StringIO()
    monkeypatch.setattr(sys, "stderr", where)
    monkeypatch.setattr("tauworkbench.cli.terminal._EVERY_S", 0.0)
    with progress(quiet=quiet) as watch:
        watch.report(1, 4, "fitting")
    assert where.getvalue() == ""


def test_an_interrupt_that_a_library_swallows_is_remembered():
    before = signal.getsignal(signal.SIGINT)
    with progress(quiet=True) as watch:
        with contextlib.suppress(KeyboardInterrupt):
            os.kill(os.getpid(), signal.SIGINT)
        assert watch.cancelled()
        with pytest.raises(Cancelled):
            step(watch, 0, 1, "fitting")
    assert signal.getsignal(signal.SIGINT) is before


def test_a_caution_is_one_line_and_quiet_leaves_it_out(capsys):
    say_cautions(["one\nand a half", "two"], quiet=False)
    assert capsys.readouterr().err.splitlines() == [
        "tauworkbench: caution: one and a half",
        "tauworkbench: caution: two",
    ]
    say_cautions(["one"], quiet=True)
    assert capsys.readouterr().err == ""
