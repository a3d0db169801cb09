"""A campaign end to end, as a script or a command does it."""

from __future__ import annotations

import os
import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from ..campaign.analysis import analyse
from ..campaign.campaign import Campaign
from ..campaign.media import MEDIA_COLUMNS, media_rows
from ..campaign.records import CampaignRun
from ..campaign.rows import RUN_COLUMNS, csv_text, run_rows
from ..progress import SILENT, Watch, step
from .cache import Cache, cache_folder
from .campaign_file import RunFile, read_campaign
from .one_run import Outcome
from .saved import results_from_dict
from .store import json_text, write_files
from .workers import fit_each

__all__ = ["CampaignResult", "campaign"]


@dataclass(frozen=True, eq=False)
class CampaignResult(Campaign):
    """A `Campaign` that knows how to write itself."""

    def save(self, folder: str | os.PathLike[str], *, decimal: str = "point") -> Path:
        """Write ``runs.csv``, ``media.csv``, ``campaign.json`` and ``report.html`` into a folder.

        Parameters
        ----------
        folder : path
            Made when absent. An older campaign in it is replaced only when all files are complete.
        decimal : "point" or "comma"
            A comma in the tables' numbers makes the semicolon their delimiter.

        Raises
        ------
        InputError
            Where the folder can't be written.
        """
        from ..report.campaign_page import render_campaign

        media = media_rows(self.analysis.media)
        return write_files(
            folder,
            {
                "runs.csv": csv_text(RUN_COLUMNS, run_rows(self.runs), decimal=decimal),
                "media.csv": csv_text(MEDIA_COLUMNS, media, decimal=decimal),
                "campaign.json": json_text(self.as_dict()),
                "report.html": render_campaign(self),
            },
        )


def campaign(
    path: str | os.PathLike[str],
    *,
    watch: Watch = SILENT,
    refit: bool = False,
    processes: int = 0,
    cluster: str | None = None,
) -> CampaignResult:
    """Fit every run of a campaign; what ``tauworkbench campaign`` does.

    Parameters
    ----------
    path : path
        The campaign file (TOML).
    watch : Watch
        Progress and cancelling.
    refit : bool
        Whether to fit also those runs that an earlier, perhaps interrupted campaign has fitted
        with the same log, choices and version.
    processes : int
        At most so many; 0 for one per core.
    cluster : str, optional
        The scheduler of a Dask cluster that fits them instead, such as ``tcp://host:8786``.

    Returns
    -------
    CampaignResult
        ``save(DIR)`` writes it. A run that fails is in it with its line and stops no other.

    Raises
    ------
    InputError
        Where the campaign file can't be used, or finds no run.
    """
    file = read_campaign(path)
    paths = [f.path for f in file.runs]
    folder = cache_folder()
    if cluster is None:
        each = fit_each(paths, folder, refit=refit, processes=processes)
    else:
        from .cluster import fit_on_cluster

        each = fit_on_cluster(cluster, paths, folder, refit=refit)
    outcomes = _gathered(each, file.runs, watch)
    Cache(folder).prune()
    runs = tuple(_run(f.run, outcome) for f, outcome in zip(file.runs, outcomes, strict=True))
    analysis = analyse(runs, file.settings)
    return CampaignResult(
        settings=file.settings,
        table=file.table,
        runs=runs,
        kept=sum(bool(o.get("kept")) for o in outcomes),
        analysis=analysis,
        cautions=(*file.cautions, *analysis.cautions),
    )


def _gathered(
    each: Iterator[tuple[int, Outcome | None]], files: Sequence[RunFile], watch: Watch
) -> list[Outcome]:
    """All outcomes in the runs' order, with the progress shown."""
    found: dict[int, Outcome] = {}
    start = time.monotonic()
    step(watch, 0, len(files), f"fitting {files[0].run}")
    for i, outcome in each:
        if outcome is not None:
            found[i] = outcome
        spent = time.monotonic() - start
        words = f"{len(found)} of {len(files)} runs, {_left(spent, len(found), len(files))}"
        step(watch, len(found), len(files), words)
    return [found[i] for i in range(len(files))]


def _left(spent_s: float, done: int, total: int) -> str:
    if not done or done == total:
        return "the last ones" if done else "starting"
    left = spent_s / done * (total - done)
    return f"about {left:.0f} s left" if left < 90 else f"about {left / 60:.0f} min left"


def _run(name: str, outcome: Outcome) -> CampaignRun:
    if "error" in outcome:
        return CampaignRun(name, error=outcome["error"])
    results = results_from_dict(outcome["result"], name)
    # two run files may have the same name in different folders
    return CampaignRun(name, tuple(replace(r, run=replace(r.run, name=name)) for r in results))
