"""Simulated logs with known truth, for the tests.

The physics is that of the sample data (``sample_data/simulated_rig.py``), which uses nothing of
tauworkbench; here are the scenarios that tests ask for, by seed.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from simulated_rig import FRACTIONS, Current, Divider, Law, Logger, Network, Phase, Rig

__all__ = [
    "FRACTIONS",
    "ONE_LUMP",
    "TWO_LUMPS",
    "Current",
    "Divider",
    "Law",
    "Logger",
    "Network",
    "Phase",
    "Rig",
    "Simulated",
    "plunge",
    "write_run",
]

BETA = {"resistance": 10_000.0, "temperature_c": 25.0, "beta_k": 3950.0}
ONE_LUMP = Network((0.16,), (), 0.02)
"""Time constant 8 s."""
TWO_LUMPS = Network((0.35, 0.50), (0.090,), 0.350)
"""Time constants 5.26 and 1.06 s."""


@dataclass(frozen=True, eq=False)
class Simulated:
    """One log with its truth; ``element_c`` is the sensing element's temperature at each sample."""

    time_s: np.ndarray
    codes: np.ndarray
    volts: np.ndarray
    element_c: np.ndarray
    onset_s: float
    circuit: Divider
    logger: Logger
    truth: dict[str, Any]


def plunge(
    seed: int,
    network: Network = TWO_LUMPS,
    *,
    start_c: float = 20.0,
    final_c: float = 60.0,
    onset_s: float | None = None,
    logger: Logger | None = None,
) -> Simulated:
    """Simulate a plunge out of still air, whose film conducts a fortieth of the bath's.

    Without an onset it falls anywhere in one sampling period near an eighth of the log.
    """
    rng = np.random.default_rng(seed)
    logger = logger or Logger(0.05, 12 * sum(network.time_constants_s()), jitter_s=0.001)
    if onset_s is None:
        onset_s = logger.length_s / 8 + logger.period_s * rng.uniform()
    circuit, law = Divider(), Law.beta(*BETA.values())
    phases = [Phase(0.0, network.film / 40, start_c), Phase(onset_s, network.film, final_c)]
    times = logger.times(rng)
    element = Rig(network, law, circuit).element_c(times, phases)
    codes = logger.codes(circuit.signal(law.resistance(element), times), rng)
    truth = network.truth()
    return Simulated(times, codes, logger.volts(codes), element, onset_s, circuit, logger, truth)


def write_run(folder: Path, log: Simulated, name: str = "run", **test: Any) -> Path:
    """Write the log in counts with its run file, and return the run file's path."""
    rows = (f"{t:.4f},{c}" for t, c in zip(log.time_s, log.codes, strict=True))
    (folder / f"{name}.csv").write_text("\n".join(["elapsed [s],adc [counts]", *rows]) + "\n")
    test = {"kind": "plunge", "sensor": "P1", "medium": "water", **test}
    lines = [
        f'[log]\nfile = "{name}.csv"\ntime = "elapsed"\nsignal = "adc"',
        f'[circuit]\nkind = "divider"\nsensor_leg = "low"\nsupply = {log.circuit.supply}',
        f"fixed = {log.circuit.fixed}",
        f"counts = {{ bits = {log.logger.bits}, reference = {log.logger.reference} }}",
        '[law]\nkind = "beta"',
        *(f"{key} = {value}" for key, value in BETA.items()),
        "[test]",
        *(f"{key} = {value!r}" for key, value in test.items()),
    ]
    path = folder / f"{name}.toml"
    path.write_text("\n".join(lines) + "\n")
    return path


def noiseless(logger: Logger) -> Logger:
    """Return the same logger without noise or jitter and with a 24-bit converter."""
    return replace(logger, noise_v=0.0, jitter_s=0.0, bits=24)
