"""``tauworkbench campaign CAMPAIGN.toml``: many runs to tables."""

from __future__ import annotations

import argparse
from pathlib import Path

from .terminal import add_out, add_quiet, progress, say_cautions

__all__ = ["SOME_FAILED", "arguments", "run"]

SOME_FAILED = 3


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument("campaign_file", metavar="CAMPAIGN.toml", help="the campaign file")
    add_out(parser)
    parser.add_argument(
        "--refit",
        action="store_true",
        help="fit also those runs whose results are kept from an earlier campaign",
    )
    parser.add_argument(
        "--processes",
        metavar="N",
        type=int,
        default=0,
        help="fit at most so many runs at once; by default one per core",
    )
    parser.add_argument(
        "--decimal",
        choices=("point", "comma"),
        default="point",
        help="decimal sign of the tables; with a comma they are separated by semicolons",
    )
    parser.add_argument(
        "--cluster",
        metavar="ADDRESS",
        help="fit on the Dask cluster whose scheduler is there, such as tcp://host:8786",
    )
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Fit all runs, write, and print the summary."""
    from ..session.campaign import campaign
    from ..session.store import check_folder, default_folder

    folder = Path(args.out) if args.out else default_folder(args.campaign_file)
    check_folder(folder)
    with progress(args.quiet) as watch:
        found = campaign(
            args.campaign_file,
            watch=watch,
            refit=args.refit,
            processes=max(args.processes, 0),
            cluster=args.cluster,
        )
        watch.report(0, 0, "writing the tables and the report")
        found.save(folder, decimal=args.decimal)
    if not args.quiet:
        runs, failed = len(found.runs), len(found.failed)
        kept = f", {found.kept} of them fitted earlier" if found.kept else ""
        print(f"{found.settings.name}: {runs} runs, {failed} failed{kept}")
        for media in found.media:
            low, high = media.combined.low, media.combined.high
            decision = "" if media.decision is None else f", {media.decision.decision}"
            times = f"{media.t63.mean:.4g} s ({low:.4g} to {high:.4g} s{decision})"
            print(f"  {media.title}: 63.2 % in {times}")
        for one in found.failed:
            print(f"  failed: {one.run}: {one.error}")
        print(f"written to {folder}")
    say_cautions(found.cautions, args.quiet)
    return SOME_FAILED if found.failed else 0
