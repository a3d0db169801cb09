"""``tauworkbench help [KEY]``: what a key of the run file means and takes."""

from __future__ import annotations

import argparse

from ..errors import InputError

__all__ = ["arguments", "run"]


def arguments(parser: argparse.ArgumentParser) -> None:
    """Add this command's arguments."""
    parser.add_argument(
        "key",
        metavar="KEY",
        nargs="?",
        help="a key or a table, such as noise_u, log.noise_u or circuit; without it, all tables",
    )


def run(args: argparse.Namespace) -> int:
    """Print what was asked for."""
    from ..session import keys

    if args.key is None:
        print("Tables of a run file and of a campaign file, with their keys:\n")
        for table in keys.tables():
            print(f"[{table}]  {', '.join(keys.keys_of(table))}")
        print("\n`tauworkbench help KEY` explains one of them.")
        return 0
    wanted = args.key.replace("[", "").replace("]", ".").replace(" ", "").strip(".")
    table, _, name = wanted.rpartition(".")
    found = [
        k for k in keys.KEYS if wanted == k.table or (name == k.name and table in ("", k.table))
    ]
    if not found:
        known = {k.name for k in keys.KEYS} | set(keys.tables())
        near = keys.nearest(name or wanted, sorted(known))
        how = f'did you mean "{near}"?' if near else "`tauworkbench help` lists them"
        raise InputError("command line", f'there is no key or table "{args.key}"', how)
    print("\n\n".join(_words(k) for k in found))
    return 0


def _words(key: object) -> str:
    from ..session.keys import Key, keys_of_kind, kinds, toml_word

    assert isinstance(key, Key)  # noqa: S101 - for the type checker
    lines = [key.address, f"  {key.meaning}", f"  takes: {key.allowed}"]
    if key.required:
        lines.append("  required")
    elif key.default is not None:
        lines.append(f"  default: {toml_word(key.default)}")
    if key.example:
        lines.append(f"  example: {key.name} = {key.example}")
    if key.table in ("circuit", "law"):
        if key.name == "kind":
            lines.append(f"  kinds: {', '.join(kinds(key.table))}")
        using = [kind for kind in kinds(key.table) if key.name in keys_of_kind(key.table, kind)]
        if using:
            lines.append(f"  for: {', '.join(using)}")
    return "\n".join(lines)
