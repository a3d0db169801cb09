"""Field logs with a known ambient, for the recovery's tests; nothing of tauworkbench is used.

The sensor's answer is computed on a grid far finer than the samples, exactly for an ambient that is
straight between the grid's points.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.signal import lfilter

Function = Callable[[np.ndarray], np.ndarray]
FINE_S = 0.01


@dataclass(frozen=True, eq=False)
class Scene:
    """One log: times [s], reading and ambient [degC], times of the ambient's jumps [s]."""

    time_s: np.ndarray
    reading_c: np.ndarray
    ambient_c: np.ndarray
    jumps_s: np.ndarray

    def near_jumps(self, reach_s: float) -> np.ndarray:
        """Mask of the samples within reach of a jump."""
        if not self.jumps_s.size:
            return np.zeros(self.time_s.size, bool)
        return np.min(np.abs(self.time_s[:, None] - self.jumps_s), axis=1) <= reach_s


def lagged(values: np.ndarray, step_s: float, time_constants_s: tuple[float, ...]) -> np.ndarray:
    """Send values that are straight between even grid points through poles in series, exactly."""
    x = values
    for tau in time_constants_s:
        decay = np.exp(-step_s / tau)
        share = (1 - decay) * tau / step_s
        x = lfilter([1 - share, share - decay], [1.0, -decay], x - x[0]) + x[0]
    return x


def sensed(
    ambient: Function, time_s: np.ndarray, time_constants_s: tuple[float, ...], dead_s: float = 0.0
) -> np.ndarray:
    """What a sensor reads of an ambient that was steady before the log."""
    start = time_s[0] - dead_s - 1.0
    grid = np.arange(start, time_s[-1] + FINE_S, FINE_S)
    return np.interp(time_s - dead_s, grid, lagged(ambient(grid), FINE_S, time_constants_s))


def jumps(rng: np.random.Generator, span_s: float) -> tuple[Function, np.ndarray]:
    """Levels that jump at random times, by a normal amount of 3 K."""
    at = np.sort(rng.uniform(30, span_s - 10, int(span_s / 80)))
    levels = 20 + np.concatenate([[0], np.cumsum(rng.normal(0, 3, at.size))])
    return lambda t: levels[np.searchsorted(at, t, "right")], at


def doors(rng: np.random.Generator, span_s: float) -> tuple[Function, np.ndarray]:
    """Cold room: doors open for 15 to 60 s, then warm air clears away slowly; slow cycling."""
    events, at = [], 40.0
    while at < span_s - 60:
        at += rng.exponential(120) + 80
        length = rng.uniform(15, 60)
        if at + length < span_s - 10:
            events.append((at, length, 8 * rng.uniform(0.4, 1.0)))
        at += length

    def ambient(t: np.ndarray) -> np.ndarray:
        out = 4 + 0.5 * np.sin(2 * np.pi * t / 900)
        for start, length, rise in events:
            out = out + rise * ((t >= start) & (t < start + length))
            after = np.clip(t - start - length, 0, None)
            out = out + np.where(after > 0, rise * 0.5 * np.exp(-after / 45), 0)
        return out

    return ambient, np.array([x for s, d, _ in events for x in (s, s + d)])


def slow_doors(rng: np.random.Generator, span_s: float) -> tuple[Function, np.ndarray]:
    """Levels that change along a ramp of 2 s."""
    inner, at = jumps(rng, span_s)

    def ambient(t: np.ndarray) -> np.ndarray:
        return sum(inner(t + x) for x in np.linspace(-1, 1, 41)) / 41

    return ambient, at


def ramps(rng: np.random.Generator, span_s: float) -> tuple[Function, np.ndarray]:
    """Three sines of 60 to 300 s and six changes of slope."""
    period, phase, size = rng.uniform(60, 300, 3), rng.uniform(0, 6, 3), rng.uniform(0.3, 2, 3)
    kinks = np.sort(rng.uniform(0, span_s, 6))
    change = np.diff(np.concatenate([[0], rng.normal(0, 0.03, 6)]))

    def ambient(t: np.ndarray) -> np.ndarray:
        out = 15 + sum(
            a * np.sin(2 * np.pi * t / p + f) for a, p, f in zip(size, period, phase, strict=True)
        )
        return out + sum(s * np.clip(t - k, 0, None) for k, s in zip(kinks, change, strict=True))

    return ambient, np.zeros(0)


def walk(rng: np.random.Generator, span_s: float) -> tuple[Function, np.ndarray]:
    """A random walk of 0.1 K per root second."""
    grid = np.arange(-20.0, span_s + 2, 0.05)
    path = 10 + np.cumsum(rng.normal(0, 0.1 * np.sqrt(0.05), grid.size))
    return lambda t: np.interp(t, grid, path), np.zeros(0)


KINDS: dict[str, Callable[..., tuple[Function, np.ndarray]]] = {
    "jumps": jumps,
    "doors": doors,
    "slow doors": slow_doors,
    "ramps and sines": ramps,
    "random walk": walk,
}


def scene(
    kind: str,
    seed: int,
    time_constants_s: tuple[float, ...] = (10.0,),
    *,
    samples: int = 3000,
    step_s: float = 0.5,
    noise_k: float = 0.02,
    jitter: float = 0.3,
    gaps: int = 2,
) -> Scene:
    """Make a log with jittered stamps and a few gaps."""
    rng = np.random.default_rng(seed)
    time = np.sort(step_s * (np.arange(samples) + jitter * rng.uniform(-0.5, 0.5, samples)))
    time -= time[0]
    keep = np.ones(samples, bool)
    for _ in range(gaps):
        start = rng.integers(samples // 10, samples - samples // 10)
        keep[start : start + rng.integers(5, 60)] = False
    time = time[keep]
    ambient, at = KINDS[kind](rng, time[-1] + 2)
    reading = sensed(ambient, time, time_constants_s) + noise_k * rng.normal(size=time.size)
    return Scene(time, reading, ambient(time), at)
