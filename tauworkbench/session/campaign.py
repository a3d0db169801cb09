"""A campaign end to end, as a script or a command does it."""

from __future__ import annotations

import os
import time
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from ..campaign.analysis import Analysis, analyse
from ..campaign.media import MEDIA_COLUMNS, Media, media_rows
from ..campaign.records import CampaignRun, CampaignSettings
from ..campaign.rows import RUN_COLUMNS, csv_text, run_rows
from ..errors import __version__
from ..progress import SILENT, Watch, step
from ..result import FORMAT, VERSION, jsonable
from .cache import Cache, cache_folder
from .campaign_file import RunFile, read_campaign
from .one_run import Outcome
from .saved import SavedResult, results_from_dict
from .store import json_text, write_files
from .workers import fit_each

__all__ = ["CampaignResult", "campaign"]

CAMPAIGN_FORMAT, CAMPAIGN_VERSION = "tauworkbench.campaign", 1


@dataclass(frozen=True, eq=False)
class CampaignResult:
    """Many runs' results.

    Attributes
    ----------
    settings : CampaignSettings
        What ``[campaign]`` says.
    table : dict
        ``[campaign]`` as given.
    runs : tuple of CampaignRun
        In the order of their paths, failed ones with their line.
    kept : int
        How many runs an earlier campaign had fitted already.
    analysis : Analysis
        What the runs say together.
    cautions : tuple of str
        On the campaign itself; each run's own are with the run.
    """

    settings: CampaignSettings
    table: dict[str, Any]
    runs: tuple[CampaignRun, ...]
    analysis: Analysis
    kept: int = 0
    cautions: tuple[str, ...] = ()

    @property
    def results(self) -> tuple[SavedResult, ...]:
        """Each fitted step."""
        return tuple(r for run in self.runs for r in run.results if isinstance(r, SavedResult))

    @property
    def media(self) -> tuple[Media, ...]:
        """Each sensor in each medium at each speed."""
        return self.analysis.media

    @property
    def failed(self) -> tuple[CampaignRun, ...]:
        """The runs that failed."""
        return tuple(run for run in self.runs if run.error)

    def as_dict(self) -> dict[str, Any]:
        """Return the content of ``campaign.json``."""
        each = [{"format": FORMAT, "version": VERSION, **jsonable(r)} for r in self.results]
        return {
            "format": CAMPAIGN_FORMAT,
            "version": CAMPAIGN_VERSION,
            "name": self.settings.name,
            "results": each,
            **self.analysis.as_dict(),
            "failed": [{"run": r.run, "error": r.error} for r in self.failed],
            "cautions": list(self.cautions),
            "provenance": {"package": f"tauworkbench {__version__}", "settings": self.table},
        }

    def save(self, folder: str | os.PathLike[str]) -> Path:
        """Write ``runs.csv``, ``media.csv`` and ``campaign.json`` into a folder.

        Parameters
        ----------
        folder : path
            Made when absent. An older campaign in it is replaced only when all files are complete.

        Raises
        ------
        InputError
            Where the folder can't be written.
        """
        return write_files(
            folder,
            {
                "runs.csv": csv_text(RUN_COLUMNS, run_rows(self.runs)),
                "media.csv": csv_text(MEDIA_COLUMNS, media_rows(self.analysis.media)),
                "campaign.json": json_text(self.as_dict()),
            },
        )


def campaign(
    path: str | os.PathLike[str], *, watch: Watch = SILENT, refit: bool = False, processes: int = 0
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
    outcomes = _fit(file.runs, watch, refit, processes)
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


def _fit(files: Sequence[RunFile], watch: Watch, refit: bool, processes: int) -> list[Outcome]:
    folder = cache_folder()
    found: dict[int, Outcome] = {}
    start = time.monotonic()
    step(watch, 0, len(files), f"fitting {files[0].run}")
    each = fit_each([f.path for f in files], folder, refit=refit, processes=processes)
    for i, outcome in each:
        if outcome is not None:
            found[i] = outcome
        spent = time.monotonic() - start
        words = f"{len(found)} of {len(files)} runs, {_left(spent, len(found), len(files))}"
        step(watch, len(found), len(files), words)
    Cache(folder).prune()
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
