"""Reading and writing TOML files that anyone may have written."""

from __future__ import annotations

import os
import re
import tomllib
from pathlib import Path
from typing import Any

from ..errors import InputError

__all__ = ["MOST_BYTES", "is_plain_file", "load", "parse", "shown"]

MOST_BYTES = 1_000_000  # a run file has a few hundred; a log given in its place has more


def is_plain_file(path: Path) -> bool:
    """Return whether a path is a file that can be read to its end; no device, no pipe."""
    try:
        return path.is_file()
    except (OSError, ValueError):  # a name too long; a name with a zero byte
        return False


def load(path: str | os.PathLike[str]) -> dict[str, Any]:
    """Read a TOML file.

    Raises
    ------
    InputError
        With ``file`` or ``file:line``, where it can't be read or isn't TOML.
    """
    file, where = Path(path), str(path)
    if not is_plain_file(file):
        what = "is a folder" if _is_folder(file) else "there is no such file"
        raise InputError(where, what, "give the path of a run file (TOML)")
    try:
        with file.open("rb") as stream:
            raw = stream.read(MOST_BYTES + 1)
    except OSError as e:
        raise InputError(where, f"can't be read: {e.strerror}", "check its permissions") from None
    if len(raw) > MOST_BYTES:
        raise InputError(
            where, f"holds more than {MOST_BYTES} bytes", "give a run file (TOML), not a log"
        )
    return parse(raw, where)


def parse(raw: bytes, where: str) -> dict[str, Any]:
    """Parse the bytes of a TOML file; see `load`."""
    how = "mend the TOML there; `tauworkbench new LOG` writes a run file to start from"
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as e:
        line = raw.count(b"\n", 0, e.start) + 1
        raise InputError(f"{where}:{line}", "isn't UTF-8 text", "save it as UTF-8") from None
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise InputError(where, "is nested too deeply", how) from None
    except ValueError as e:  # TOMLDecodeError, or a number of thousands of digits
        found = re.search(r"\s*\(at line (\d+), column \d+\)", str(e))
        line = int(found[1]) if found else max(text.count("\n") + (not text.endswith("\n")), 1)
        what = str(e).replace(found[0], "") if found else str(e)
        what = re.sub(r"\s*\(at end of document\)", " at the end of the file", what)
        raise InputError(f"{where}:{line}", f"isn't TOML: {what}", how) from None


def shown(value: Any, most: int = 40) -> str:
    """Show a value from a file as TOML would, on one line and not too long."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{value[: most - 3]}..."' if len(value) > most else f'"{value}"'
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return f"a list of {len(value)}"
    if isinstance(value, int) and abs(value) >= 10**most:
        return "a very large number"
    return str(value)


def _is_folder(path: Path) -> bool:
    try:
        return path.is_dir()
    except (OSError, ValueError):
        return False
