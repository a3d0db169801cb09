r"""Block averages: a long record as a few hundred means that keep what it says of the poles.

Each sample near the onset stays alone; further out the blocks' width grows in proportion to the
time since the onset. A smooth model's mean over a block is, to far below the noise, half of
:math:`f(\bar t - s) + f(\bar t + s)`, with mean and standard deviation of the block's times.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..records import FloatArray

__all__ = ["Blocks", "IntArray", "even_edges", "graded_edges", "reduce"]

IntArray = np.ndarray[tuple[int], np.dtype[np.intp]]


@dataclass(frozen=True, eq=False)
class Blocks:
    """Block means, shape (m,) each.

    Attributes
    ----------
    time_s, spread_s : ndarray
        Mean and standard deviation of the block's times [s].
    value : ndarray
        Weighted mean.
    weight : ndarray
        Sum of the samples' weights.
    count : ndarray
        Samples in the block.
    scatter : float
        Weighted sum of squares of the samples about their block's own straight line.
    scatter_freedom : float
        Its degrees of freedom.
    edges : ndarray
        First sample of each block.
    """

    time_s: FloatArray
    spread_s: FloatArray
    value: FloatArray
    weight: FloatArray
    count: FloatArray
    scatter: float
    scatter_freedom: float
    edges: IntArray


def even_edges(n: int, blocks: int) -> IntArray:
    """First samples of about ``blocks`` blocks of equal sample count."""
    return np.unique(np.linspace(0, n, min(n, blocks) + 1).astype(np.intp)[:-1])


def graded_edges(n: int, first: int, last: int, *, growth: float, alone: int) -> IntArray:
    """First samples of blocks that widen away from samples ``first`` to ``last``.

    Parameters
    ----------
    n : int
        Samples in all.
    first, last : int
        The onset lies between these samples.
    growth : float
        Width of a block over its distance from there.
    alone : int
        Samples on either side that stay alone.
    """
    after = _widening(n - last, growth, alone) + last
    # The baseline is one constant: coarse blocks lose nothing of it.
    before = first - _widening(first, max(growth, 0.2), alone)
    edges = np.concatenate([[0], before, np.arange(first, last), after])
    return np.unique(edges[(edges >= 0) & (edges < n)]).astype(np.intp)


def _widening(length: int, growth: float, alone: int) -> IntArray:
    """Distances 0, 1, 2, ... that widen beyond ``alone``, up to ``length``."""
    near = np.arange(min(alone, length))
    if length <= alone:
        return near
    # widths below one sample would repeat, so the geometric part starts where it has whole ones
    steps = int(np.log(length / max(alone, 1.0)) / np.log1p(growth)) + 2
    far = (max(alone, 1.0) * (1 + growth) ** np.arange(steps)).astype(np.intp)
    return np.concatenate([near, far])


def reduce(
    time_s: FloatArray, value: FloatArray, weight: FloatArray | None, edges: IntArray
) -> Blocks:
    """Average a record into the blocks that start at ``edges``."""
    n = time_s.size
    count = np.diff(np.append(edges, n)).astype(float)
    if count.max(initial=0) <= 1:
        ones = np.ones(n) if weight is None else weight
        return Blocks(time_s, np.zeros(n), value, ones, count, 0.0, 0.0, edges)
    total = count if weight is None else np.add.reduceat(weight, edges)

    def mean(x: FloatArray) -> FloatArray:
        sums = np.add.reduceat(x if weight is None else x * weight, edges)
        return np.asarray(sums / total)

    where = np.repeat(np.arange(count.size), count.astype(np.intp))
    mean_time, mean_value = mean(time_s), mean(value)
    late, off = time_s - mean_time[where], value - mean_value[where]
    var_time, var_value, cov = mean(late * late), mean(off * off), mean(late * off)
    along = np.divide(cov**2, var_time, out=np.zeros_like(cov), where=var_time > 0)
    wide = count >= 4  # fewer samples than that say little beside their own line
    scatter = float(np.sum((total * np.maximum(var_value - along, 0.0))[wide]))
    freedom = float(np.sum(count[wide] - 2))
    return Blocks(mean_time, np.sqrt(var_time), mean_value, total, count, scatter, freedom, edges)
