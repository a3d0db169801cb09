"""Reading a campaign file, and finding its run files."""

from __future__ import annotations

import glob
import os
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any

from ..campaign.records import CampaignSettings
from ..errors import InputError
from .toml_file import is_plain_file, load
from .values import read_table, suggestion

__all__ = ["CampaignFile", "RunFile", "read_campaign"]

_MOST_RUNS = 100_000


@dataclass(frozen=True)
class RunFile:
    """A run file of a campaign.

    Attributes
    ----------
    run : str
        Its path without suffix, relative to the campaign file.
    path : Path
        Where it is.
    """

    run: str
    path: Path


@dataclass(frozen=True)
class CampaignFile:
    """What a campaign file says, with the run files that its patterns found.

    Attributes
    ----------
    settings : CampaignSettings
    table : dict
        ``[campaign]`` as given.
    runs : tuple of RunFile
        In the order of their paths; a file that can't be read is among them, to fail as a run.
    cautions : tuple of str
        Patterns that found nothing.
    """

    settings: CampaignSettings
    table: dict[str, Any]
    runs: tuple[RunFile, ...]
    cautions: tuple[str, ...] = ()


def read_campaign(path: str | os.PathLike[str]) -> CampaignFile:
    """Read a campaign file and find its runs.

    Raises
    ------
    InputError
        Where the file can't be used, or no run file is found.
    """
    file = Path(path)
    data = load(file)
    for table in data:
        if table != "campaign":
            how = suggestion(table, {"campaign": None})
            if table == "log":
                how = "this is a run file: give it to `tauworkbench fit`"
            raise InputError(f"{path} [{table}]", "there is no such table", how)
    where = f"{path} [campaign]"
    if "campaign" not in data:
        raise InputError(where, "is missing", "give the table [campaign] with its runs")
    values = read_table("campaign", data["campaign"], where)
    patterns = values.pop("runs", None)
    if not patterns:
        raise InputError(f"{where} runs", "is missing", 'give patterns, such as ["runs/*.toml"]')
    runs, cautions = _find(file, patterns, f"{where} runs")
    settings = CampaignSettings(**{"name": file.stem, **values})
    return CampaignFile(settings, dict(data["campaign"]), runs, cautions)


def _find(
    file: Path, patterns: tuple[str, ...], where: str
) -> tuple[tuple[RunFile, ...], tuple[str, ...]]:
    found: dict[str, Path] = {}
    cautions = []
    for pattern in patterns:
        names = list(islice(_matches(file.parent, pattern), _MOST_RUNS + 1))
        if len(names) > _MOST_RUNS:
            what = f'"{pattern[:60]}" finds more than {_MOST_RUNS} files'
            raise InputError(where, what, "give a pattern for the run files alone")
        runs = {name: path for name in names if _is_run(path := file.parent / name, file)}
        if not runs:
            cautions.append(f'the pattern "{pattern}" of [campaign] runs finds no run file')
        found |= runs
    if not found:
        what = f"{', '.join(patterns)[:80]} finds no run file"
        how = f"give patterns relative to {file.parent}, such as " + '["runs/*.toml"]'
        raise InputError(where, what, how)
    each: dict[Path, RunFile] = {}
    for name, path in sorted(found.items()):
        each.setdefault(path.resolve(), RunFile(Path(name).with_suffix("").as_posix(), path))
    return tuple(each.values()), tuple(cautions)


def _matches(folder: Path, pattern: str) -> Iterator[str]:
    try:
        # Path.glob refuses an absolute pattern
        for name in glob.iglob(pattern, root_dir=folder, recursive=True):  # noqa: PTH207
            # a folder full of logs may match; only a name without wildcards is taken on trust
            if name.endswith(".toml") or not glob.has_magic(pattern):
                yield os.path.normpath(name)
    except (OSError, ValueError):  # a zero byte in a pattern
        return


def _is_run(path: Path, campaign: Path) -> bool:
    """Whether a file is a run file: not the campaign itself, and with a [log].

    One that isn't TOML counts, so that it fails by name.
    """
    if not is_plain_file(path) or path.resolve() == campaign.resolve():
        return False
    try:
        return "log" in load(path)
    except InputError:
        return True
