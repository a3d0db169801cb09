"""A field log to the ambient behind it, as a script or a command does it."""

from __future__ import annotations

import math
import os
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from ..ambient.firmware import Correction, design_correction
from ..ambient.record import Ambient
from ..errors import EstimateError, InputError
from ..progress import SILENT, Watch, step
from ..records import Trace
from ..result import Recovery
from .chain import provenance, run_info
from .checks import check
from .choices import Choices
from .known_sensor import Dynamics, sensor_of
from .run import Run
from .run_file import read_choices
from .stages import complete
from .store import json_text, write_files

__all__ = ["Firmware", "RecoveredRun", "recover"]

_KINDS = ("field", "plunge", "air-step")
_MOST_IMPOSSIBLE = 0.01
_MOST_DEAD = 0.25  # of the log


@dataclass(frozen=True)
class Firmware:
    """What a correction for a sensor's own firmware is wanted for.

    Attributes
    ----------
    interval_s : float
        Between its readings [s].
    noise_gain : float
        Noise of the corrected reading over that of the reading; more is less delay.
    """

    interval_s: float
    noise_gain: float = 2.0


@dataclass(frozen=True, eq=False)
class RecoveredRun(Recovery):
    """A `Recovery` that knows how to write itself."""

    def save(self, folder: str | os.PathLike[str], *, watch: Watch = SILENT) -> Path:
        """Write ``ambient.csv``, ``ambient.json`` and ``report.html`` into a folder.

        Parameters
        ----------
        folder : path
            Made when absent. An older recovery in it is replaced only when all files are complete.
        watch : Watch
            Progress; cancelling leaves the folder as it was.

        Raises
        ------
        InputError
            Where the folder can't be written.
        """
        from ..report.ambient_page import render
        from ..report.samples import ambient_rows

        step(watch, 0.0, 1.0, "writing the report")
        files = {
            "ambient.json": json_text(self.as_dict()),
            "report.html": render(self),
            "ambient.csv": ambient_rows(self.ambient),
        }
        step(watch, 0.5, 1.0, "writing the files")
        return write_files(folder, files)


def recover(
    run: Run | str | os.PathLike[str],
    *,
    causal: bool = False,
    firmware: Firmware | None = None,
    watch: Watch = SILENT,
) -> RecoveredRun:
    """Recover the ambient behind a run's log; what ``tauworkbench recover`` does.

    Parameters
    ----------
    run : Run or path
        From `read_run`, or a run file with a ``[recover]`` table.
    causal : bool
        Use at each time only what was known by then, as a live display must.
    firmware : Firmware, optional
        Design a correction of a few lines for the sensor's own firmware too.
    watch : Watch
        Progress and cancelling.

    Returns
    -------
    RecoveredRun
        ``save(DIR)`` writes it; ``ambient`` holds the curve with its band, the other attributes
        are those of ``ambient.json``.

    Raises
    ------
    InputError
        Where the input can't be used.
    EstimateError
        Where the data can't answer.
    """
    choices = run.choices if isinstance(run, Run) else read_choices(run)
    _check_kind(choices)
    check(choices, ("model",))
    memory = run.memory if isinstance(run, Run) else None
    found = complete(choices, watch, memory, last="trace")
    trace = _windowed(choices, found.need("trace"))
    with _placed(choices):
        dynamics = sensor_of(choices, trace)
        _check_dead_time(choices, dynamics, trace)
        correction, listings = _firmware(choices, dynamics, firmware)
        from ..ambient.recover import recover_ambient

        ambient = recover_ambient(
            trace,
            coverage=choices.model.coverage,
            causal=causal,
            watch=watch,
            **dynamics.arguments,
        )
    more = (*dynamics.cautions, *_law_caution(dynamics, ambient), *_short_log(ambient))
    return RecoveredRun(
        run=run_info(choices, "ambient"),
        trace=trace,
        ambient=replace(ambient, cautions=(*ambient.cautions, *more)),
        provenance=provenance(choices, found.need("log"), found.need("channels")),
        correction=correction,
        listings=listings,
    )


def _check_kind(choices: Choices) -> None:
    """Refuse a test in which it wasn't the ambient that changed."""
    if choices.test.kind not in _KINDS:
        what = f'"{choices.test.kind}" is no kind of test with an ambient to recover'
        how = f"give a log of one of the kinds {', '.join(_KINDS)}"
        raise InputError(choices.where("test", "kind"), what, how)


def _windowed(choices: Choices, trace: Trace) -> Trace:
    """The part of the trace in the window, where there is one; refuse one too full of faults."""
    where = choices.where("log", "signal")
    if choices.test.window_s is not None:
        low, high = choices.test.window_s
        inside = (trace.time_s >= low) & (trace.time_s <= high)
        where = choices.where("test", "window_s")
        trace = trace.but(used=trace.kept & inside)
    else:
        inside = np.ones(trace.time_s.size, bool)
    if trace.impossible is not None and inside.any():
        share = float(np.mean(trace.impossible[inside]))
        if share > _MOST_IMPOSSIBLE:
            raise EstimateError(
                where,
                f"{share:.1%} of the samples are impossible for the circuit or at a rail, and "
                f"{_MOST_IMPOSSIBLE:.0%} are allowed",
                "check the circuit's values, or give a window_s without them",
                {"impossible": share},
            )
    return trace


def _check_dead_time(choices: Choices, dynamics: Dynamics, trace: Trace) -> None:
    """Refuse a sensor whose reading shows nothing yet of most of the log's ambient."""
    dead = dynamics.dead_time_s
    time = trace.time_s[trace.kept]
    span = float(time[-1] - time[0]) if time.size else 0.0
    if time.size and dead > _MOST_DEAD * span:
        what = f"{dead:.4g} s is more than {_MOST_DEAD:.0%} of the log's {span:.4g} s"
        raise InputError(
            choices.where("recover", "dead_time_s"), what, "correct it, or give a longer log"
        )


def _firmware(
    choices: Choices, dynamics: Dynamics, wanted: Firmware | None
) -> tuple[Correction | None, dict[str, str]]:
    """Design the correction, and write it out in two languages."""
    if wanted is None:
        return None, {}
    if dynamics.fixed is None:
        what = "with it the time constants change, and a correction for firmware has fixed ones"
        raise InputError(
            choices.where("recover", "speed"), what, "give time_constants_s of one speed"
        )
    from ..ambient.listings import c_listing, python_listing

    made = design_correction(
        dynamics.fixed.transfer, wanted.interval_s, noise_gain=wanted.noise_gain
    )
    return made, {"python": python_listing(made), "c": c_listing(made)}


def _law_caution(dynamics: Dynamics, ambient: Ambient) -> Iterator[str]:
    """Say what the speed law's own uncertainty does, which the band doesn't hold."""
    share = dynamics.law_relative_u
    moved = max(ambient.off_by_20_percent_k.values(), default=0.0)
    if share > 0 and math.isfinite(moved):
        yield (
            f"the speed law's lag has a standard uncertainty of up to {share:.1%}, which moves the "
            f"ambient by about {moved * share / 0.2:.2g} K rms and is not in the band; more runs "
            "in the campaign narrow it"
        )


def _short_log(ambient: Ambient) -> Iterator[str]:
    """Say that the log is short against the sensor."""
    lag, span = ambient.sensor["lag_s"], float(ambient.time_s[-1] - ambient.time_s[0])
    if lag > span:
        yield (
            f"the sensor's lag of {lag:.4g} s is longer than the log's {span:.4g} s: what the "
            "sensor held when the log began is in every value; log for several times the lag"
        )


@contextmanager
def _placed(choices: Choices) -> Iterator[None]:
    """Put an error that names an argument at its place in the run file."""
    places = {
        "trace": ("log", "signal"),
        "result": ("recover", "result"),
        "time_constants_s": ("recover", "time_constants_s"),
        "zero_s": ("recover", "zero_s"),
        "dead_time_s": ("recover", "dead_time_s"),
        "coverage": ("model", "coverage"),
    }
    try:
        yield
    except InputError as error:
        place = places.get(error.where.partition("[")[0])
        if place is None:
            raise
        where = choices.where(*place)
        if isinstance(error, EstimateError):
            raise EstimateError(where, error.what, error.how, error.found) from None
        raise InputError(where, error.what, error.how) from None
