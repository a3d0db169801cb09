"""What the runs of a campaign say together."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from ..result import jsonable
from .comparison import Comparison, compare
from .media import Media, media_rows, pool_media
from .records import CampaignRun, CampaignSettings
from .speed import SensorSpeedLaw, speed_laws

__all__ = ["Analysis", "analyse"]


@dataclass(frozen=True, eq=False)
class Analysis:
    """The means, and what follows from them.

    Attributes
    ----------
    media : tuple of Media
    speed_laws : tuple of SensorSpeedLaw
    comparisons : tuple of Comparison
    cautions : tuple of str
        Of all of them, each once.
    """

    media: tuple[Media, ...]
    speed_laws: tuple[SensorSpeedLaw, ...]
    comparisons: tuple[Comparison, ...]
    cautions: tuple[str, ...]

    def as_dict(self) -> dict[str, Any]:
        """Return the blocks of ``campaign.json``; a row of ``media`` has the CSV file's keys."""
        return {
            "media": [jsonable(one) for one in self._media()],
            "speed_law": [law.as_dict() for law in self.speed_laws],
            "comparisons": [jsonable(one) for one in self.comparisons],
        }

    def _media(self) -> Iterator[dict[str, Any]]:
        for one, row in zip(self.media, media_rows(self.media), strict=True):
            yield {
                **row,
                "members": [m.run for m in one.members],
                "outlying": list(one.outlying),
                "statistical": _mean(one.t63),
                "lag": {"mean_s": one.lag.mean, **_mean(one.lag)},
                "shared": one.shared,
                "heating_minus_cooling": one.heating_minus_cooling,
                "conformance": one.decision,
                "cautions": list(one.cautions),
            }


def _mean(mean: Any) -> dict[str, Any]:
    low, high = mean.interval()
    return {
        "standard_uncertainty_s": mean.standard_uncertainty,
        "degrees_of_freedom": mean.degrees_of_freedom,
        "low_s": low,
        "high_s": high,
        "between_run_s": mean.between_sd,
        "within_run_s": mean.within_u,
    }


def analyse(runs: tuple[CampaignRun, ...], settings: CampaignSettings) -> Analysis:
    """Pool the runs, decide, fit the speed laws and compare."""
    media, cautions = pool_media(runs, settings)
    laws, on_laws = speed_laws(media, settings)
    comparisons, more = compare(media)
    found = (*cautions, *(c for one in media for c in one.cautions), *on_laws, *more)
    return Analysis(media, laws, comparisons, tuple(dict.fromkeys(found)))
