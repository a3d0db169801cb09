"""Measure the recovery on simulated field logs: the tables of ambient.md.

``PYTHONPATH=tests python -m validation.ambient_table 20`` from the project's root prints them.
"""
# ruff: noqa: T201 - a script that prints its tables

from __future__ import annotations

import sys
import time
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from ambient.scenes import Scene, scene

from tauworkbench.ambient.chain import Chain
from tauworkbench.ambient.moments import Samples
from tauworkbench.ambient.posterior import Posterior
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.sensor import KnownSensor
from tauworkbench.ambient.smooth import smooth
from tauworkbench.records import Trace
from tauworkbench.thermal.transfer import TransferFunction

SENSORS: list[tuple[float, ...]] = [(10.0,), (10.0, 2.0)]


@dataclass(frozen=True)
class Case:
    """Limits: rms over the tuned smoother's, mean coverage [%], coverage near jumps [%]."""

    ratio: float
    coverage: tuple[float, float]
    near: float = 0.0


CASES = {
    "jumps": Case(0.75, (93, 99.5), 90),
    "doors": Case(0.75, (93, 99.8), 90),
    "slow doors": Case(1.20, (93, 99.5), 87),
    "ramps and sines": Case(1.10, (93, 98.5)),
    "random walk": Case(1.10, (92.5, 98)),
}


@dataclass(frozen=True)
class Row:
    """Means over the logs; ``ratio`` is that of the root mean squares over all logs."""

    rms_k: float
    tuned_k: float
    reading_k: float
    coverage: float
    near: float
    orders: str
    found: float
    true: float
    seconds: float

    @property
    def ratio(self) -> float:
        """Our rms over the tuned smoother's."""
        return self.rms_k / self.tuned_k


def tuned(log: Scene, sensor: tuple[float, ...]) -> float:
    """Least mean square error of quadratic penalties of order 1 and 2, the truth in hand [K^2]."""
    origin = float(log.reading_c.mean())
    samples = Samples(log.time_s, log.reading_c - origin, np.ones(log.time_s.size), origin)
    errors = []
    for order in (1, 2):
        found = smooth(samples, Chain(sensor), order, end_s=float(log.time_s[-1]))
        for power in np.arange(-1.5, 2.01, 0.25):
            posterior = Posterior(found.system.solve(found.solution.smoothness * 10**power))
            ambient = origin + posterior.mean(posterior.ambient_table, log.time_s)
            errors.append(np.mean((ambient - log.ambient_c) ** 2))
    return float(min(errors))


def measure(
    kind: str, sensor: tuple[float, ...], seeds: Iterable[int], samples: int = 3000, u: float = 0.0
) -> Row:
    """Recover seeded logs; with u the time constants are off by that share, and said so."""
    sums, orders = [], []
    for seed in seeds:
        log = scene(kind, seed, sensor, samples=samples)
        known = _known(sensor, u, seed)
        begin = time.process_time()
        r = recover_ambient(Trace(log.time_s, log.reading_c), sensor=known)
        seconds = time.process_time() - begin
        inside = (log.ambient_c >= r.low_c) & (log.ambient_c <= r.high_c)
        near = log.near_jumps(sensor[0])
        sums.append(
            (
                np.mean((r.ambient_c - log.ambient_c) ** 2),
                tuned(log, sensor),
                np.mean((log.reading_c - log.ambient_c) ** 2),
                100 * inside.mean(),
                100 * inside[near].mean() if near.any() else np.nan,
                r.settings.jumps,
                log.jumps_s.size,
                seconds,
            )
        )
        orders.append(r.settings.order)
    mean = np.mean(sums, axis=0)
    count = "/".join(str(orders.count(k)) for k in (1, 2, 3))
    return Row(*np.sqrt(mean[:3]), mean[3], mean[4], count, *mean[5:])


def _known(sensor: tuple[float, ...], u: float, seed: int) -> KnownSensor:
    """The sensor as it is told: true, or off at random by a stated standard uncertainty."""
    rng = np.random.default_rng(10_000 + seed)
    spread = u * np.array(sensor)
    said = tuple(float(t) for t in np.array(sensor) + spread * rng.normal(size=len(sensor)))
    names = ("time_constant_1_s", "time_constant_2_s")[: len(sensor)] if u else ()
    return KnownSensor(TransferFunction(said), names, np.diag(spread**2) if u else np.zeros((0, 0)))


COLUMNS = (
    "ambient", "sensor [s]", "rms [K]", "tuned", "ratio", "reading", "in the band", "near jumps",
    "order 1/2/3", "jumps found / true", "CPU [s]",
)  # fmt: skip
HEAD = f"| {' | '.join(COLUMNS)} |\n|{' --- |' * len(COLUMNS)}\n"


def table(count: int, u: float = 0.0) -> str:
    """The table as markdown."""
    lines = [HEAD]
    for kind in CASES:
        for sensor in SENSORS:
            r = measure(kind, sensor, range(count), u=u)
            near = "" if np.isnan(r.near) else f"{r.near:.1f} %"
            lines.append(
                f"| {kind} | {', '.join(f'{t:g}' for t in sensor)} | {r.rms_k:.4f} | "
                f"{r.tuned_k:.4f} | {r.ratio:.2f} | {r.reading_k:.2f} | {r.coverage:.1f} % | "
                f"{near} | {r.orders} | {r.found:.1f} / {r.true:.1f} | {r.seconds:.2f} |\n"
            )
            print(lines[-1], end="", flush=True)
    return "".join(lines)


if __name__ == "__main__":
    number = int(sys.argv[1]) if len(sys.argv) > 1 else 20
    print(table(number))
    print(table(max(number // 2, 1), u=0.03))
