"""Which smoothness law an ambient follows, by what it says of samples held out.

Orders 1, 2 and 3 are tried without jumps, and order 1 with jumps where any are found. A fifth of
the samples, in blocks of a third of a time constant, is predicted from the others; the score is
the mean log density of what was held out. A wrong order gives a wrong band, so the lowest order
wins where the scores can't tell.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError

from ..progress import SILENT, Watch, step
from ..records import FloatArray
from .chain import Chain
from .cuts import NO_CUTS, Cuts, builder
from .jumps import find_jumps
from .moments import Samples
from .posterior import Posterior
from .smooth import Smooth, smooth

__all__ = ["Choice", "choose", "pilot"]

ORDERS = (1, 2, 3)
# The choice is made on about so many samples, in so many stretches.
PILOT_SAMPLES, _STRETCHES = 9_000, 6
_BLOCK, _FOLDS = 0.3, 5
# Scores within this many units of log likelihood can't tell; for a walk against what is smooth.
_TELLS, _DOUBT = 2.0, 20.0


@dataclass(frozen=True, eq=False)
class Choice:
    """What was chosen and why.

    Attributes
    ----------
    order : int
        Which derivative of the ambient wanders.
    jumps : bool
        Whether it may also jump.
    omega : float
        Angular frequency at which the recovery falls to a half, on the pilot [rad/s].
    found : Smooth
        The fit on the pilot.
    cuts : Cuts
        Its jumps.
    scores : mapping of str to float
        Mean log density per held-out sample.
    samples : int
        How many samples the choice looked at.
    """

    order: int
    jumps: bool
    omega: float
    found: Smooth
    cuts: Cuts
    scores: Mapping[str, float]
    samples: int


def name_of(order: int, jumps: bool) -> str:
    """Name a law as the record does."""
    return f"order {order} with jumps" if jumps else f"order {order}"


def pilot(n: int) -> NDArray[np.bool_] | slice:
    """Which of n samples to look at: all, or a few long stretches."""
    if n <= 2 * PILOT_SAMPLES:
        return slice(None)
    length = PILOT_SAMPLES // _STRETCHES
    starts = np.linspace(0, n - length, _STRETCHES).astype(int)
    keep = np.zeros(n, bool)
    for start in starts:
        keep[start : start + length] = True
    return keep


def choose(
    samples: Samples, chain: Chain, watch: Watch = SILENT, *, causal: bool = False
) -> Choice:
    """Choose order and jumps on the pilot's samples.

    A causal filter can't wait to see whether the ambient jumped: no jumps, and no order above 2,
    whose filter rings.
    """
    part = samples.part(pilot(samples.time_s.size))
    end = float(part.time_s[-1])
    fits: dict[tuple[int, bool], tuple[Smooth, Cuts]] = {}
    for order in ORDERS[:2] if causal else ORDERS:
        step(watch, order, 6, "finding the ambient's smoothness")
        try:
            fits[order, False] = (smooth(part, chain, order, end_s=end), NO_CUTS)
        except LinAlgError:  # too few samples for so high an order
            if order == ORDERS[0]:
                raise
    first = fits[1, False][0]
    cuts, jumping = (NO_CUTS, first) if causal else find_jumps(part, chain, first, end, watch)
    if cuts.count:
        fits[1, True] = (jumping, cuts)
    step(watch, 5, 6, "predicting held-out samples")
    folds = _folds(part, chain)
    totals = {law: _score(part, chain, fit, folds) for law, fit in fits.items()}
    law = _best(totals, part.count)
    held = int(sum(np.count_nonzero(f & (part.weight > 0)) for f in folds))
    scores = {name_of(*k): v / held for k, v in totals.items() if math.isfinite(v)}
    found, cuts = fits[law]
    return Choice(*law, found.omega, found, cuts, scores, part.count)


def _best(totals: Mapping[tuple[int, bool], float], count: int) -> tuple[int, bool]:
    """Climb from order 1 only where the scores say so clearly.

    Order 2 on a random walk has a band that covers half of what it should; order 1 on a smooth
    ambient is merely wide. On logs of 800 samples and more walks scored up to 15 for the wrong
    order and smooth ambients 44 and more for the right one (tests/validation/ambient.md).
    """
    law, total = (1, False), totals[1, False]
    doubt = _DOUBT * min(1.0, math.sqrt(count / 800))
    for other in ((1, True), (2, False), (3, False)):
        margin = _TELLS if other[1] or law[0] == 2 else doubt
        if totals.get(other, -math.inf) > total + margin:
            law, total = other, totals[other]
    return law


def _folds(samples: Samples, chain: Chain) -> list[NDArray[np.bool_]]:
    """Masks of what is held out, in blocks of a third of a time constant or four samples."""
    time = samples.time_s
    interval = float(np.median(np.diff(time)))
    length = max(_BLOCK * max(chain.poles_s), 4 * interval)
    block = np.floor((time - time[0]) / length).astype(int)
    group = np.random.default_rng(0).permutation(block.max() + 1) % _FOLDS
    folds = _FOLDS if samples.count <= PILOT_SAMPLES // 2 else 2
    masks = [group[block] == k for k in range(folds)]
    return [m for m in masks if np.any(m & (samples.weight > 0))]


def _score(
    samples: Samples, chain: Chain, fit: tuple[Smooth, Cuts], folds: list[NDArray[np.bool_]]
) -> float:
    """Sum of log densities of the held-out samples; smoothness and noise as found on all."""
    found, cuts = fit
    end = float(samples.time_s[-1])
    noise = found.solution.variance
    total = 0.0
    for out in folds:
        live = out & (samples.weight > 0)
        kept = Samples(samples.time_s, samples.value_k, np.where(out, 0.0, samples.weight))
        build = builder(kept, chain, found.system.order, end, cuts)
        try:
            solution = build(found.system.knots.interval_s).solve(found.solution.smoothness)
        except LinAlgError:
            return -math.inf
        posterior = Posterior(solution)
        time = samples.time_s[live] - (found.system.chain.delay_s - chain.delay_s)
        mean, variance = posterior.both(posterior.reading_table, time)
        variance *= noise / solution.variance
        total += _log_density(samples.value_k[live] - mean, variance + noise / samples.weight[live])
    return total


def _log_density(error: FloatArray, variance: FloatArray) -> float:
    return float(-0.5 * np.sum(np.log(2 * math.pi * variance) + error**2 / variance))
