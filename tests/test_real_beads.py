"""A real log with beads in ohms, amperes and volts, and a platinum probe read too often.

The log and the beads' coefficients lie beside the checkout, not in it; its own notes say that,
driven by the beads, the platinum lags by 45 +- 3 s.
"""

from __future__ import annotations

import json

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

import tauworkbench as tw


@pytest.fixture(scope="module")
def log(shared_folder):
    path = shared_folder / "real" / "bead_bath" / "full_run.txt"
    if not path.is_file():
        pytest.skip("the bead log does not lie beside this checkout")
    rows = np.genfromtxt(path, skip_header=2, delimiter="\t")[:, :5]
    later = np.concatenate([[True], np.diff(rows[:, 0]) > 0])
    return rows[later & np.isfinite(rows).all(axis=1)].T


@pytest.fixture(scope="module")
def law(shared_folder):
    path = shared_folder / "real" / "bead_bath" / "SteinhartHartFitReport_0x40_260515.json"
    return tw.SteinhartHart(*json.loads(path.read_text(encoding="utf-8"))["coeffs"])


def test_volts_over_a_current_column_are_the_logged_ohms(log, law):
    """The logger printed all three; amperes have five digits, ohms none behind the point."""
    time, _, ohm, ampere, volt = log
    by_volts = tw.to_temperature(time, volt, circuit=tw.CurrentSource(current=ampere), law=law)
    by_ohms = tw.to_temperature(time, ohm, circuit=tw.Ohms(), law=law)
    apart = by_volts.temperature_c - by_ohms.temperature_c
    assert np.abs(apart).max() < 3e-3  # 1 ohm in 31 kohm and 1e-4 of the current: 2.5 mK
    assert by_volts.power_w == pytest.approx(volt * ampere, rel=1e-9)


def test_copies_of_the_slow_probe_are_set_aside_and_it_lags_as_known(log, law):
    time, platinum, ohm, _, _ = log
    bead = tw.to_temperature(time, ohm, circuit=tw.Ohms(), law=law)
    probe = tw.to_temperature(time, platinum, circuit=tw.Thermometer())
    assert bead.kept.all()
    assert np.mean(~probe.kept) == pytest.approx(0.62, abs=0.01)
    medium, step = bead.temperature_c, np.diff(time)

    def misfit(tau):
        """One pole driven by the beads' straight lines between samples, solved exactly."""
        rate = np.diff(medium) / step
        decay = np.exp(-step / tau)
        behind, lag = np.empty(time.size), medium[0] - platinum[0]
        behind[0] = lag
        for i, (a, g) in enumerate(zip(decay, rate, strict=True)):
            lag = g * tau + (lag - g * tau) * a
            behind[i + 1] = lag
        return np.std((platinum - medium + behind)[probe.kept])

    found = minimize_scalar(misfit, bounds=(20, 80), method="bounded", options={"xatol": 0.1})
    assert found.x == pytest.approx(45.0, abs=3.0)
    assert found.fun < 0.023  # 17 to 23 mK by the log's notes, 161 mK without a lag
