"""What a campaign hands on: its runs with their results, as they are and nothing pooled."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Protocol

from ..records import Budget, Direct, FitSummary, StepSummary
from ..result import Provenance, RunInfo
from ..uncertainty import Quantity

__all__ = ["CampaignRun", "CampaignSettings", "StepResult", "steps_of"]


class StepResult(Protocol):
    """One fitted step: the blocks of ``result.json``, fresh or read back from a file."""

    @property
    def run(self) -> RunInfo:
        """What was tested."""

    @property
    def step(self) -> StepSummary:
        """The fitted step."""

    @property
    def fit(self) -> FitSummary:
        """The thermal model's answer."""

    @property
    def direct(self) -> Direct | None:
        """Readings without a model."""

    @property
    def budget(self) -> Budget | None:
        """Uncertainty budget of the 63.2 % time."""

    @property
    def dissipation(self) -> Mapping[str, Quantity]:
        """Dissipation constant, by unit; empty where there is none."""

    @property
    def cautions(self) -> tuple[str, ...]:
        """Reservations."""

    @property
    def provenance(self) -> Provenance:
        """What reproduces it."""


@dataclass(frozen=True)
class CampaignRun:
    """One run of a campaign: its fitted steps, or the line that says why there are none.

    Attributes
    ----------
    run : str
        The run file's path without its suffix, relative to the campaign file.
    results : tuple of StepResult
        One per fitted step; empty when the run failed.
    error : str
        One line; empty when the run was fitted.
    """

    run: str
    results: tuple[StepResult, ...] = ()
    error: str = ""


@dataclass(frozen=True)
class CampaignSettings:
    """The keys of ``[campaign]``, without the runs.

    Attributes
    ----------
    name : str
    limit_s : float or None
        The 63.2 % time that each sensor and medium is held against [s].
    risk : float
        Greatest accepted probability that a decision is wrong.
    speed_exponent : float or "fit"
        Exponent of the speed in the film coefficient.
    area_m2 : float or None
        The sensor's outer area [m^2].
    """

    name: str = ""
    limit_s: float | None = None
    risk: float = 0.05
    speed_exponent: float | str = "fit"
    area_m2: float | None = None


def steps_of(runs: tuple[CampaignRun, ...]) -> Iterator[tuple[str, StepResult]]:
    """Yield each fitted step with its run's name, in order."""
    for run in runs:
        for result in run.results:
            yield run.run, result
