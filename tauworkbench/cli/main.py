"""The entry point: parse, run one command, turn its end into an exit status and one line."""

from __future__ import annotations

import argparse
import contextlib
import io
import os
import sys
import warnings
from collections.abc import Sequence
from importlib import import_module
from typing import Any, NoReturn

from ..errors import Cancelled, InputError, __version__
from .commands import COMMANDS

__all__ = ["main"]

DONE, UNUSABLE, STOPPED = 0, 2, 130  # 130: what a shell gives for Ctrl-C


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command.

    Parameters
    ----------
    argv : sequence of str, optional
        The arguments without the program's name; those of this process by default.

    Returns
    -------
    int
        0 done; 2 can't be used, with one line on stderr; 3 a campaign with failed runs;
        130 stopped by the user.
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(
            stream, io.TextIOWrapper
        ):  # a terminal without a degree sign still gets a line
            stream.reconfigure(errors="replace")
    try:
        with warnings.catch_warnings():
            if not sys.warnoptions:  # stderr is for our lines; `python -W` brings warnings back
                warnings.simplefilter("ignore")
            status = _run(argv)
        sys.stdout.flush()
    except InputError as e:
        print(f"tauworkbench: {e}", file=sys.stderr)
        return UNUSABLE
    except (KeyboardInterrupt, Cancelled):
        print("tauworkbench: stopped; nothing was written", file=sys.stderr)
        return STOPPED
    except BrokenPipeError:
        # Whoever read stdout has seen enough. Python would complain again when it closes stdout.
        with contextlib.suppress(OSError, ValueError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    return status


def _run(argv: Sequence[str] | None) -> int:
    try:
        args = _parser().parse_args(argv)
    except SystemExit as e:  # --help and --version
        return int(e.code or DONE)
    return int(args.run(args))


class _Parser(argparse.ArgumentParser):
    """argparse with an error of one line."""

    def error(self, message: str) -> NoReturn:
        raise InputError("command line", message, f"see `{self.prog} --help`")


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="tauworkbench",
        description="How fast a temperature sensor follows, from a logged step.",
        epilog="Exit status: 0 done; 2 the input can't be used, and one line on stderr says why; "
        "3 some runs of a campaign failed.",
    )
    parser.add_argument("--version", action="version", version=f"tauworkbench {__version__}")
    commands: Any = parser.add_subparsers(metavar="COMMAND", required=True)
    for command in COMMANDS:
        module = import_module(f".{command.module}", __package__)
        one = commands.add_parser(
            command.name, help=command.does, description=_sentence(command.does)
        )
        module.arguments(one)
        one.set_defaults(run=module.run)
    return parser


def _sentence(words: str) -> str:
    return f"{words[:1].upper()}{words[1:]}."
