"""Fitting many runs on every core.

A few quick runs are fitted where they are asked for. When more work is left than starting
processes costs, the rest goes to one process per core, each with one thread: small kernels crawl
under threaded linear algebra. The processes are plain programs that answer lines, so that a
caller's script needs no ``if __name__ == "__main__"``, and one that dies costs only its own run.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from contextlib import suppress
from pathlib import Path
from queue import SimpleQueue

from ..errors import InputError
from .one_run import Outcome, fit_one

__all__ = ["cores", "fit_each"]

_WORTH_S = 6.0  # starting a process, with its imports, costs two or three seconds
_ONE_THREAD = dict.fromkeys(
    ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "ARROW_NUM_THREADS"), "1"
)


def cores() -> int:
    """Return how many cores this process may use; one where it can't start others."""
    if not sys.executable:
        return 1
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def fit_each(
    paths: Sequence[Path], cache_folder: Path | None, *, refit: bool = False, processes: int = 0
) -> Iterator[tuple[int, Outcome | None]]:
    """Fit run files and yield each outcome as it comes, with its place among them.

    Parameters
    ----------
    paths : sequence of Path
    cache_folder : Path or None
        Where results are kept.
    refit : bool
        Whether to fit also those whose result is kept.
    processes : int
        At most so many; 0 for one per core.

    Yields
    ------
    tuple of int and dict or None
        None now and then while nothing has come, so that the caller can look round.
    """
    folder = None if cache_folder is None else str(cache_folder)
    most = min(processes or cores(), len(paths))
    spent = 0.0
    fitted = 0
    for i, path in enumerate(paths):
        left = len(paths) - i
        if most > 1 and fitted and left > 1 and left * spent / fitted > _WORTH_S:
            yield from _in_processes(paths, i, folder, refit, most)
            return
        start = time.perf_counter()
        outcome = fit_one(str(path), folder, refit=refit)
        if not outcome.get("kept") and i:  # the first one also pays for the imports
            spent += time.perf_counter() - start
            fitted += 1
        yield i, outcome


def _in_processes(
    paths: Sequence[Path], first: int, folder: str | None, refit: bool, most: int
) -> Iterator[tuple[int, Outcome | None]]:
    idle: SimpleQueue[_Worker] = SimpleQueue()
    workers = [_Worker() for _ in range(min(most, len(paths) - first))]
    for worker in workers:
        idle.put(worker)

    def fit(i: int) -> tuple[int, Outcome]:
        worker = idle.get()
        try:
            return i, worker.fit(str(paths[i]), folder, refit)
        finally:
            idle.put(worker)

    pool = ThreadPoolExecutor(len(workers))
    try:
        waiting: set[Future[tuple[int, Outcome]]] = {
            pool.submit(fit, i) for i in range(first, len(paths))
        }
        while waiting:
            done, waiting = wait(waiting, timeout=0.2, return_when=FIRST_COMPLETED)
            if not done:
                yield first, None
            for future in done:
                yield future.result()
    finally:
        pool.shutdown(wait=False, cancel_futures=True)
        for worker in workers:
            worker.stop()


class _Worker:
    """A process that fits one run after the other; a new one is started when it has died."""

    def __init__(self) -> None:
        self._process: subprocess.Popen[str] | None = None
        self._stopped = False

    def fit(self, path: str, folder: str | None, refit: bool) -> Outcome:
        try:
            process = self._started()
            assert process.stdin is not None and process.stdout is not None  # noqa: S101, PT018
            process.stdin.write(json.dumps([path, folder, refit]) + "\n")
            process.stdin.flush()
            return dict(json.loads(process.stdout.readline()))
        except (OSError, ValueError):
            self._end()
            what = "the process that fitted it ended without an answer"
            how = "fit it alone with `tauworkbench fit`; if the memory isn't enough, cut the log"
            return {"error": str(InputError(path, what, how))}

    def stop(self) -> None:
        self._stopped = True
        self._end()

    def _started(self) -> subprocess.Popen[str]:
        if self._stopped:
            raise OSError("stopped")
        if self._process is None or self._process.poll() is not None:
            package = Path(__file__).resolve().parents[2]
            found = [str(package), os.environ.get("PYTHONPATH", "")]
            paths = os.pathsep.join(filter(None, found))
            self._process = subprocess.Popen(
                [sys.executable, "-m", "tauworkbench.session.one_run"],
                stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL,
                text=True, encoding="utf-8",
                env={**os.environ, **_ONE_THREAD, "PYTHONPATH": paths},
            )  # fmt: skip
        return self._process

    def _end(self) -> None:
        process, self._process = self._process, None
        if process is None:
            return
        process.kill()
        for stream in (process.stdin, process.stdout):
            with suppress(OSError):
                if stream is not None:
                    stream.close()
        process.wait()
