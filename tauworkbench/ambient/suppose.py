"""What is not known of a jump: its time, and how long the transition took.

Both are kept as a set of suppositions with weights, and what they say about the ambient is
averaged: the mean is blurred as much as the data leave open, and the band holds all of them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray
from .chain import Chain
from .cuts import Cuts, shift
from .local import LocalFits, neighbours, windows
from .moments import Samples
from .smooth import Smooth

__all__ = ["Suppositions", "blend", "coarse", "local_fits", "suppose"]

# Lengths of the transition that are weighed, in knot intervals.
_WIDTHS = (0.0, 0.5, 1.0, 2.0, 4.0)
# Before the data are seen: two in five are instant.
_PRIOR = (0.4, 0.15, 0.15, 0.15, 0.15)
_HALF_WINDOW = 13.0
# Five nodes of Gauss and Hermite for a normal density.
_NODES, _SHARES = np.polynomial.hermite_e.hermegauss(5)
_SHARES = _SHARES / _SHARES.sum()


@dataclass(frozen=True, eq=False)
class Suppositions:
    """Times [s] of each jump for each width, their spreads [s] and weights; (widths, jumps)."""

    width_s: FloatArray
    time_s: FloatArray
    spread_s: FloatArray
    share: FloatArray
    gain: FloatArray
    """Fall of the cost against no jump, in variances; shape (jumps,)."""

    def cuts(self) -> Cuts:
        """The likeliest of each jump."""
        best = np.argmax(self.share, axis=0)
        at = np.arange(best.size)
        mean = np.sum(self.share * self.time_s, axis=0)
        within = self.share * (self.spread_s**2 + (self.time_s - mean) ** 2)
        spread = np.sqrt(np.sum(within, axis=0))
        order = np.argsort(self.time_s[best, at])
        return Cuts(self.time_s[best, at][order], self.width_s[best][order], spread[order])

    def part(self, keep: NDArray[np.bool_]) -> Suppositions:
        """Return those of some jumps."""
        return Suppositions(
            self.width_s,
            self.time_s[:, keep],
            self.spread_s[:, keep],
            self.share[:, keep],
            self.gain[keep],
        )


def local_fits(
    samples: Samples,
    chain: Chain,
    found: Smooth,
    cuts: Cuts,
    target_s: FloatArray,
    others: FloatArray | None = None,
) -> LocalFits:
    """Return the fits about some jumps; others only bound their windows."""
    system = found.system
    half = _HALF_WINDOW * system.knots.interval_s
    seen = system.chain
    shifted = shift(samples, chain, seen)
    extra = system.knots.degree - len(seen.poles_s) - system.order
    every = cuts.time_s if others is None else np.concatenate([cuts.time_s, others])
    bounds = neighbours(cuts.time_s, every, half)
    return LocalFits(
        shifted,
        windows(shifted.time_s, cuts.time_s, bounds),
        windows(target_s, cuts.time_s, bounds),
        seen,
        system.order,
        system.knots.interval_s,
        found.solution.smoothness,
        extra,
    )


def coarse(fits: LocalFits) -> FloatArray:
    """Shift of each jump [s] with the lowest cost among a few."""
    shifts = fits.interval_s * np.linspace(-2, 2, 9)
    costs = [fits.answer(np.full(fits.data.jumps, s), 0.0).cost for s in shifts]
    return np.asarray(shifts[np.argmin(costs, axis=0)])


def suppose(
    samples: Samples,
    chain: Chain,
    found: Smooth,
    cuts: Cuts,
    tries: int = 3,
    others: FloatArray | None = None,
) -> Suppositions:
    """Weigh times and widths of known jumps by small fits about each."""
    fits = local_fits(samples, chain, found, cuts, np.zeros(0), others)
    h, variance = fits.interval_s, found.solution.variance
    none = fits.answer(np.zeros(cuts.count), None).cost
    times, spreads, costs = [], [], []
    for width in _WIDTHS:
        at, reach = np.zeros(cuts.count), np.full(cuts.count, 0.25 * h)
        cost = fits.answer(at, width * h).cost
        for _ in range(tries):
            at, bend, cost = _lower(fits, (at, cost), reach, width * h)
            spread = np.sqrt(2 * variance / np.maximum(bend, 1e-300))
            spread = np.clip(spread, 0.01 * h, 0.7 * h)
            reach = np.minimum(reach, 1.5 * spread)
        times.append(cuts.time_s + at)
        spreads.append(spread)
        costs.append(cost)
    cost = np.array(costs) / variance
    log_share = -0.5 * (cost - cost.min(axis=0)) + np.log(np.array(spreads))
    log_share += np.log(_PRIOR)[:, None]
    share = np.exp(log_share - log_share.max(axis=0))
    gain = none / variance - cost.min(axis=0)
    return Suppositions(
        h * np.array(_WIDTHS), np.array(times), np.array(spreads), share / share.sum(axis=0), gain
    )


def _lower(
    fits: LocalFits, known: tuple[FloatArray, FloatArray], reach: FloatArray, width: float
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Go to the bottom of the parabola through three costs: place, curvature, cost there."""
    at, here = known
    left, right = (fits.answer(at + k * reach, width).cost for k in (-1, 1))
    bend = (left - 2 * here + right) / reach**2
    curved = bend > 0
    move = np.where(curved, -(right - left) / (2 * reach) / np.where(curved, bend, 1.0), 0.0)
    downhill = np.where(right < left, 2.0, -2.0) * reach
    move = np.clip(np.where(curved, move, downhill), -2 * reach, 2 * reach)
    new = np.clip(at + move, -3 * fits.interval_s, 3 * fits.interval_s)
    cost = fits.answer(new, width).cost
    better = cost < here
    return np.where(better, new, at), np.where(curved, bend, 0.0), np.where(better, cost, here)


def blend(
    samples: Samples, chain: Chain, found: Smooth, cuts: Cuts, target_s: FloatArray
) -> tuple[FloatArray, FloatArray, Suppositions]:
    """Average over what is likely about each jump.

    Returns
    -------
    mean, variance : ndarray, shape (n,)
        What to add to the ambient [K] and to its variance [K^2] at the target's times.
    weighed : Suppositions
    """
    weighed = suppose(samples, chain, found, cuts)
    fits = local_fits(samples, chain, found, cuts, target_s)
    noise = found.solution.variance
    which, best = (
        fits.target.which,
        np.argmin(np.abs(weighed.width_s[:, None] - cuts.width_s), axis=0),
    )
    total = np.zeros(which.size)
    square = np.zeros(which.size)
    base_mean, base_variance = np.zeros(which.size), np.zeros(which.size)
    for k, width in enumerate(weighed.width_s):
        exact = fits.answer(np.zeros(cuts.count), float(width), wanted=True)
        own = best[which] == k
        base_mean[own], base_variance[own] = exact.mean[own], noise * exact.variance[own]
        for node, share in zip(_NODES, _SHARES, strict=True):
            move = weighed.time_s[k] - cuts.time_s + node * weighed.spread_s[k]
            answer = fits.answer(move, float(width), wanted=True)
            weight = (weighed.share[k] * share)[which]
            total += weight * answer.mean
            square += weight * (answer.mean**2 + noise * answer.variance)
    mean, variance = np.zeros(target_s.size), np.zeros(target_s.size)
    np.add.at(mean, fits.target.sample, total - base_mean)
    np.add.at(variance, fits.target.sample, square - total**2 - base_variance)
    return mean, variance, weighed
