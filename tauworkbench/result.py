"""A run's result: its estimates with what they came from, in the shape of ``result.json``.

A result carries its own settings, so a report needs nothing else.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields, is_dataclass, replace
from typing import Any

import numpy as np

from .ambient.firmware import Correction
from .ambient.record import Ambient
from .errors import __version__
from .estimate.compare import heating_minus_cooling
from .estimate.record import Estimate
from .records import Budget, Covariance, Direct, FitSummary, StepSummary, Trace
from .uncertainty import Quantity

__all__ = ["Provenance", "Recovery", "Result", "RunInfo", "jsonable", "result_dict"]

FORMAT, FORMAT_MANY, VERSION = "tauworkbench.result", "tauworkbench.results", 1
QUANTITY = {
    "plunge": "ambient-change",
    "air-step": "ambient-change",
    "self-heating": "internal-heating",
    "cooling-after-heating": "cooling-after-heating",
}


@dataclass(frozen=True)
class RunInfo:
    """What was tested; ``conditions`` holds the further keys of ``[test]`` as given."""

    name: str
    test: str
    quantity: str
    sensor: str | None = None
    medium: str | None = None
    speed_m_s: float | None = None
    conditions: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Provenance:
    """What reproduces the result: the log's hash, the package, log time's zero, all settings."""

    log_sha256: str
    time_origin: str
    settings: Mapping[str, Any]
    package: str = f"tauworkbench {__version__}"
    log_file: str = ""


@dataclass(frozen=True, eq=False)
class Result:
    """One run's estimates (one per step) with the trace and the provenance.

    ``step``, ``fit``, ``direct``, ``budget`` and ``cautions`` are those of the first estimate, as
    in the JSON of a run with one step; with several, look in ``estimates``.
    """

    run: RunInfo
    trace: Trace
    estimates: tuple[Estimate, ...]
    provenance: Provenance

    @property
    def step(self) -> StepSummary:
        """The fitted step."""
        return self.estimates[0].step

    @property
    def fit(self) -> FitSummary:
        """The thermal model's answer."""
        return _fit_summary(self.estimates[0])

    @property
    def direct(self) -> Direct | None:
        """Readings without a model."""
        return self.estimates[0].direct

    @property
    def budget(self) -> Budget | None:
        """Uncertainty budget."""
        return self.estimates[0].budget

    @property
    def cautions(self) -> tuple[str, ...]:
        """The trace's and the estimates' cautions, each once."""
        words = (*self.trace.cautions, *(c for e in self.estimates for c in e.cautions))
        return tuple(dict.fromkeys(words))

    def as_dict(self) -> dict[str, Any]:
        """Return the content of ``result.json``."""
        each = [result_dict(self, e) for e in self.estimates]
        if len(each) == 1:
            return each[0]
        many = {"format": FORMAT_MANY, "version": VERSION, "results": each}
        difference = heating_minus_cooling(self.estimates)
        if difference is not None:
            many["heating_minus_cooling_s"] = difference.as_dict()
        return many


@dataclass(frozen=True, eq=False)
class Recovery:
    """A field log's ambient with the trace that it is behind and the provenance.

    ``correction``, for a sensor's own firmware, is there when it was asked for; ``listings`` are
    programs of a few lines that do it, by language.
    """

    run: RunInfo
    trace: Trace
    ambient: Ambient
    provenance: Provenance
    correction: Correction | None = None
    listings: Mapping[str, str] = field(default_factory=dict)

    @property
    def cautions(self) -> tuple[str, ...]:
        """The trace's, the ambient's and the correction's cautions, each once."""
        own = () if self.correction is None else self.correction.cautions
        return tuple(dict.fromkeys((*self.trace.cautions, *self.ambient.cautions, *own)))

    def as_dict(self) -> dict[str, Any]:
        """Return the content of ``ambient.json``."""
        blocks = {**self.ambient.as_dict(), "run": self.run}
        if self.correction is not None:
            blocks["correction"] = {**self.correction.as_dict(), "listings": self.listings}
        blocks |= {"cautions": self.cautions, "provenance": self.provenance}
        return {k: jsonable(v) for k, v in blocks.items()}


def _fit_summary(estimate: Estimate) -> FitSummary:
    """Return the summary with the covariance, where every number in it is known."""
    names, matrix = estimate.covariance_names, np.asarray(estimate.covariance, float)
    if not names or not np.isfinite(matrix).all():
        return estimate.fit
    rows = tuple(tuple(row) for row in matrix.tolist())
    return replace(estimate.fit, covariance=Covariance(tuple(names), rows))


def result_dict(result: Result, estimate: Estimate) -> dict[str, Any]:
    """One estimate in the form of ``result.json``."""
    cautions = tuple(dict.fromkeys((*result.trace.cautions, *estimate.cautions)))
    blocks = {
        "format": FORMAT,
        "version": VERSION,
        "run": result.run,
        "step": estimate.step,
        "fit": _fit_summary(estimate),
        "direct": estimate.direct,
        "budget": estimate.budget,
        "cautions": list(cautions),
        "provenance": result.provenance,
    }
    return {k: jsonable(v) for k, v in blocks.items() if v is not None}


def jsonable(value: Any) -> Any:
    """Turn records into plain JSON values.

    None, empty text and numbers that are not finite are left out: a block that a test can't give
    is absent, never null.
    """
    if isinstance(value, Quantity):
        return value.as_dict()
    if is_dataclass(value) and not isinstance(value, type):
        return jsonable({f.name: getattr(value, f.name) for f in fields(value)})
    if isinstance(value, Mapping):
        pairs = ((str(k), jsonable(v)) for k, v in value.items())
        return {k: v for k, v in pairs if v is not None and v != ""}
    if isinstance(value, list | tuple):
        return [jsonable(v) for v in value]
    if isinstance(value, bool | np.bool_):
        return bool(value)
    if isinstance(value, int | np.integer):
        return int(value)
    if isinstance(value, float | np.floating):
        return float(value) if np.isfinite(value) else None
    return value
