"""What a run file and its log were understood to say: for ``check``, without any fit."""

from __future__ import annotations

import os
from dataclasses import fields, is_dataclass
from typing import Any

import numpy as np

from ..logs import Channels, Log
from ..progress import SILENT, Watch
from ..records import Step, Trace
from ..result import jsonable
from .choices import Choices
from .memory import Memory
from .run_file import read_choices
from .stages import Resolved, complete

__all__ = ["overview"]

_NO_UNIT = {"number": "not stated", "stamp": "time stamps", "text": "text"}


def overview(path: str | os.PathLike[str], watch: Watch = SILENT) -> dict[str, Any]:
    """Read everything that a run file names and say what was understood; fit nothing.

    Returns
    -------
    dict
        Plain JSON values: the log as it was read, its channels and time base, circuit and law as
        given, the temperatures that they come to, the steps bracketed, cautions.

    Raises
    ------
    InputError
        Where anything up to the temperature can't be used. A log without a step is no error here;
        the reason is a caution.
    """
    choices = read_choices(path)
    found = complete(choices, watch, Memory(), last="steps")
    trace = found.need("trace")
    out: dict[str, Any] = {
        "run": choices.name,
        "log": _log(found.need("log"), choices),
        "time_base": _time_base(found.need("channels")),
        **{t: jsonable(v) for t, v in choices.to_dict().items() if t not in ("log",)},
        "temperature": _temperature(trace),
    }
    cautions = [*trace.cautions]
    if choices.test.kind != "field":
        out["steps"], more = _steps(found)
        cautions += more
    out["cautions"] = list(dict.fromkeys(cautions))
    return out


def _log(log: Log, choices: Choices) -> dict[str, Any]:
    return {
        "file": choices.log.file,
        "sha256": log.sha256,
        "rows": log.rows,
        "read_as": _record(log.reading),
        "time": choices.log.time,
        "signal": choices.log.signal,
        "columns": [
            {"number": c.number, "name": c.short_name, "unit": c.unit or _NO_UNIT[c.kind]}
            for c in log.columns
        ],
    }


def _time_base(channels: Channels) -> dict[str, Any]:
    time = channels.time_s
    gaps = np.diff(time)
    return {
        "origin": channels.time_origin,
        "samples": int(time.size),
        "first_s": float(time[0]),
        "last_s": float(time[-1]),
        "median_interval_s": float(np.median(gaps)) if gaps.size else 0.0,
        "longest_interval_s": float(gaps.max()) if gaps.size else 0.0,
        "units": dict(channels.units),
    }


def _temperature(trace: Trace) -> dict[str, Any]:
    kept = trace.temperature_c[trace.kept]
    out: dict[str, Any] = {"samples_used": int(kept.size), "samples_set_aside": 0}
    out["samples_set_aside"] = int(trace.temperature_c.size - kept.size)
    if kept.size:
        out |= {"lowest_c": float(kept.min()), "highest_c": float(kept.max())}
    for name in ("sigma_k", "quantum_k", "power_w"):
        values = getattr(trace, name)
        if values is not None and kept.size:
            out[f"median_{name}"] = float(np.median(values[trace.kept]))
    return jsonable(out)  # type: ignore[no-any-return]


def _steps(found: Resolved) -> tuple[list[dict[str, Any]], list[str]]:
    error = found.errors.get("onset") or found.errors.get("steps")
    if error is not None:
        return [], [f"no step to fit: {error.what}; {error.how}"]
    return [_step(s) for s in found.need("steps")], []


def _step(step: Step) -> dict[str, Any]:
    onset = "before the window" if step.before else [*step.bracket_s]
    return {
        "number": step.number,
        "window_s": [*step.window_s],
        "onset_between_s": onset,
        "from_c": step.start_c,
        "to_c": step.final_c,
    }


def _record(reading: Any) -> dict[str, Any]:
    if not is_dataclass(reading):
        return {}
    values = {f.name: getattr(reading, f.name) for f in fields(reading)}
    return {k: jsonable(v) for k, v in values.items() if v is not None}
