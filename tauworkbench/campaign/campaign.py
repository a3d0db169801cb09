"""A whole campaign as a record, in the shape of ``campaign.json``."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from ..errors import __version__
from ..result import FORMAT, VERSION, jsonable
from .analysis import Analysis
from .media import Media
from .records import CampaignRun, CampaignSettings, StepResult, steps_of
from .speed import SensorSpeedLaw

__all__ = ["CAMPAIGN_FORMAT", "CAMPAIGN_VERSION", "Campaign"]

CAMPAIGN_FORMAT, CAMPAIGN_VERSION = "tauworkbench.campaign", 1


@dataclass(frozen=True, eq=False)
class Campaign:
    """Many runs' results, and what they say together.

    Attributes
    ----------
    settings : CampaignSettings
        What ``[campaign]`` says.
    table : mapping
        ``[campaign]`` as given.
    runs : tuple of CampaignRun
        In the order of their paths, failed ones with their line.
    analysis : Analysis
        What the runs say together.
    kept : int
        How many runs an earlier campaign had fitted already.
    cautions : tuple of str
        On the campaign itself; each run's own are with the run.
    """

    settings: CampaignSettings
    table: Mapping[str, Any]
    runs: tuple[CampaignRun, ...]
    analysis: Analysis
    kept: int = 0
    cautions: tuple[str, ...] = ()

    @property
    def results(self) -> tuple[StepResult, ...]:
        """Each fitted step."""
        return tuple(result for _, result in steps_of(self.runs))

    @property
    def media(self) -> tuple[Media, ...]:
        """Each sensor in each medium at each speed."""
        return self.analysis.media

    @property
    def speed_law(self) -> tuple[SensorSpeedLaw, ...]:
        """One law for each sensor and medium with two speeds or more."""
        return self.analysis.speed_laws

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
            "provenance": {
                "package": f"tauworkbench {__version__}",
                "settings": jsonable(self.table),
            },
        }
