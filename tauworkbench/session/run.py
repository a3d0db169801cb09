"""One run end to end, as a script or a command does it."""

from __future__ import annotations

import os
from dataclasses import dataclass, field

from ..logs import Log
from ..progress import SILENT, Watch
from ..records import Trace
from .checks import check_fitted
from .choices import Choices
from .memory import Memory
from .run_file import read_choices
from .saved import RunResult
from .stages import complete

__all__ = ["Run", "fit", "read_run", "to_trace"]


@dataclass(frozen=True, eq=False)
class Run:
    """A run file's choices and its log; nothing is computed yet.

    Attributes
    ----------
    choices : Choices
        What the run file says.
    log : Log
        The file's columns as they were read.
    memory : Memory
        What `to_trace` and `fit` have found, so that neither does the other's work again.
    """

    choices: Choices
    log: Log
    memory: Memory = field(default_factory=Memory, repr=False)


def read_run(path: str | os.PathLike[str], *, watch: Watch = SILENT) -> Run:
    """Read a run file and its log.

    Parameters
    ----------
    path : path
        The run file (TOML).
    watch : Watch
        Progress and cancelling.

    Raises
    ------
    InputError
        Where either can't be used.
    """
    return _read(read_choices(path), watch)


def to_trace(run: Run, *, watch: Watch = SILENT) -> Trace:
    """Return the sensor's internal temperature: circuit and law applied to the log.

    Raises
    ------
    InputError
        Where a column, a unit, the circuit or the law can't be used.
    """
    trace: Trace = complete(run.choices, watch, run.memory, last="trace").need("trace")
    return trace


def fit(run: Run | str | os.PathLike[str], *, watch: Watch = SILENT) -> RunResult:
    """Fit a run's step or steps; what ``tauworkbench fit`` does.

    Parameters
    ----------
    run : Run or path
        From `read_run`, or a run file.
    watch : Watch
        Progress and cancelling.

    Returns
    -------
    RunResult
        ``save(DIR)`` writes it; its attributes are those of ``result.json``.

    Raises
    ------
    InputError
        Where the input can't be used.
    EstimateError
        Where the data can't answer.
    """
    choices = run.choices if isinstance(run, Run) else read_choices(run)
    check_fitted(choices)
    if not isinstance(run, Run):
        run = _read(choices, watch)
    result: RunResult = complete(run.choices, watch, run.memory).need("result")
    return result


def _read(choices: Choices, watch: Watch) -> Run:
    memory = Memory()
    return Run(choices, complete(choices, watch, memory, last="log").need("log"), memory)
