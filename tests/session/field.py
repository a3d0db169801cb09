"""A small field log of one pole, with the ambient that made it."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from .conftest import write_log

TAU_S, NOISE_K, EVERY_S = 6.0, 0.02, 0.5
RUN = """\
[log]
file = "log.csv"
time = "t"
signal = "y"

[circuit]
kind = "thermometer"

[test]
kind = "field"
sensor = "P1"
medium = "air"

[recover]
"""


def ambient(time_s: np.ndarray) -> np.ndarray:
    """Two waves about 12 degC."""
    return 12.0 + 3.0 * np.sin(time_s / 25.0) + np.sin(time_s / 9.0 + 1.0)


def lagged(time_s: np.ndarray, tau_s: np.ndarray) -> np.ndarray:
    """One pole behind it whose time constant may change, by small implicit steps."""
    out = np.empty_like(time_s)
    out[0] = ambient(time_s[:1])[0]
    fine = 50
    for k in range(1, time_s.size):
        h = (time_s[k] - time_s[k - 1]) / fine
        at = time_s[k - 1] + h * (np.arange(fine) + 0.5)
        tau = np.interp(at, time_s, tau_s)
        y = out[k - 1]
        for a, one in zip(ambient(at), tau, strict=True):
            y += (a - y) * -np.expm1(-h / one)
        out[k] = y
    return out


def write_field(folder: Path, recover: str, *, wind: np.ndarray | None = None) -> Path:
    """Write a log of 300 samples and its run file; with a wind, the lag follows its square root."""
    time = EVERY_S * np.arange(300)
    tau = np.full(time.size, TAU_S) if wind is None else TAU_S / np.sqrt(wind)
    reading = lagged(time, tau) + np.random.default_rng(3).normal(0.0, NOISE_K, time.size)
    columns = {} if wind is None else {"wind [m/s]": wind}
    write_log(folder, **{"t [s]": time, "y [degC]": reading, **columns})
    path = folder / "field.toml"
    path.write_text(RUN + recover)
    return path
