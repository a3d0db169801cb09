"""Long logs: progress is told, work can be stopped, and memory stays with the columns in use."""

from __future__ import annotations

import contextlib
import subprocess
import sys
import time

import numpy as np
import pytest

from tauworkbench.errors import Cancelled, InputError
from tauworkbench.logs import read_log, text, to_channels


class Watcher:
    def __init__(self, stop_after=10**9):
        self.told, self._stop_after = [], stop_after

    def report(self, done, total, words):
        self.told.append((done, total, words))

    def cancelled(self):
        return len(self.told) > self._stop_after


def write(path, rows):
    with path.open("w") as file:
        file.write("t [s],v [V],x [V],y [V]\n")
        for a in range(0, rows, 100_000):
            i = np.arange(a, min(a + 100_000, rows))
            lines = zip(0.01 * i, 1 + 0.1 * np.sin(1e-5 * i), strict=True)
            file.writelines(f"{t:.2f},{v:.4f},{v:.4f},3.3\n" for t, v in lines)
    return path


def test_pieces_join_without_a_seam(tmp_path, monkeypatch):
    path = write(tmp_path / "log.csv", 3000)
    roles = {"time": "t", "signal": "v"}
    whole = to_channels(read_log(path), roles, {})
    for size in (64, 1000, 4096):
        monkeypatch.setattr(text, "PIECE_BYTES", size)
        found = to_channels(read_log(path), roles, {})
        np.testing.assert_array_equal(found.time_s, whole.time_s)
        np.testing.assert_array_equal(found.values["signal"], whole.values["signal"])
        np.testing.assert_array_equal(found.rows, np.arange(2, 3002))


def test_progress_is_told_and_the_work_stops(tmp_path, monkeypatch):
    monkeypatch.setattr(text, "PIECE_BYTES", 10_000)
    path = write(tmp_path / "log.csv", 5000)
    watch = Watcher()
    log = read_log(path, watch=watch)
    to_channels(log, {"time": "t", "signal": "v"}, {}, watch=watch)
    assert {w for _, _, w in watch.told} == {"looking through the log", "reading the log"}
    assert all(0 < done <= total for done, total, _ in watch.told)
    assert len(watch.told) > 10
    with pytest.raises(Cancelled):
        to_channels(log, {"time": "t", "signal": "v"}, {}, watch=Watcher(3))


def test_hostile_lines_take_no_time(tmp_path):
    path = tmp_path / "log.csv"
    for line in ("9" * 120_000 + ",x", "(" * 120_000 + ",1", " " * 120_000 + "1,2", '"' * 119_999):
        path.write_text("t [s],v [V]\n" + line + "\n1,2\n")
        start = time.process_time()
        with contextlib.suppress(InputError):
            to_channels(read_log(path), {"time": "t", "signal": "v"}, {})
        assert time.process_time() - start < 5.0


MEASURE = """
import resource, sys
import pyarrow.compute, pyarrow.csv
from tauworkbench.logs import read_log, to_channels

def peak():
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024

before = peak()
found = to_channels(read_log(sys.argv[1]), {"time": "t", "signal": "v"}, {})
print((peak() - before) / (2 * 8 * found.time_s.size))
"""


@pytest.mark.slow
def test_ten_million_rows_need_at_most_three_times_the_columns_used(tmp_path):
    pytest.importorskip("resource", reason="the system doesn't tell a process's memory")
    path = write(tmp_path / "log.csv", 10_000_000)
    command = [sys.executable, "-c", MEASURE, str(path)]
    done = subprocess.run(command, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    assert float(done.stdout) < 3.0
