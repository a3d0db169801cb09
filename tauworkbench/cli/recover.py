"""``tauworkbench recover RUN.toml``: a field log to the ambient behind it."""

from __future__ import annotations

import argparse
import math
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

from ..errors import InputError
from .terminal import add_out, add_quiet, progress, say_cautions

if TYPE_CHECKING:
    from ..session.recover import Firmware, RecoveredRun

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument("run_file", metavar="RUN.toml", help="the run file, with [recover] in it")
    add_out(parser)
    parser.add_argument(
        "--causal",
        action="store_true",
        help="use at each time only what was known by then, as a live display must",
    )
    parser.add_argument(
        "--firmware",
        metavar="INTERVAL_S",
        type=float,
        help="design also a correction of a few lines for firmware with a reading every "
        "INTERVAL_S seconds, in Python and in C: in ambient.json and in the report",
    )
    parser.add_argument(
        "--noise-gain",
        metavar="GAIN",
        type=float,
        help="of that correction: its noise over that of the reading, 2 by default; "
        "more is less delay",
    )
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Recover, write, and print the summary."""
    from ..session.recover import recover
    from ..session.store import check_folder, default_folder

    folder = Path(args.out) if args.out else default_folder(args.run_file)
    check_folder(folder)
    with progress(args.quiet) as watch:
        found = recover(args.run_file, causal=args.causal, firmware=_firmware(args), watch=watch)
        found.save(folder, watch=watch)
    if not args.quiet:
        for line in _summary(found):
            print(line)
        print(f"written to {folder}")
    say_cautions(found.cautions, args.quiet)
    return 0


def _firmware(args: argparse.Namespace) -> Firmware | None:
    from ..session.recover import Firmware

    if args.firmware is None:
        if args.noise_gain is not None:
            raise InputError("--noise-gain", "is given without --firmware", "give both, or neither")
        return None
    numbers = {"--firmware": args.firmware, "--noise-gain": args.noise_gain}
    given = {name: value for name, value in numbers.items() if value is not None}
    for name, value in given.items():
        if not 0 < value < math.inf:
            raise InputError(name, f"{value} is not above zero and finite", "give 1, say")
    return Firmware(*given.values())


def _summary(found: RecoveredRun) -> Iterator[str]:
    """Yield what a reader looks for first."""
    from ..report import words
    from ..report.ambient_words import sensor_words

    ambient, run = found.ambient, found.run
    stated = [x for x in (run.sensor, run.medium) if x]
    yield f"{run.name}: {', '.join([words.kind_words(words.TESTS, run.test), *stated])}"
    figures = words.figures
    for name, values in (("indicated", ambient.indicated_c), ("ambient", ambient.ambient_c)):
        yield _line(name, f"{values.min():.2f} to {values.max():.2f} degC")
    half = float((ambient.high_c - ambient.low_c).mean()) / 2
    share = words.percent(ambient.coverage)
    yield _line("band", f"+- {figures(half, 2)} K on average ({share}, at each time)")
    yield _line("sensor", sensor_words(ambient))
    yield _line("resolution", f"{figures(ambient.resolution_s)} s; shorter features are lost")
    yield _line("noise gain", figures(ambient.noise_gain))
    if ambient.causal:
        yield _line("delay", f"{figures(ambient.delay_s)} s")
    white = "may pass for white" if ambient.check.white else "NOT white"
    yield _line("sent back", f"residuals {figures(1e3 * ambient.check.rms_k)} mK rms, {white}")


def _line(name: str, text: str) -> str:
    return f"  {name:<14} {text}"
