"""``tauworkbench fit RUN.toml``: a logged step to its parameters."""

from __future__ import annotations

import argparse
from pathlib import Path

from .terminal import add_out, add_quiet, progress, say_cautions

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument("run_file", metavar="RUN.toml", help="the run file")
    add_out(parser)
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Fit, write, and print the summary."""
    from ..session.run import fit
    from ..session.store import check_folder, default_folder
    from .summary import summary_lines

    folder = Path(args.out) if args.out else default_folder(args.run_file)
    check_folder(folder)
    with progress(args.quiet) as watch:
        result = fit(args.run_file, watch=watch)
        result.save(folder, watch=watch)
    if not args.quiet:
        for line in summary_lines(result):
            print(line)
        print(f"written to {folder}")
    say_cautions(result.cautions, args.quiet)
    return 0
