"""``tauworkbench new LOG``: a commented run file beside a log."""

from __future__ import annotations

import argparse
from pathlib import Path

from ..errors import InputError
from .terminal import add_quiet, progress, say_cautions

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument("log", metavar="LOG", help="the log")
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Read the log and write the run file, never over an existing one."""
    from ..logs import read_log
    from ..session.draft import draft
    from ..session.store import write_new_text

    log_path = Path(args.log)
    target = log_path.with_name(f"{log_path.stem}.toml")
    if target.exists() or target.is_symlink():
        what = "is there already and is never overwritten"
        raise InputError(str(target), what, "move it away, or go on with it")
    with progress(args.quiet) as watch:
        log = read_log(log_path, watch=watch)
    write_new_text(target, draft(log))
    if not args.quiet:
        print(f"written to {target}; now choose what stands as a comment there, then")
        print(f"tauworkbench check {target}")
    say_cautions(log.cautions, args.quiet)
    return 0
