"""A small log of a thermometer, with a step whose time constant is 2 s."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

RUN = """\
[log]
file = "log.csv"
time = "t"
signal = "y"

[circuit]
kind = "thermometer"

[test]
kind = "plunge"
sensor = "P1"
medium = "water"
"""
TIME = np.arange(0.0, 30.0, 0.1)


def step(onset_s: float = 5.0, rise_k: float = 30.0) -> np.ndarray:
    """One pole of 2 s from 20 degC, with noise of 20 mK."""
    clean = 20.0 + rise_k * -np.expm1(-np.clip(TIME - onset_s, 0.0, None) / 2.0)
    return clean + np.random.default_rng(7).normal(0.0, 0.02, TIME.size)


def write_log(folder: Path, **columns: np.ndarray) -> Path:
    """Write a log whose headers are the keys; ``t`` is the time [s], ``y`` the temperature."""
    columns = {"t [s]": TIME, **columns}
    rows = np.stack(list(columns.values()), axis=1)
    lines = [",".join(columns), *(",".join(f"{x:.6f}" for x in row) for row in rows)]
    path = folder / "log.csv"
    path.write_text("\n".join(lines) + "\n")
    return path


@pytest.fixture
def run_file(tmp_path: Path) -> Path:
    """A run file beside its log."""
    write_log(tmp_path, **{"y [degC]": step(), "contact [mV]": np.where(TIME >= 5.0, 5.0, 0.0)})
    path = tmp_path / "run.toml"
    path.write_text(RUN)
    return path
