"""A slow platinum thermometer beside four fast beads, where that log lies beside the project."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from tauworkbench.ambient.record import Ambient
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.records import Trace

BEADS = ("0x40", "0x41", "0x44", "0x45")


def load(folder: Path, name: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Times [s], platinum and the mean of the beads [degC]."""
    path = folder / "real" / "bead_bath" / name
    if not path.exists():
        pytest.skip("the bead bath's log is not here")
    data = np.genfromtxt(path, skip_header=2, delimiter="\t")
    beads = []
    for k, address in enumerate(BEADS):
        report = path.with_name(f"SteinhartHartFitReport_{address}_260515.json")
        a, b, c = json.loads(report.read_text())["coeffs"]
        log_r = np.log(data[:, 2 + 3 * k])
        beads.append(1 / (a + b * log_r + c * log_r**3) - 273.15)
    time, mean = data[:, 0], np.mean(beads, axis=0)
    good = np.isfinite(time) & np.isfinite(data[:, 1]) & np.isfinite(mean)
    good[1:] &= np.diff(time) > 0
    return time[good], data[good, 1], mean[good]


def recover(time: np.ndarray, platinum: np.ndarray) -> Ambient:
    return recover_ambient(Trace(time, platinum), time_constants_s=[45.0])


def rms(x: np.ndarray) -> float:
    return float(np.sqrt(np.mean(np.square(x))))


def test_crash_cool_is_recovered_to_thirty_millikelvins(shared_folder: Path) -> None:
    time, platinum, beads = load(shared_folder, "full_run.txt")
    result = recover(time, platinum)
    # The crash-cool begins where the beads' minute means fall fastest for good.
    minute = np.convolve(beads, np.ones(57) / 57, "same")
    start = int(np.argmin(np.gradient(minute)[100:-100])) + 100 - 60
    assert rms((platinum - beads)[start:]) > 0.2
    assert rms((result.ambient_c - beads)[start:]) < 0.030
    assert any("repeat" in c for c in result.cautions)


def test_constant_hold_is_no_worse_than_the_reading(shared_folder: Path) -> None:
    time, platinum, beads = load(shared_folder, "constant_hold.txt")
    result = recover(time, platinum)
    assert rms(result.ambient_c - beads) < 1.25 * rms(platinum - beads)
    assert np.std(result.ambient_c) < 1.25 * np.std(platinum)
