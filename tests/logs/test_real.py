"""Logs that other people's loggers wrote, read unedited; skipped where they aren't at hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauworkbench.logs import read_log, to_channels

REAL = Path(__file__).resolve().parents[3] / "shared" / "real"
pytestmark = pytest.mark.skipif(not REAL.is_dir(), reason="the real logs are not at hand")


@pytest.mark.parametrize(
    ("name", "rows", "last_s", "first_c"),
    [("with_fan", 876, 931.18, 86.2), ("without_fan", 2000, None, 86.2)],
)
def test_water_cooling(name, rows, last_s, first_c):
    log = read_log(REAL / "water_cooling" / f"{name}.dat")
    assert (log.rows, len(log.columns), log.reading.header_rows) == (rows, 2, 0)
    found = to_channels(log, {"time": "1", "signal": "2"}, {"time": "s", "signal": "degC"})
    assert found.values["signal"][0] == first_c
    assert last_s is None or found.time_s[-1] == pytest.approx(last_s)


@pytest.mark.parametrize(("name", "rows"), [("run_12a", None), ("run_12b", 930)])
def test_block_ramp(name, rows):
    log = read_log(REAL / "block_ramp" / f"{name}.csv")
    assert rows is None or log.rows == rows
    assert log.columns[5].short_name == "Ref. 2 temperature"
    assert all(c.unit == "degC" for c in log.columns if c.number != 2)
    roles = {"time": "Timestamp", "signal": "DUT temperature", "reference": "Chamber temperature"}
    found = to_channels(log, roles, {})
    assert 3 <= np.median(np.diff(found.time_s)) <= 4
    assert any("no elapsed time depends on it" in c for c in found.cautions)


def test_block_ramp_with_missing_set_points():
    log = read_log(REAL / "block_ramp" / "run_04.csv")
    assert [c.name for c in log.columns] == ["Timestamp", "SetPoint", "Chamber", "Ref", "DUT"]
    assert np.isnan(log.numbers("SetPoint")[:9]).all()
    units = {"signal": "degC", "reference": "degC"}
    found = to_channels(log, {"time": "Timestamp", "signal": "DUT", "reference": "Ref"}, units)
    assert found.time_origin == "2021-01-17T18:29:57"
    assert found.time_s[1] == 4.0


@pytest.mark.parametrize("name", ["full_run", "constant_hold"])
def test_bead_bath(name):
    log = read_log(REAL / "bead_bath" / f"{name}.txt")
    assert log.reading.header_rows == 2
    assert [c.unit for c in log.columns] == ["s", "degC", *(["ohm", "A", "V"] * 4)]
    roles = {"time": "Time", "signal": "R_0", "reference": "PT104", "current": "I_0"}
    found = to_channels(log, roles, {})
    assert np.median(np.diff(found.time_s)) == pytest.approx(1.054, abs=1e-3)
    assert found.values["signal"].size == log.rows
    if name == "full_run":
        # 62 % of the thermometer's rows repeat the one before.
        assert "polled" in {r.kind for r in found.repairs}
