"""The table of commands. A new command is one entry here and one module.

A command's module offers two functions and imports nothing heavy at its top, since ``--help``
loads all of them::

    def arguments(parser: argparse.ArgumentParser) -> None: ...
    def run(args: argparse.Namespace) -> int: ...      # the exit status

``run`` raises `InputError` for whatever can't be used; `main` turns it into the one line of
stderr and status 2.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["COMMANDS", "Command"]


@dataclass(frozen=True)
class Command:
    """A command's name, its module in this folder and what it does, in one plain line."""

    name: str
    module: str
    does: str


COMMANDS: tuple[Command, ...] = (
    Command("open", "bench", "open the bench in the browser, on a log, a run file or the samples"),
    Command("new", "new", "write a commented run file beside a log, from what was found in it"),
    Command(
        "check", "check", "read everything a run file names, fit nothing, say what was understood"
    ),
    Command("fit", "fit", "fit a logged step: response times, time constants, report"),
    Command("recover", "recover", "recover the ambient behind a field log, with a band, report"),
    Command("campaign", "campaign", "fit many runs: a table per run and per medium, report"),
    Command("plan", "plan", "before the test: what uncertainty to expect, and what limits it"),
    Command("help", "explain", "say what a key of the run file means and takes"),
)
