r"""Smoothness, noise and knots by restricted maximum likelihood.

The smoothness is searched as the frequency at which the recovery falls to a half,

.. math:: \lambda\, \omega^{2m} = |H(i \omega)|^2 n_t,

with :math:`n_t` the samples per second (Wiener's filter for white noise): a number with a meaning,
in which the knots can be laid. They stand seven to its wavelength, and are laid anew until the
frequency found agrees with the one that they were made for.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.linalg import LinAlgError

from ..records import FloatArray
from .chain import Chain
from .cuts import NO_CUTS, Cuts, builder
from .moments import Samples
from .system import Solution, System

__all__ = ["Scale", "Smooth", "search", "smooth"]

_KNOTS_PER_WAVELENGTH = 7.0
# Frequencies tried on one set of knots: up to twice what they were made for, beyond which they are
# too coarse; down to where the equations' condition, (knots' highest frequency / that)^(2 order +
# 2 poles), gets near the inverse of the rounding error.
_UP, _CONDITION = 2.0, 1e12
# First steps of the search, in the log of the frequency, and where it ends.
_FAR, _NEAR, _END = 0.5, 0.12, 0.05
_GOOD = (0.8, 1.7)
_TRIES = 12


@dataclass(frozen=True, eq=False)
class Scale:
    """What ties a smoothness to a frequency for one chain, order and density of samples."""

    chain: Chain
    order: int
    per_second: float
    omega: FloatArray
    log_smoothness: FloatArray
    coarsest_s: float

    @classmethod
    def of(cls, samples: Samples, chain: Chain, order: int, longest_s: float = math.inf) -> Scale:
        """Tabulate from a tenth of the record's own frequency to beyond the samples'.

        Knots are never further apart than ``longest_s``.
        """
        live = samples.weight > 0
        time = samples.time_s[live]
        interval = float(np.median(np.diff(time)))
        per_second = float(np.mean(samples.weight[live])) / interval
        omega = np.geomspace(0.1 / (time[-1] - time[0]), 8 * math.pi / interval, 600)
        value = np.log(np.abs(chain.response(omega)) ** 2 + 1e-300) + math.log(per_second)
        value = np.minimum.accumulate(value - 2 * order * np.log(omega))
        value -= 1e-9 * np.arange(omega.size)  # strictly falling, so that it can be inverted
        coarsest = min((time[-1] - time[0]) / 4, longest_s)
        return cls(chain, order, per_second, omega, value, coarsest)

    def smoothness(self, omega: float) -> float:
        """Lambda at which the recovery falls to a half there."""
        at = np.interp(math.log(omega), np.log(self.omega), self.log_smoothness)
        return math.exp(float(at))

    def frequency(self, smoothness: float) -> float:
        """Angular frequency at which the recovery falls to a half [rad/s]."""
        at = np.interp(math.log(smoothness), self.log_smoothness[::-1], np.log(self.omega)[::-1])
        return math.exp(float(at))

    def noise_gain(self, smoothness: float) -> float:
        """Noise of the recovered ambient over that of a sample, from noise alone."""
        response = np.abs(self.chain.response(self.omega)) ** 2 + 1e-300
        ratio = smoothness * self.omega ** (2 * self.order) / (response * self.per_second)
        density = 1 / response / (1 + ratio) ** 2 * self.omega
        square = float(np.trapezoid(density, np.log(self.omega)))
        return float(np.sqrt(square / (math.pi * self.per_second)))

    def expected_correlation(self, smoothness: float, lag_s: FloatArray) -> FloatArray:
        """Correlation that the residuals must have at some lags, the noise being white.

        A smoother leaves (1 - W) of the reading, whose spectrum is then that of the noise times
        1 - W.
        """
        response = np.abs(self.chain.response(self.omega)) ** 2 + 1e-300
        ratio = smoothness * self.omega ** (2 * self.order) / (response * self.per_second)
        gain = np.where(self.omega < math.pi * self.per_second, 1 / (1 + ratio), 0.0)
        lags = np.concatenate([[0.0], lag_s])
        waves = gain * np.cos(lags[:, None] * self.omega) * self.omega
        kernel = np.atleast_1d(np.trapezoid(waves, np.log(self.omega)))
        kernel = kernel / (math.pi * self.per_second)
        return np.asarray(-kernel[1:] / max(1 - kernel[0], 1e-3))

    def interval(self, omega: float) -> float:
        """Distance of the knots for this frequency [s]."""
        interval = float(2 * math.pi / (_KNOTS_PER_WAVELENGTH * omega))
        finest = float(4 * math.pi / self.omega[-1])  # half a sampling interval
        return max(min(interval, self.coarsest_s), finest)

    def limits(self, interval: float) -> tuple[float, float]:
        """Frequencies [rad/s] that may be tried on knots that far apart."""
        highest = math.pi / interval
        orders = 2 * (self.order + len(self.chain.seen_by(interval).poles_s))
        low = max(highest / _CONDITION ** (1 / orders), 2 * self.omega[0])
        fine = interval <= self.interval(math.inf) * 1.001
        high = self.omega[-1] / 2 if fine else _UP * 2 * highest / _KNOTS_PER_WAVELENGTH
        return low, max(high, 1.5 * low)


@dataclass(frozen=True, eq=False)
class Smooth:
    """A solution with the scale it was found on."""

    solution: Solution
    scale: Scale
    omega: float
    spread: float = 0.0
    """Standard uncertainty of log lambda, from the criterion's curvature."""

    @property
    def system(self) -> System:
        """Its equations."""
        return self.solution.system


def smooth(  # noqa: PLR0913 - samples, chain and law, then how to search
    samples: Samples,
    chain: Chain,
    order: int,
    *,
    end_s: float,
    start: float | None = None,
    cuts: Cuts = NO_CUTS,
    longest_s: float = math.inf,
    near: bool = False,
) -> Smooth:
    """Find smoothness, noise and knots.

    Parameters
    ----------
    samples : Samples
    chain : Chain
    order : int
    end_s : float
        Where the ambient is still wanted [s].
    start : float, optional
        Angular frequency to begin at [rad/s].
    cuts : Cuts
        Jumps that the ambient may make.
    longest_s : float
        Knots are never further apart; about jumps they must follow more than the smoothness asks.
    near : bool
        Whether the start is known to be near: then it is searched about in shorter steps.
    """
    scale = Scale.of(samples, chain, order, longest_s)
    build = builder(samples, chain, order, end_s, cuts)
    omega = start or min(6 / chain.lag_s if chain.lag_s > 0 else 1.0, scale.omega[-1] / 16)
    omega = max(omega, 40 * scale.omega[0])
    for attempt in range(_TRIES):
        interval = scale.interval(omega)
        limits = scale.limits(interval)
        begin = min(max(omega, limits[0]), limits[1])
        try:
            found = search(build(interval), scale, begin, limits, _NEAR if near else _FAR)
        except LinAlgError:  # more knots than the samples bear
            if attempt == _TRIES - 1:
                raise
            omega /= 2
            continue
        omega = found.omega
        share = scale.interval(omega) / interval
        if _GOOD[0] <= share <= _GOOD[1] or attempt == _TRIES - 1:
            break
    return found


def search(
    system: System, scale: Scale, start: float, limits: tuple[float, float], step: float
) -> Smooth:
    """Minimise the criterion over the log of the frequency between limits, by parabolas."""
    low, high = math.log(limits[0]), math.log(limits[1])
    known: dict[float, float] = {}
    last: dict[float, Solution] = {}  # one at most: a factor is as large as the equations

    def value(x: float) -> float:
        if x not in known:
            last.clear()
            try:
                last[x] = system.solve(scale.smoothness(math.exp(x)))
                known[x] = last[x].criterion
            except LinAlgError:
                known[x] = math.inf
        return known[x]

    x = math.log(start)
    for _ in range(40):
        if step < _END:
            break
        left, right = max(x - step, low), min(x + step, high)
        here = value(x)
        if math.isinf(here) and x < high:  # rougher is better conditioned
            x = right
        elif left < x and value(left) < here:
            x = left
        elif right > x and value(right) < here:
            x = right
        else:
            step /= 4
            x = _vertex(known, x, low, high)
            value(x)
            x = min(known, key=known.__getitem__)
    return _done(system, scale, x, known, last)


def _vertex(known: dict[float, float], x: float, low: float, high: float) -> float:
    """Lowest point of the parabola through x and its neighbours, where there is one."""
    xs = sorted(k for k in known if math.isfinite(known[k]))
    at = xs.index(x) if x in xs else 0
    if not 0 < at < len(xs) - 1:
        return x
    (a, b, c), (fa, fb, fc) = xs[at - 1 : at + 2], (known[k] for k in xs[at - 1 : at + 2])
    bend = (fc - fb) / (c - b) - (fb - fa) / (b - a)
    if bend <= 0:
        return x
    slope = ((fc - fb) / (c - b) * (b - a) + (fb - fa) / (b - a) * (c - b)) / (c - a)
    return min(max(x - slope * (c - a) / 2 / bend, low), high)


def _done(
    system: System,
    scale: Scale,
    x: float,
    known: dict[float, float],
    last: dict[float, Solution],
) -> Smooth:
    """The best one tried, with how sharply it stands out."""
    smoothness = scale.smoothness(math.exp(x))
    solution = last[x] if x in last else system.solve(smoothness)
    # Curvature over log lambda, from the tried points nearest to the lowest.
    near = sorted(known, key=lambda k: abs(k - x))[:4]
    near = [k for k in near if math.isfinite(known[k])]
    spread = 0.0
    if len(near) >= 3:
        logs = np.log([scale.smoothness(math.exp(k)) for k in near])
        a = float(np.polyfit(logs - math.log(smoothness), [known[k] for k in near], 2)[0])
        spread = 1 / math.sqrt(a) if a > 0 else 0.0
    return Smooth(solution, scale, math.exp(x), min(spread, 2.0))
