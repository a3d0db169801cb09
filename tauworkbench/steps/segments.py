"""Cut a record into pieces that each relax freely: where several steps lie in one log.

Every piece is a constant and two exponentials from a common grid, with free amplitudes; the cuts
that minimise the whole sum of squares are found by dynamic programming over block edges. The
block in which a cut falls belongs to neither piece, since it is a mixture of both.
"""

from __future__ import annotations

import numpy as np

from ..records import FloatArray
from .blocks import Blocks, IntArray

__all__ = ["cuts"]

_TAUS = 9
_SHORTEST = 5  # blocks in a piece
# A further cut costs about five numbers (place, level, two amplitudes, a time constant); it must
# lower the sum of squares by this factor per number to be believed among some 150 blocks.
_GAIN = 1.8


def cuts(blocks: Blocks, *, most: int = 24) -> list[int]:
    """First blocks of the second and later pieces, in order; empty for one piece."""
    cost = _costs(blocks)
    n = blocks.time_s.size
    floor = 1e-12 * float(blocks.weight @ (blocks.value - blocks.value.mean()) ** 2)
    best = cost[0].copy()  # best[j]: cheapest cover of blocks 0..j
    tables: list[IntArray] = []
    chosen, reached = 0, best[-1]
    for pieces in range(2, most + 2):
        total = best[:-1, None] + cost[1:, :]  # previous piece ends at i, next begins at i + 1
        tables.append(np.argmin(total, axis=0))
        best = total[tables[-1], np.arange(n)]
        if best[-1] + floor < (reached + floor) / _GAIN ** (pieces - 1 - chosen):
            chosen, reached = pieces - 1, best[-1]
        elif pieces - 1 - chosen > 2:  # a pulse needs two cuts at once, three in a row gain nothing
            break
    return _trace_back(tables[:chosen], n)


def _trace_back(tables: list[IntArray], n: int) -> list[int]:
    """Follow the stored choices from the last block to the first."""
    places, end = [], n - 1
    for table in reversed(tables):
        begin = int(table[end]) + 1
        places.append(begin)
        end = begin - 1
    return places[::-1]


def _costs(blocks: Blocks) -> FloatArray:
    """Sum of squares of the best piece from block i to block j, inf where too short."""
    n = blocks.time_s.size
    out = np.full((n, n), np.inf)
    length = blocks.time_s[-1] - blocks.time_s[0]
    taus = np.geomspace(length / n, length, _TAUS)
    pairs = np.triu_indices(_TAUS, 1)
    for i in range(n - _SHORTEST + 1):
        skip = i + (1 if i else 0)
        fit = _fits_from(blocks, skip, taus, pairs)
        ends = np.arange(skip, n)
        long = ends - i + 1 >= _SHORTEST
        out[i, ends[long]] = fit[long]
    return out


def _fits_from(
    blocks: Blocks, first: int, taus: FloatArray, pairs: tuple[IntArray, IntArray]
) -> FloatArray:
    """Cheapest sum of squares of a piece from ``first`` to each later block."""
    time, weight = blocks.time_s[first:], blocks.weight[first:]
    value = blocks.value[first:] - blocks.value[first]
    fall = np.exp(-(time - time[0])[:, None] / taus)
    sum_w = np.cumsum(weight)
    sum_y = np.cumsum(weight * value)
    sum_e = np.cumsum(weight[:, None] * fall, axis=0)
    gram = np.cumsum(weight[:, None, None] * fall[:, :, None] * fall[:, None, :], axis=0)
    gram -= sum_e[:, :, None] * sum_e[:, None, :] / sum_w[:, None, None]
    moment = np.cumsum((weight * value)[:, None] * fall, axis=0)
    moment -= sum_e * (sum_y / sum_w)[:, None]
    total = np.cumsum(weight * value**2) - sum_y**2 / sum_w
    i, j = pairs
    oi, oj, g = gram[:, i, i], gram[:, j, j], gram[:, i, j]
    bi, bj = moment[:, i], moment[:, j]
    bottom = oi * oj - g**2
    good = bottom > 1e-9 * oi * oj
    safe = np.where(good, bottom, 1.0)
    explained = np.where(good, (oj * bi**2 - 2 * g * bi * bj + oi * bj**2) / safe, 0.0)
    return np.asarray(np.maximum(total - explained.max(axis=1), 0.0))
