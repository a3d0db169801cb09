"""``tauworkbench open``: the bench in the browser.

One Jupyter server on this machine alone, with a random token, shows the one notebook in two ways:
as a page without code (Voila, an extension of that server) and in JupyterLab.
"""

from __future__ import annotations

import argparse
from pathlib import Path

from ..errors import InputError

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument(
        "source",
        metavar="LOG or RUN.toml",
        nargs="?",
        help="a log or a run file; without one, the samples, copied to a folder that is named",
    )
    parser.add_argument("--lab", action="store_true", help="as a notebook in JupyterLab")
    parser.add_argument(
        "--port", type=int, default=0, help="the server's port; a free one when absent"
    )
    parser.add_argument(
        "--no-browser", action="store_true", help="print the address and open no browser"
    )


def run(args: argparse.Namespace) -> int:
    """Serve until Ctrl-C."""
    from .server import check_port, door_of, serve

    door = door_of(args.lab)
    if args.port:
        check_port(args.port)
    serve(_source(args.source), door, port=args.port, browser=not args.no_browser)
    return 0


def _source(given: str | None) -> Path:
    from ..session.shipped import copy_samples
    from ..session.toml_file import is_plain_file

    if given is None:
        folder = Path.cwd() / "tauworkbench-samples"
        run_file = copy_samples(folder)
        print(f"The samples are in {folder}")
        return run_file
    path = Path(given).expanduser()
    if not is_plain_file(path):
        what = "is a folder" if path.is_dir() else "there is no such file"
        raise InputError(given, what, "give the path of a log, or of a run file (.toml)")
    return path.absolute()
