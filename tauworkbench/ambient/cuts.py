"""Where the ambient is cut: jumps and their widths, and spline spaces that allow them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray
from .chain import Chain
from .knots import Grid, Knots, Layout, spread
from .moments import Samples
from .system import System, assemble

__all__ = ["NO_CUTS", "Builder", "Cuts", "builder", "cut_breaks", "shift", "supported"]

# Degrees beyond order and poles with which a spline follows the decay after a jump.
_EXTRA = 1
# A gap of n cells costs the equations n^(2 order + 2 poles) of their condition.
_GAP_CONDITION = 1e11
Builder = Callable[[float], System]


@dataclass(frozen=True, eq=False)
class Cuts:
    """Jumps of the ambient, in order of time.

    Attributes
    ----------
    time_s : ndarray, shape (jumps,)
        Middle of each transition, on the samples' clock [s].
    width_s : ndarray, shape (jumps,)
        Length of a straight transition; 0 for an instant one [s].
    spread_s : ndarray, shape (jumps,)
        Standard uncertainty of the time [s].
    """

    time_s: FloatArray
    width_s: FloatArray
    spread_s: FloatArray

    @property
    def count(self) -> int:
        """How many."""
        return self.time_s.size

    def part(self, keep: NDArray[np.bool_]) -> Cuts:
        """Return some of them."""
        return Cuts(self.time_s[keep], self.width_s[keep], self.spread_s[keep])


NO_CUTS = Cuts(np.zeros(0), np.zeros(0), np.zeros(0))


def cut_breaks(grid: Grid, cuts: Cuts, degree: int, poles: int, order: int) -> Layout:
    """Cut the ambient: a repeated break for a jump, two and a free cell between for a transition.

    Breaks within half an interval of a cut give way, so that no cell gets tiny.
    """
    breaks = grid.breaks
    multiplicity = np.ones(breaks.size, np.intp)
    multiplicity[grid.apart] = degree + 1
    free = (order + poles) * grid.apart.size
    if not cuts.count or breaks.size < 4:
        knots = Knots.on(breaks, degree, multiplicity, grid.places)
        return Layout(knots, more_free=free)
    half = float(np.median(np.diff(breaks))) / 2
    low, high = _inside(breaks, cuts, half)
    first = np.maximum(np.searchsorted(breaks, low - half), 1)
    last = np.minimum(np.searchsorted(breaks, high + half, side="right"), breaks.size - 1)
    gone = np.zeros(breaks.size + 1, np.intp)
    np.add.at(gone, first, 1)
    np.add.at(gone, np.maximum(last, first), -1)
    keep = np.cumsum(gone[:-1]) == 0
    sharp = high - low < 0.1 * half
    jump, kink = degree - poles + 1, degree - poles
    new = [(low + high)[sharp] / 2, low[~sharp], high[~sharp]]
    times = [np.full(new[0].size, jump), *(np.full(x.size, kink) for x in new[1:])]
    every = np.concatenate([breaks[keep], *new])
    rank = np.argsort(every, kind="stable")
    repeat = np.concatenate([multiplicity[keep], *times])[rank]
    places = np.interp(every[rank], breaks, grid.places)
    own = np.searchsorted(every[rank], low[~sharp]) if order == 1 else np.zeros(0, np.intp)
    gentle = int(np.count_nonzero(~sharp))
    free += order * int(sharp.sum()) + (gentle if order == 1 else 2 * (order - 1) * gentle)
    return Layout(Knots.on(every[rank], degree, repeat, places), own, free)


def _inside(breaks: FloatArray, cuts: Cuts, half: float) -> tuple[FloatArray, FloatArray]:
    """Begins and ends of the transitions that lie within the breaks and apart."""
    low, high = cuts.time_s - cuts.width_s / 2, cuts.time_s + cuts.width_s / 2
    apart = np.append(low[1:] - high[:-1] > half / 2, True)
    inside = (low > breaks[0] + half / 2) & (high < breaks[-1] - half / 2) & apart
    return low[inside], high[inside]


def supported(samples: Samples, cuts: Cuts, longest_s: float, apart_s: float) -> Cuts:
    """Leave out cuts that the samples can't hold.

    Those at the log's ends, in gaps longer than ``longest_s``, and those that follow another by
    less than ``apart_s`` or with fewer than two samples between: the level there would be free.
    """
    time = samples.time_s
    at = np.searchsorted(time, cuts.time_s)
    inside = (at >= 2) & (at <= time.size - 2)
    at = np.clip(at, 1, time.size - 1)
    inside &= time[at] - time[at - 1] < longest_s
    kept = cuts.part(inside)
    while kept.count > 1:
        low, high = kept.time_s - kept.width_s / 2, kept.time_s + kept.width_s / 2
        between = np.searchsorted(time, low[1:]) - np.searchsorted(time, high[:-1], side="right")
        close = (low[1:] - high[:-1] < apart_s) | (between < 2)
        if not close.any():
            break
        # The first of each row of close ones stays; what follows the next is looked at anew.
        first = close & ~np.append(False, close[:-1])
        kept = kept.part(~np.append(False, first))
    return kept


def builder(
    samples: Samples, chain: Chain, order: int, end_s: float, cuts: Cuts = NO_CUTS
) -> Builder:
    """Return what builds the equations for a knot interval [s].

    Parameters
    ----------
    samples : Samples
    chain : Chain
    order : int
    end_s : float
        Where the ambient is still wanted [s].
    cuts : Cuts
    """

    def build(interval: float) -> System:
        seen = chain.seen_by(interval)
        shifted = shift(samples, chain, seen)
        degree = order + len(seen.poles_s) + seen.extra_degree(interval)
        degree += _EXTRA if cuts.count else 0
        poles = len(seen.poles_s)
        unknowns = order + poles
        longest = max(int(_GAP_CONDITION ** (0.5 / unknowns)), 8)
        grid = spread(shifted.time_s, interval, end_s, longest, 4 * unknowns)
        layout = cut_breaks(
            grid, supported(shifted, cuts, longest * interval, interval), degree, poles, order
        )
        return assemble(shifted, layout, seen, order)

    return build


def shift(samples: Samples, chain: Chain, seen: Chain) -> Samples:
    """Take off the delay that the fastest poles become on these knots."""
    more = seen.delay_s - chain.delay_s
    if not more:
        return samples
    return Samples(samples.time_s - more, samples.value_k, samples.weight, samples.origin_c)
