r"""Jumps of the ambient: found, and counted only where the evidence is strong.

The ambient is then a random walk whose steps are Gaussian nearly everywhere and of any size at a
few unknown times: the heavy tail that doors have. Where a walk alone wanders too far within one
cell to be its own step, the statistic

.. math:: t^2 = d^2 / (\sigma^2 (\kappa / \lambda - f' C f)), \qquad d = f' \beta,

shows it (d: the cell's mean slope; the denominator: the variance that the smoothed d must have if
the model were true; kappa = f' K^+ f; the auxiliary residual of de Jong and Penzer 1998, from
memory). The ambient is cut there, the cut is moved to where the data want it, and smoothness and
noise are found anew; once the largest jumps are out of the way the smaller ones show.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from scipy.linalg import LinAlgError

from ..progress import SILENT, Watch, step
from ..records import FloatArray
from .chain import Chain
from .cuts import NO_CUTS, Cuts, supported
from .knots import Knots, Layout
from .local import dense
from .moments import Samples
from .posterior import Posterior
from .smooth import Smooth, smooth
from .suppose import Suppositions, coarse, local_fits, suppose
from .system import penalised_table, penalty_band, unit_moments

__all__ = ["find_jumps"]

# Beyond what chance gives: to look for jumps at all, to try one, to keep it.
_BEGIN, _TRY, _KEEP = 6.0, 2.0, 6.0
_QUIETER = 30.0


def find_jumps(
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
        cuts = supported(samples, cuts, math.inf, 2 * longest)
        try:
            again = smooth(
                samples,
                chain,
                1,
                end_s=end_s,
                start=found.omega,
                cuts=cuts,
                longest_s=longest,
                near=number > 2,
            )
        except LinAlgError:  # cuts that the samples between them can't tell apart
            break
        known, found = cuts, again
    return known, found


def _kept(weighed: Suppositions, found: Smooth) -> Cuts:
    """Those with enough behind them."""
    enough = weighed.gain > _chance(found) + _KEEP
    return weighed.part(enough).cuts() if enough.any() else NO_CUTS


def _candidates(samples: Samples, found: Smooth, cuts: Cuts) -> FloatArray:
    """Times at which a jump shows, well apart from each other and from those known."""
    statistic = surprise(found)
    knots = found.system.knots
    reach = max(math.ceil(math.pi / found.omega / knots.interval_s / 2), knots.degree + 1)
    if not cuts.count and statistic.max() < _chance(found) + _BEGIN:
        return np.zeros(0)
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
    statistic = slope**2 / np.maximum(expected, 1e-300)
    odd = np.convolve(knots.kind > 0, np.ones(2 * size + 1), "same") > 0
    statistic[odd[: knots.cells]] = 0.0
    statistic[:size] = statistic[-size:] = 0.0
    return statistic


def _prior(knots: Knots, chain: Chain, order: int, f: FloatArray) -> float:
    """kappa: the prior variance of a cell's mean slope, per unit of q, on these knots."""
    cells = 6 * knots.degree + 31
    even = Knots.on(knots.interval_s * np.arange(cells + 1.0), knots.degree)
    g = np.zeros(even.size)
    g[cells // 2 : cells // 2 + f.size] = f
    x = np.linalg.lstsq(dense(penalty_band(Layout(even), chain, order)), g, rcond=1e-11)[0]
    return float(g @ x)


def _with(samples: Samples, chain: Chain, found: Smooth, cuts: Cuts, new: FloatArray) -> Cuts:
    """Add new jumps, each moved to its likeliest place and width; the old ones stay."""
    fresh = Cuts(new, np.zeros(new.size), np.zeros(new.size))
    # Once the jump is out of the way the rest is quieter than it seemed with it: as rough as
    # before, the walk would make up for a jump in the wrong place.
    quiet = replace(found.solution, smoothness=_QUIETER * found.solution.smoothness)
    found = replace(found, solution=quiet)
    fits = local_fits(samples, chain, found, fresh, np.zeros(0), cuts.time_s)
    fresh = Cuts(new + coarse(fits), fresh.width_s, fresh.spread_s)
    fresh = suppose(samples, chain, found, fresh, tries=2, others=cuts.time_s).cuts()
    time = np.concatenate([cuts.time_s, fresh.time_s])
    order = np.argsort(time)
    width = np.concatenate([cuts.width_s, fresh.width_s])[order]
    return Cuts(time[order], width, np.concatenate([cuts.spread_s, fresh.spread_s])[order])
