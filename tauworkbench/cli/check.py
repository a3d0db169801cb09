"""``tauworkbench check RUN.toml``: read everything, fit nothing, say what was understood."""

from __future__ import annotations

import argparse
import json

from .terminal import add_quiet, progress, say_cautions

__all__ = ["arguments", "run"]

_UNITS = {"s": "s", "c": "degC", "k": "K", "w": "W", "ohm": "ohm", "v": "V", "mm": "mm"}


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument("run_file", metavar="RUN.toml", help="the run file")
    parser.add_argument("--json", action="store_true", help="print it as JSON")
    add_quiet(parser)


def run(args: argparse.Namespace) -> int:
    """Read and print."""
    from ..session.overview import overview

    with progress(args.quiet) as watch:
        found = overview(args.run_file, watch)
    if args.quiet:
        return 0
    if args.json:
        print(json.dumps(found, indent=2, ensure_ascii=False, allow_nan=False))
        return 0
    cautions = found.pop("cautions", [])
    for line in _lines(found):
        print(line)
    say_cautions(cautions, args.quiet)
    return 0


def _lines(found: dict[str, object], indent: str = "") -> list[str]:
    """Nested facts as indented lines; the same facts as ``--json`` gives."""
    out = []
    for name, value in found.items():
        title = _title(name)
        if isinstance(value, dict):
            out += [f"{indent}{title}", *_lines(value, indent + "  ")]
        elif isinstance(value, list) and value and isinstance(value[0], dict):
            out.append(f"{indent}{title}")
            out += [f"{indent}  {_row(one)}" for one in value]
        else:
            out.append(f"{indent}{title:<{max(24 - len(indent), 1)}} {_text(value)}")
    return out


def _row(one: dict[str, object]) -> str:
    return ", ".join(f"{_title(k)} {_text(v)}" for k, v in one.items())


def _title(name: str) -> str:
    """A key in words, its unit in brackets: ``window_s`` is ``window [s]``."""
    head, _, unit = name.rpartition("_")
    words = f"{head} [{_UNITS[unit]}]" if head and unit in _UNITS else name
    return words.replace("_", " ")


def _text(value: object) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, list):
        return " to ".join(map(_text, value)) if value else "none"
    return str(value)
