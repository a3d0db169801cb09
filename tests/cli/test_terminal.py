"""Progress on a terminal only, and erased; cautions one line each."""

from __future__ import annotations

import io
import sys

import pytest

from tauworkbench.cli.terminal import progress, say_cautions
from tauworkbench.progress import SILENT


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


def test_no_progress_off_a_terminal_nor_when_quiet(monkeypatch):
    with progress(quiet=False) as watch:
        assert watch is SILENT
    monkeypatch.setattr(sys, "stderr", Terminal())
    with progress(quiet=True) as watch:
        assert watch is SILENT


def test_a_caution_is_one_line_and_quiet_leaves_it_out(capsys):
    say_cautions(["one\nand a half", "two"], quiet=False)
    assert capsys.readouterr().err.splitlines() == [
        "tauworkbench: caution: one and a half",
        "tauworkbench: caution: two",
    ]
    say_cautions(["one"], quiet=True)
    assert capsys.readouterr().err == ""
