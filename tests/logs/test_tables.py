"""Excel and Parquet: the same log gives the same channels whatever file it is in."""

from __future__ import annotations

import contextlib
from datetime import datetime, timedelta

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.logs import read_log, to_channels

N = 50
START = datetime(2026, 3, 2, 6, 0, 0)
STAMPS = [START + timedelta(seconds=0.5 * i) for i in range(N)]
VOLTS = 1.5 + np.arange(N) / 256
ROLES = {"time": "t", "signal": "v"}


def workbook(path, rows, more=()):
    from openpyxl import Workbook

    book = Workbook()
    sheet = book.active
    sheet.title = "cover"
    sheet.append(["made by hand"])
    for title, content in (("log", rows), *more):
        sheet = book.create_sheet(title)
        for row in content:
            sheet.append(row)
    book.save(path)
    return path


def body(times):
    return [[t, float(v)] for t, v in zip(times, VOLTS, strict=True)]


def holds(found):
    np.testing.assert_allclose(found.time_s, np.arange(N) * 0.5, atol=1e-6)
    np.testing.assert_array_equal(found.values["signal"], VOLTS)


HEADS = {
    "plain": [["t", "v [V]"]],
    "preamble and units row": [["rig 2"], ["rate", 2], [], ["t", "v"], [None, "V"]],
}


@pytest.mark.parametrize("head", HEADS)
def test_workbook_with_stamps(tmp_path, head):
    path = workbook(tmp_path / "log.xlsx", HEADS[head] + body(STAMPS))
    log = read_log(path)
    assert log.kind == "Excel"
    assert log.rows == N
    assert any('"log", was read' in c for c in log.cautions)
    holds(to_channels(log, ROLES, {}))
    assert to_channels(log, ROLES, {}).time_origin.startswith("2026-03-02T06:00:00")


def test_workbook_with_seconds_under_another_name(tmp_path):
    rows = [["t [s]", "v [V]"], *body([0.5 * i for i in range(N)])]
    path = workbook(tmp_path / "log.xlsx", rows).rename(tmp_path / "log.csv")
    holds(to_channels(read_log(path), ROLES, {}))


def test_workbook_with_holes_and_texts(tmp_path):
    rows = [["t", "v [V]", "note"], *([*r, "open, door\tx"] for r in body(STAMPS))]
    rows[4][1] = None
    found = to_channels(read_log(workbook(tmp_path / "log.xlsx", rows)), ROLES, {})
    assert found.time_s.size == N - 1
    assert found.repairs[0].count == 1


def test_workbook_without_columns_is_refused(tmp_path):
    with pytest.raises(InputError, match="no sheet with two columns"):
        read_log(workbook(tmp_path / "log.xlsx", [["only"], ["texts"]]))


def parquet(path, **columns):
    import pyarrow as pa
    from pyarrow import parquet as pq

    pq.write_table(pa.table(columns), path)
    return path


def test_parquet_with_stamps(tmp_path):
    path = parquet(tmp_path / "log.parquet", **{"t": STAMPS, "v [V]": VOLTS})
    log = read_log(path)
    assert (log.kind, log.rows, log.columns[0].kind) == ("Parquet", N, "stamp")
    holds(to_channels(log, ROLES, {}))


def test_parquet_with_zoned_stamps_and_categories(tmp_path):
    import pyarrow as pa

    stamps = pa.array(STAMPS, pa.timestamp("ms", "UTC"))
    texts = pa.array([f"{v:.8f}" for v in VOLTS]).dictionary_encode()
    path = parquet(tmp_path / "log.parquet", **{"t": stamps, "v [V]": texts})
    found = to_channels(read_log(path), ROLES, {})
    holds(found)
    assert found.time_origin.endswith("Z")


def test_parquet_with_integers_and_nulls(tmp_path):
    counts = [None, *range(100, 100 + N - 1)]
    path = parquet(
        tmp_path / "log.parquet", **{"t [ms]": list(range(0, 500 * N, 500)), "v": counts}
    )
    found = to_channels(read_log(path), ROLES, {"v": "counts"})
    np.testing.assert_array_equal(found.values["signal"], np.arange(100, 100 + N - 1))
    assert found.time_s[0] == 0.5


def test_parquet_with_durations(tmp_path):
    import pyarrow as pa

    time = pa.array([timedelta(seconds=0.5 * i) for i in range(N)], pa.duration("us"))
    log = read_log(parquet(tmp_path / "log.parquet", **{"t": time, "v [V]": VOLTS}))
    holds(to_channels(log, ROLES, {"t": "s"}))


@pytest.mark.parametrize("cut", [4, 40, 300])
def test_cut_parquet_is_refused(tmp_path, cut):
    path = parquet(tmp_path / "log.parquet", **{"t": STAMPS, "v [V]": VOLTS})
    path.write_bytes(path.read_bytes()[:-cut])
    with pytest.raises(InputError, match="Parquet"):
        read_log(path)


@pytest.mark.parametrize("kind", ["xlsx", "parquet"])
def test_damaged_bytes_are_read_or_refused(tmp_path, kind):
    path = tmp_path / f"log.{kind}"
    if kind == "xlsx":
        workbook(path, [["t [s]", "v [V]"], *body([0.5 * i for i in range(N)])])
    else:
        parquet(path, **{"t [s]": np.arange(N) * 0.5, "v [V]": VOLTS})
    whole = path.read_bytes()
    generator = np.random.default_rng(7)
    for _ in range(60):
        data = bytearray(whole)
        for at in generator.integers(4, len(data), 3):
            data[at] = generator.integers(256)
        path.write_bytes(bytes(data))
        with contextlib.suppress(InputError):  # nothing else may come out
            to_channels(read_log(path), ROLES, {})
