"""``tauworkbench plan``: before the test, what uncertainty to expect."""

from __future__ import annotations

import argparse
import json

from ..errors import InputError
from .terminal import add_quiet, say_cautions

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    add = parser.add_argument
    add("--time-constants", metavar="S[,S]", required=True,
        help="the time constants expected, one or two, in seconds")  # fmt: skip
    add("--interval", metavar="S", type=float, required=True, help="seconds between samples")
    add("--length", metavar="S", type=float, required=True, help="seconds after the onset")
    add("--baseline", metavar="S", type=float, help="seconds before the onset; a quarter of the "
        "length when absent")  # fmt: skip
    add("--step", metavar="K", type=float, required=True, help="size of the step in kelvin")
    add("--noise", metavar="K", type=float, required=True,
        help="standard deviation of one sample in kelvin, without the converter")  # fmt: skip
    add("--bits", metavar="N", type=int, help="bits of the converter")
    add("--range", metavar="K", type=float, help="kelvin that all codes of the converter span")
    add("--onset-u", metavar="S", type=float,
        help="standard uncertainty of the onset that a marker gives; without it the onset is "
        "found from the curve")  # fmt: skip
    add("--json", action="store_true", help="print it as JSON")
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Work it out and print it."""
    from dataclasses import asdict

    from ..campaign.plan import TestPlan, expect

    plan = TestPlan(
        time_constants_s=_time_constants(args.time_constants),
        interval_s=args.interval,
        length_s=args.length,
        baseline_s=args.length / 4 if args.baseline is None else args.baseline,
        step_k=args.step,
        noise_k=args.noise,
        code_k=_code(args),
        onset_u_s=args.onset_u,
    )
    found = expect(plan)
    if args.quiet:
        return 0
    if args.json:
        print(json.dumps({"plan": asdict(plan), "expected": asdict(found)}, indent=2))
        return 0
    u, t63 = found.standard_uncertainty_s, found.t63_s
    print(f"63.2 % time {t63:.4g} s: standard uncertainty {u:.2g} s ({u / t63:.2g} of it) at best")
    for i, tau_u in enumerate(found.time_constant_u_s):
        print(f"  time constant {plan.time_constants_s[i]:.4g} s: {tau_u:.2g} s")
    print(f"  lag {sum(plan.time_constants_s):.4g} s: {found.lag_u_s:.2g} s")
    print("what it is made of: " + ", ".join(f"{what} {share:.0%}" for what, share in found.shares))
    if found.changes:
        print("what to change first:")
        for change in found.changes:
            print(f"  {change.what}: {change.standard_uncertainty_s:.2g} s")
    say_cautions(found.cautions, args.quiet)
    return 0


def _time_constants(text: str) -> tuple[float, ...]:
    try:
        return tuple(float(x) for x in text.split(","))
    except ValueError:
        where = "command line --time-constants"
        what = f'"{text[:40]}" is no list of numbers'
        raise InputError(where, what, "give seconds, such as 8,1.3") from None


def _code(args: argparse.Namespace) -> float:
    if args.bits is None and args.range is None:
        return 0.0
    if args.bits is None or args.range is None or not 1 <= args.bits <= 32 or not args.range > 0:
        what = "a converter needs its bits (1 to 32) and the kelvin that its codes span"
        raise InputError("command line --bits", what, "give --bits and --range")
    return float(args.range / 2**args.bits)
