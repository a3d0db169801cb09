r"""Jumps of the ambient: found, placed, and counted only where the evidence is strong.

The ambient is then a random walk whose steps are Gaussian nearly everywhere and of any size at a
few unknown times: the heavy tail that doors have. Where a walk alone wanders too far within one
cell to be its own step, the statistic

.. math:: t^2 = d^2 / (\sigma^2 (\kappa / \lambda - f' C f)), \qquad d = f' \beta,

shows it (d: the cell's mean slope; the denominator: the variance that the smoothed d must have if
the model were true; kappa = f' K^+ f; the auxiliary residual of de Jong and Penzer 1998, from
memory). The ambient is cut there, the cut is moved to where the data want it, and smoothness and
noise are found anew; once the largest jumps are out of the way the smaller ones show.

A jump's time and the length of the transition are never known exactly. Both are kept as a set of
suppositions with weights, and what they say about the ambient is averaged: the mean is blurred
as much as the data leave open, and the band holds all of them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.linalg import LinAlgError

from ..progress import SILENT, Watch, step
from ..records import FloatArray
from .chain import Chain
from .cuts import NO_CUTS, Cuts, shift, supported
from .knots import Knots, Layout
from .local import LocalFits, dense, neighbours, windows
from .moments import Samples
from .posterior import Posterior
from .smooth import Smooth, smooth
from .system import penalised_table, penalty_band, unit_moments

__all__ = ["Suppositions", "blend", "find_jumps", "suppose"]

# Beyond what chance gives: to try a jump, to keep it.
_TRY, _KEEP = 0.0, 2.0
# Lengths of the transition that are weighed, in knot intervals.
_WIDTHS = (0.0, 0.5, 1.0, 2.0, 4.0)
# Before the data are seen: every second one is instant.
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


def find_jumps(  # noqa: PLR0913 - the last two say how and to whom
    samples: Samples,
    chain: Chain,
    first: Smooth,
    end_s: float,
    watch: Watch = SILENT,
    *,
    rounds: int = 14,
) -> tuple[Cuts, Smooth]:
    """Find the jumps of the ambient.

    Parameters
    ----------
    samples : Samples
    chain : Chain
    first : Smooth
        Of order 1, without jumps; its knots' interval is kept.
    end_s : float
        Where the ambient is still wanted [s].
    watch : Watch
    rounds : int
        Few are enough where ``first`` has the smoothness between the jumps already.

    Returns
    -------
    cuts : Cuts
    found : Smooth
        Of order 1, with them.
    """
    cuts, found, longest = NO_CUTS, first, first.system.knots.interval_s
    known, settled = NO_CUTS, False
    for number in range(rounds):
        step(watch, number, rounds, "looking for jumps of the ambient")
        new = _candidates(samples, found, cuts) if number < rounds - 1 else np.zeros(0)
        if new.size:
            cuts = _with(samples, chain, found, cuts, new)
        elif settled or not cuts.count:
            break
        else:
            cuts = _kept(suppose(samples, chain, found, cuts), found)
        settled = not new.size
        cuts = supported(samples, cuts, math.inf)
        try:
            again = smooth(
                samples, chain, 1, end_s=end_s, start=found.omega, cuts=cuts, longest_s=longest,
                near=number > 2,
            )
        except LinAlgError:  # cuts that the samples between them can't tell apart
            break
        known, found = cuts, again
    return known, found


def _kept(weighed: Suppositions, found: Smooth) -> Cuts:
    """Those with enough behind them."""
    enough = weighed.gain > _chance(found) + _KEEP
    part = Suppositions(
        weighed.width_s, weighed.time_s[:, enough], weighed.spread_s[:, enough],
        weighed.share[:, enough], weighed.gain[enough],
    )
    return part.cuts() if enough.any() else NO_CUTS


def _candidates(samples: Samples, found: Smooth, cuts: Cuts) -> FloatArray:
    """Times at which a jump shows, well apart from each other and from those known."""
    statistic = surprise(found)
    knots = found.system.knots
    reach = max(math.ceil(math.pi / found.omega / knots.interval_s / 2), knots.degree + 1)
    limit = max(_chance(found) + _TRY, 0.25 * float(statistic.max()))
    taken = np.zeros(knots.cells, bool)
    picked = []
    order = np.argsort(statistic)[::-1]
    for c in order[: np.count_nonzero(statistic > limit)]:
        if not taken[c]:
            picked.append((knots.breaks[c] + knots.breaks[c + 1]) / 2)
            taken[max(c - reach, 0) : c + reach + 1] = True
    return _between(samples.time_s, np.array(picked), cuts.time_s)


def _between(time: FloatArray, picked: FloatArray, known: FloatArray) -> FloatArray:
    """At most one jump between two samples; one in a gap stands in its middle."""
    at = np.unique(np.clip(np.searchsorted(time, picked), 1, time.size - 1))
    at = at[~np.isin(at, np.searchsorted(time, known))]
    return (time[at - 1] + time[at]) / 2


def _chance(found: Smooth) -> float:
    """What the largest of as many squares as there are resolved pieces comes to by chance."""
    breaks = found.system.knots.breaks
    return 2 * math.log(max(float(breaks[-1] - breaks[0]) * found.omega / math.pi, 2))


def surprise(found: Smooth) -> FloatArray:
    """t^2 of every cell; 0 where the knots aren't even."""
    system, posterior = found.system, Posterior(found.solution)
    knots, size = system.knots, system.knots.degree + 1
    f = penalised_table(knots, system.chain, system.order)[0] @ unit_moments(np.arange(size))
    prior = _prior(knots, system.chain, system.order, f) / found.solution.smoothness
    slope, spread = np.zeros(knots.cells), np.zeros(knots.cells)
    for i in range(size):
        slope += f[i] * found.solution.beta[knots.alive(i)]
        for j in range(i, size):
            twice = 1.0 if i == j else 2.0
            spread += twice * f[i] * f[j] * posterior.inverse[j - i, knots.alive(i)]
    expected = np.maximum(prior - spread, 1e-6 * prior) * found.solution.variance
    statistic = slope**2 / expected
    odd = np.convolve(knots.kind > 0, np.ones(2 * size + 1), "same") > 0
    statistic[odd[: knots.cells]] = 0.0
    statistic[:size] = statistic[-size:] = 0.0
    return statistic


def _prior(knots: Knots, chain: Chain, order: int, f: FloatArray) -> float:
    """kappa: the prior variance of a cell's mean slope, per unit of q, on these knots."""
    cells = 6 * knots.degree + 31
    even = Knots.on(knots.interval_s * np.arange(cells + 1), knots.degree)
    g = np.zeros(even.size)
    g[cells // 2 : cells // 2 + f.size] = f
    x = np.linalg.lstsq(dense(penalty_band(Layout(even), chain, order)), g, rcond=1e-11)[0]
    return float(g @ x)


def _local(  # noqa: PLR0913 - the last two are empty nearly everywhere
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
        shifted, windows(shifted.time_s, cuts.time_s, bounds),
        windows(target_s, cuts.time_s, bounds), seen, system.order, system.knots.interval_s,
        found.solution.smoothness, extra,
    )


def _with(samples: Samples, chain: Chain, found: Smooth, cuts: Cuts, new: FloatArray) -> Cuts:
    """Add new jumps, each moved to its likeliest place and width; the old ones stay."""
    fresh = Cuts(new, np.zeros(new.size), np.zeros(new.size))
    fits = _local(samples, chain, found, fresh, np.zeros(0), cuts.time_s)
    fresh = Cuts(new + _coarse(fits), fresh.width_s, fresh.spread_s)
    fresh = suppose(samples, chain, found, fresh, tries=2, others=cuts.time_s).cuts()
    time = np.concatenate([cuts.time_s, fresh.time_s])
    order = np.argsort(time)
    width = np.concatenate([cuts.width_s, fresh.width_s])[order]
    return Cuts(time[order], width, np.concatenate([cuts.spread_s, fresh.spread_s])[order])


def _coarse(fits: LocalFits) -> FloatArray:
    """Shift of each jump [s] with the lowest cost among a few."""
    shifts = fits.interval_s * np.linspace(-2, 2, 9)
    costs = [fits.answer(np.full(fits.data.jumps, s), 0.0).cost for s in shifts]
    return np.asarray(shifts[np.argmin(costs, axis=0)])


def suppose(  # noqa: PLR0913 - the last two only while jumps are being found
    samples: Samples,
    chain: Chain,
    found: Smooth,
    cuts: Cuts,
    tries: int = 3,
    others: FloatArray | None = None,
) -> Suppositions:
    """Weigh times and widths of known jumps by small fits about each."""
    fits = _local(samples, chain, found, cuts, np.zeros(0), others)
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
    fits = _local(samples, chain, found, cuts, target_s)
    noise = found.solution.variance
    which, best = fits.target.which, np.argmin(
        np.abs(weighed.width_s[:, None] - cuts.width_s), axis=0
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
