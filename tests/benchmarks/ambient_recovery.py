"""Time and memory of a recovery against a compiled state-space smoother; ambient_recovery.md.

``python tests/benchmarks/ambient_recovery.py`` with statsmodels installed. Both run in one process
on one core; CPU time, the median of three. The library is given order, smoothness and noise; we
find them, and choose the order, too.
"""
# ruff: noqa: E402, T201 - threads are limited first; a script prints its tables

from __future__ import annotations

import os

for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"

import statistics
import time
import tracemalloc

import numpy as np
from scipy.signal import lfilter

from tauworkbench.ambient.chain import Chain
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.statespace import StateSpace
from tauworkbench.records import Trace

TAUS, STEP, NOISE = (10.0, 2.0), 0.5, 0.02


def log(kind: str, n: int, jitter: float = 0.0) -> Trace:
    """A long log: a walk, sines, or doors of 20 to 80 s about every 10 min."""
    rng = np.random.default_rng(1)
    t = STEP * np.arange(n)
    if kind == "random walk":
        ambient = 10 + np.cumsum(rng.normal(0, 0.1 * np.sqrt(STEP), n))
    elif kind == "sines":
        ambient = 15 + 2 * np.sin(2 * np.pi * t / 300) + np.sin(2 * np.pi * t / 97)
    else:
        ambient = np.full(n, 4.0)
        for start in np.cumsum(rng.exponential(1200, n // 1200)).astype(int):
            ambient[start : start + rng.integers(40, 160)] += 8 * rng.uniform(0.3, 1)
    x = ambient
    for tau in TAUS:
        decay = np.exp(-STEP / tau)
        share = (1 - decay) * tau / STEP
        x = lfilter([1 - share, share - decay], [1.0, -decay], x - x[0]) + x[0]
    moved = np.sort(t + jitter * STEP * rng.uniform(-0.5, 0.5, n))
    return Trace(moved, np.interp(moved, t, x) + NOISE * rng.normal(size=n))


def library(trace: Trace, order: int, intensity: float) -> float:
    """CPU seconds of the library's smoother on even samples, everything given."""
    from statsmodels.tsa.statespace.kalman_smoother import KalmanSmoother

    move, spread = StateSpace.of(Chain(TAUS), order, intensity).over(STEP)
    n = len(move)
    model = KalmanSmoother(k_endog=1, k_states=n, k_posdef=n)
    model.bind(np.asfortranarray(trace.temperature_c[None, :]))
    model["design"] = np.eye(n)[-1:]
    model["transition"], model["selection"] = move, np.eye(n)
    model["state_cov"], model["obs_cov"] = spread, np.array([[NOISE**2]])
    model.initialize_known(np.full(n, trace.temperature_c[0]), 100 * np.eye(n))
    begin = time.process_time()
    model.smooth()
    return time.process_time() - begin


def ours(trace: Trace) -> float:
    """CPU seconds of a recovery, everything found."""
    begin = time.process_time()
    recover_ambient(trace, time_constants_s=TAUS)
    return time.process_time() - begin


def memory(trace: Trace) -> float:
    """Peak of what a recovery allocates, over the input's two columns."""
    tracemalloc.start()
    recover_ambient(trace, time_constants_s=TAUS)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    return peak / (16 * trace.time_s.size)


def median(run: object, *arguments: object) -> float:
    """Median of three."""
    return statistics.median(run(*arguments) for _ in range(3))  # type: ignore[operator]


def main() -> None:
    """Print the tables."""
    print("| 1e6 samples, even | ours [s] | library, order 1 [s] | order 2 [s] | memory / input |")
    print("| --- | --- | --- | --- | --- |")
    for kind in ("random walk", "sines"):
        trace = log(kind, 1_000_000)
        mine = median(ours, trace)
        first, second = (median(library, trace, k, q) for k, q in ((1, 0.01), (2, 1e-4)))
        print(
            f"| {kind} | {mine:.2f} | {first:.2f} ({first / mine:.1f}x) | {second:.2f} "
            f"({second / mine:.1f}x) | {memory(trace):.1f} |",
            flush=True,
        )
    print("\n| samples | " + " | ".join(("random walk [s]", "sines [s]", "doors [s]")) + " |")
    print("| --- | --- | --- | --- |")
    for n in (10_000, 100_000, 1_000_000):
        times = [ours(log(kind, n, 0.3)) for kind in ("random walk", "sines", "doors")]
        print(f"| {n} | " + " | ".join(f"{t:.2f}" for t in times) + " |", flush=True)


if __name__ == "__main__":
    main()
