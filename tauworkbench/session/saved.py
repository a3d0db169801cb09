"""A run's result that can be saved, and a saved one read back."""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..progress import SILENT, Watch, step
from ..records import (
    Budget,
    BudgetLine,
    Candidate,
    Combined,
    Covariance,
    Direct,
    FitSummary,
    NoiseSummary,
    StepSummary,
)
from ..result import FORMAT, FORMAT_MANY, VERSION, Provenance, Result, RunInfo
from ..uncertainty import Quantity
from .store import json_text, write_files
from .toml_file import is_plain_file

__all__ = ["RunResult", "SavedResult", "load_json", "read_results", "results_from_dict"]

_MOST_BYTES = 50_000_000
_HOW = "give the result.json that `tauworkbench fit` wrote"


@dataclass(frozen=True, eq=False)
class RunResult(Result):
    """A `Result` that knows how to write itself."""

    def save(self, folder: str | os.PathLike[str], *, watch: Watch = SILENT) -> Path:
        """Write ``result.json``, ``trace.csv`` and ``report.html`` into a folder.

        Parameters
        ----------
        folder : path
            Made when absent. An older result in it is replaced only when all files are complete.
        watch : Watch
            Progress; cancelling leaves the folder as it was.

        Raises
        ------
        InputError
            Where the folder can't be written.
        """
        from ..report.document import render
        from ..report.samples import trace_rows

        step(watch, 0.0, 1.0, "writing the report")
        files = {
            "result.json": json_text(self.as_dict()),
            "report.html": render(self),
            "trace.csv": trace_rows(self),
        }
        step(watch, 0.5, 1.0, "writing the files")
        return write_files(folder, files)


@dataclass(frozen=True)
class SavedResult:
    """What ``result.json`` holds of one step: everything but the curve."""

    run: RunInfo
    step: StepSummary
    fit: FitSummary
    provenance: Provenance
    direct: Direct | None = None
    budget: Budget | None = None
    dissipation: Mapping[str, Quantity] = field(default_factory=dict)
    cautions: tuple[str, ...] = ()


def read_results(path: str | os.PathLike[str]) -> tuple[SavedResult, ...]:
    """Read ``result.json`` back, one record per step.

    Raises
    ------
    InputError
        Where the file can't be read, or isn't a result of this package.
    """
    where = str(path)
    return results_from_dict(load_json(Path(path), _HOW), where)


def results_from_dict(data: Any, where: str) -> tuple[SavedResult, ...]:
    """Return the records in the content of a ``result.json``, one per step.

    Raises
    ------
    InputError
        At ``where``, when it isn't a result of this package.
    """
    how = _HOW
    if not isinstance(data, dict) or data.get("format") not in (FORMAT, FORMAT_MANY):
        raise InputError(where, "is not a result of tauworkbench", how)
    if data.get("version") != VERSION:
        what = f"is of version {str(data.get('version'))[:20]}, and this program reads {VERSION}"
        raise InputError(where, what, "fit the run again")
    try:
        each = data["results"] if data["format"] == FORMAT_MANY else [data]
        return tuple(_saved(one) for one in each)
    except (KeyError, TypeError, ValueError, AttributeError, RecursionError) as e:
        what = f"is not complete: {type(e).__name__} at {str(e)[:60]}"
        raise InputError(where, what, how) from None


def load_json(path: Path, how: str) -> Any:
    """Return a JSON file's content; ``how`` says which file is wanted.

    Raises
    ------
    InputError
        Where there is none, it is too large, or isn't JSON with finite numbers.
    """
    where = str(path)
    if not is_plain_file(path):
        raise InputError(where, "there is no such file", how)
    try:
        if path.stat().st_size > _MOST_BYTES:
            raise InputError(where, f"holds more than {_MOST_BYTES} bytes", how)
        return json.loads(path.read_text("utf-8"), parse_constant=_refuse)
    except OSError as e:
        raise InputError(where, f"can't be read: {e.strerror}", "check its permissions") from None
    except (ValueError, RecursionError) as e:
        if isinstance(e, InputError):
            raise
        raise InputError(where, f"isn't JSON: {str(e)[:80]}", how) from None


def _refuse(word: str) -> float:
    raise ValueError(f"{word} is no number")


def _saved(data: Mapping[str, Any]) -> SavedResult:
    step, fit = dict(data["step"]), dict(data["fit"])
    for name in ("onset_s", "start_c", "final_c"):
        if name in step:
            step[name] = Quantity.from_dict(step[name])
    step.setdefault("final_c", None)
    step["window_s"] = tuple(map(float, step["window_s"]))
    fit["time_constants_s"] = tuple(Quantity.from_dict(q) for q in fit["time_constants_s"])
    for name in ("parameters", "response_time_s"):
        fit[name] = _quantities(fit.get(name, {}))
    fit["lag_s"] = Quantity.from_dict(fit["lag_s"])
    fit["noise"] = NoiseSummary(**fit["noise"])
    fit["candidates"] = tuple(Candidate(**c) for c in fit["candidates"])
    if "covariance" in fit:
        fit["covariance"] = _covariance(fit["covariance"])
    direct, budget = data.get("direct"), data.get("budget")
    return SavedResult(
        run=RunInfo(**data["run"]),
        step=StepSummary(**step),
        fit=FitSummary(**fit),
        provenance=Provenance(**data["provenance"]),
        direct=Direct(_quantities(direct["response_time_s"])) if direct else None,
        budget=_budget(budget) if budget else None,
        dissipation=_quantities(data.get("dissipation", {})),
        cautions=tuple(map(str, data.get("cautions", ()))),
    )


def _covariance(data: Mapping[str, Any]) -> Covariance:
    names = tuple(map(str, data["names"]))
    matrix = tuple(tuple(map(float, row)) for row in data["matrix"])
    if [len(row) for row in matrix] != [len(names)] * len(names):
        raise ValueError("covariance, which isn't square")
    return Covariance(names, matrix)


def _quantities(data: Mapping[str, Any]) -> dict[str, Quantity]:
    return {str(k): Quantity.from_dict(v) for k, v in data.items()}


def _budget(data: Mapping[str, Any]) -> Budget:
    lines = tuple(BudgetLine(**line) for line in data["lines"])
    return Budget(data["on"], lines, Combined(**data["combined"]))
