"""Fitting runs on a Dask cluster that is there already; the files must be where its workers look.

The extra ``cluster`` brings the library; nothing else here knows it.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from importlib import import_module
from pathlib import Path
from typing import Any

from ..errors import InputError
from .one_run import Outcome, fit_one

__all__ = ["fit_batch", "fit_on_cluster"]

_BATCHES_PER_WORKER = 4  # a task of one log costs more than the fit; four leave room to even out
_MOST_IN_BATCH = 100
_CONNECT_S = 10


def fit_batch(paths: list[str], folder: str | None, refit: bool) -> list[Outcome]:
    """Fit several runs, one after the other; what a worker does."""
    return [fit_one(path, folder, refit=refit) for path in paths]


def fit_on_cluster(
    address: str, paths: Sequence[Path], cache_folder: Path | None, *, refit: bool = False
) -> Iterator[tuple[int, Outcome | None]]:
    """Fit run files on a cluster; yields as `workers.fit_each` does.

    Parameters
    ----------
    address : str
        Of the scheduler, such as ``tcp://host:8786``.

    Raises
    ------
    InputError
        Where the library isn't installed, or no scheduler or worker answers there.
    """
    client = _connected(address)
    folder = None if cache_folder is None else str(cache_folder.absolute())
    try:
        count = len(client.nthreads())
        if not count:
            raise InputError(address, "the cluster has no worker", "start a worker there")
        size = max(min(len(paths) // (count * _BATCHES_PER_WORKER), _MOST_IN_BATCH), 1)
        yield from _gathered(client, [str(p.absolute()) for p in paths], size, (folder, refit))
    finally:
        client.close()


def _gathered(
    client: Any, paths: list[str], size: int, how: tuple[str | None, bool]
) -> Iterator[tuple[int, Outcome | None]]:
    distributed: Any = import_module("distributed")
    # not pure: a result depends on files that the cluster can't see change
    starts = range(0, len(paths), size)
    tasks = [client.submit(fit_batch, paths[i : i + size], *how, pure=False) for i in starts]
    first = {task.key: i for task, i in zip(tasks, starts, strict=True)}
    for task in distributed.as_completed(tasks):
        start = first[task.key]
        batch = paths[start : start + size]
        for j, outcome in enumerate(_outcomes(task, batch)):
            yield start + j, outcome


def _outcomes(task: Any, batch: list[str]) -> list[Outcome]:
    """What a task answered; one that was lost with its worker costs only its own runs."""
    error = task.exception()
    if error is None:
        return list(task.result())
    what = f"its task on the cluster ended with {type(error).__name__}"
    how = "look at the worker's log, or fit it alone with `tauworkbench fit`"
    return [{"error": str(InputError(path, what, how))} for path in batch]


def _connected(address: str) -> Any:
    try:
        distributed: Any = import_module("distributed")
    except ImportError:
        how = 'install it: pip install "tauworkbench[cluster]"'
        raise InputError("--cluster", "the library for clusters isn't installed", how) from None
    try:
        return distributed.Client(address, timeout=_CONNECT_S)
    except (OSError, ValueError) as error:
        what = f"no scheduler answers there ({type(error).__name__})"
        how = "give the address that the scheduler prints, such as tcp://host:8786"
        raise InputError(address, what, how) from None
