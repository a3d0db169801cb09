"""The table of stages, and what each does: ``log -> channels -> trace -> steps -> estimates``.

Each function reads only its own slice of the choices and hands on a frozen record. Log, channels
and trace are in `measuring`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

from ..progress import Watch
from ..records import Step
from ..result import QUANTITY, Provenance, RunInfo
from ..units import convert
from . import measuring
from .checks import check, check_fitted
from .choices import Choices
from .keys import RUN_TABLES
from .marker import Onset, marker_onset
from .memory import Stage
from .saved import RunResult

__all__ = ["STAGES", "provenance", "run_info"]

_LARGE_BYTES = 20_000_000  # a log above this takes a second or more to read
_CONDITIONS = (
    "immersion_mm",
    "medium_c",
    "mounting",
    "pressure_pa",
    "operator",
    "note",
    "ambient_c",
    "rated_power_mw",
)


def _onset(choices: Choices, inputs: Mapping[str, Any], _watch: Watch) -> Onset:
    test = choices.test
    check(choices, ("onset",))
    if test.onset is not None:
        found = inputs["channels"]
        marker, unit, written = (x["marker"] for x in (found.values, found.units, found.written))
        if unit != written:  # the level is in the unit that the column was written in
            marker = convert(marker, unit, written)
        return marker_onset(found.time_s, marker, test.onset, test.window_s)
    if test.onset_s is None:
        return Onset()
    return Onset(test.onset_s, 0.0, "before" if test.onset_s == "before" else "given")


def _steps(choices: Choices, inputs: Mapping[str, Any], _watch: Watch) -> tuple[Step, ...]:
    from ..steps.find import find_steps

    known, window = inputs["onset"].time_s, choices.test.window_s
    return find_steps(inputs["trace"], onset=known, window_s=window)


def _estimates(choices: Choices, inputs: Mapping[str, Any], watch: Watch) -> tuple[Any, ...]:
    check(choices, ("test", "model"))
    test, model, onset = choices.test, choices.model, inputs["onset"]
    check_fitted(choices)
    from ..estimate.fit import FitSettings, fit_steps

    settings = FitSettings(
        order=model.order,
        zero=model.zero,
        dead_time=model.dead_time,
        drift=model.drift,
        input=model.input,
        noise=model.noise,
        coverage=model.coverage,
        onset_s=onset.time_s,
        onset_u_s=onset.standard_uncertainty_s,
        window_s=test.window_s,
        steps=test.steps,
        transfer_s=test.transfer_s or 0.0,
    )
    estimates = fit_steps(inputs["trace"], settings, watch, inputs["steps"])
    if onset.kind != "marker":
        return estimates
    return tuple(
        replace(
            e,
            step=replace(e.step, onset="marker"),
            cautions=tuple(dict.fromkeys((*e.cautions, *onset.cautions))),
        )
        for e in estimates
    )


def run_info(choices: Choices, quantity: str) -> RunInfo:
    """Return what was tested, with the conditions that the run file states."""
    test = choices.test
    return RunInfo(
        name=choices.name,
        test=test.kind or "",
        quantity=quantity,
        sensor=test.sensor,
        medium=test.medium,
        speed_m_s=test.speed_m_s,
        conditions={k: v for k in _CONDITIONS if (v := getattr(test, k)) is not None},
    )


def provenance(choices: Choices, log: Any, channels: Any) -> Provenance:
    """Return what reproduces a result of this log."""
    return Provenance(
        log_sha256=log.sha256,
        time_origin=channels.time_origin,
        settings=choices.to_dict(),
        log_file=choices.log.file or "",
    )


def _result(choices: Choices, inputs: Mapping[str, Any], _watch: Watch) -> RunResult:
    return RunResult(
        run=run_info(choices, QUANTITY[choices.test.kind or ""]),
        trace=inputs["trace"],
        estimates=inputs["estimates"],
        provenance=provenance(choices, inputs["log"], inputs["channels"]),
    )


def _log_file(choices: Choices) -> tuple[Path, ...]:
    return () if choices.log.file is None else (choices.path(choices.log.file),)


def _is_large(choices: Choices) -> bool:
    try:
        return any(path.stat().st_size > _LARGE_BYTES for path in _log_file(choices))
    except (OSError, ValueError):
        return False


_ELECTRICAL = ("circuit", "law", "reference")
_ONSET = ("test.onset_s", "test.onset", "test.window_s")
STAGES: tuple[Stage, ...] = (
    Stage(
        "log", (), ("log.file", "log.read"), measuring.log,
        files=_log_file, costly=_is_large,
    ),
    Stage(
        "channels", ("log",),
        ("log.time", "log.signal", "log.units", "circuit.supply", "circuit.current",
         "circuit.counts", "circuit.kind", "reference.column", "reference.unit", "test.onset",
         "recover.speed", "log.object"),
        measuring.channels,
        files=_log_file,
        costly=_is_large,
    ),
    Stage("law", (), ("law", "circuit.kind"), measuring.law, files=measuring.law_files),
    Stage(
        "trace", ("channels", "law"),
        (*_ELECTRICAL, "log.noise_u", "log.averaging_s", "log.filter_s",
         "test.dissipation", "test.dissipation_mw_per_k"),
        measuring.trace,
        files=measuring.trace_files,
    ),
    Stage("onset", ("channels",), _ONSET, _onset),
    Stage("steps", ("trace", "onset"), _ONSET, _steps),
    Stage(
        "estimates", ("trace", "onset", "steps"), ("test.kind", "test.window_s", "test.steps",
         "test.transfer_s", "test.onset_s", "test.onset", "model", "reference.column"),
        _estimates,
        costly=lambda _: True,
    ),
    Stage(
        "result", ("log", "channels", "trace", "estimates"),
        ("name", *RUN_TABLES),
        _result,
    ),
)  # fmt: skip
