r"""Block averages: a long record as a few hundred means that keep what it says of the poles.

Each sample near the onset stays alone; further out the blocks' width grows in proportion to the
time since the onset. A smooth model's mean over a block is, to far below the noise, half of
:math:`f(\bar t - s) + f(\bar t + s)`, with mean and standard deviation of the block's times.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..records import FloatArray

__all__ = ["Blocks", "IntArray", "even_edges", "graded_edges", "reduce", "thinned"]

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
    return _sorted(np.linspace(0, n, min(n, blocks) + 1).astype(np.intp)[:-1])


def graded_edges(
    n: int, first: int, last: int, *, growth: float, alone: int, inside: int = 400
) -> IntArray:
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
    middle = np.linspace(first, last, min(last - first, inside) + 1).astype(np.intp)
    edges = np.concatenate([[0], before, middle, after])
    return _sorted(edges[(edges >= 0) & (edges < n)])


def _sorted(edges: IntArray) -> IntArray:
    """Unique and sorted; by a sort, which for short arrays is sooner than a hash."""
    edges = np.sort(edges).astype(np.intp)
    return np.asarray(edges[np.concatenate([[True], np.diff(edges) > 0])])


def _widening(length: int, growth: float, alone: int) -> IntArray:
    """Distances 0, 1, 2, ... that widen beyond ``alone``, up to ``length``."""
    near = np.arange(min(alone, length))
    if length <= alone:
        return near
    # widths below one sample would repeat, so the geometric part starts where it has whole ones
    steps = int(np.log(length / max(alone, 1.0)) / np.log1p(growth)) + 2
    far = (max(alone, 1.0) * (1 + growth) ** np.arange(steps)).astype(np.intp)
    return np.concatenate([near, far])


def thinned(
    time_s: FloatArray, value: FloatArray, weight: FloatArray | None, most: int
) -> tuple[FloatArray, FloatArray, FloatArray | None, int]:
    """Average runs of equal length so that at most twice ``most`` means are left.

    Returns
    -------
    time_s, value, weight : ndarray
        Means, and sums of the weights; what is left over at the end joins the last run.
    run : int
        Samples in a run; 1 where nothing was done.
    """
    run = time_s.size // most
    if run < 2:
        return time_s, value, weight, 1
    whole = time_s.size // run
    cut = slice(0, whole * run)

    def mean(x: FloatArray) -> FloatArray:
        return np.asarray(x[cut].reshape(whole, run).mean(axis=1))

    if weight is None:
        return mean(time_s), mean(value), None, run
    total = mean(weight)
    return mean(time_s * weight) / total, mean(value * weight) / total, total * run, run


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

    # Sums about a common origin, in one pass each: the digits that this costs are far below the
    # noise, and at a million samples a second pass over the blocks costs more than the fit.
    late, off = time_s - time_s[0], value - value[n // 2]
    mean_late, mean_off = mean(late), mean(off)
    var_time = np.maximum(mean(late * late) - mean_late**2, 0.0)
    var_time[count <= 1] = 0.0
    var_value = np.maximum(mean(off * off) - mean_off**2, 0.0)
    cov = mean(late * off) - mean_late * mean_off
    mean_time, mean_value = mean_late + time_s[0], mean_off + value[n // 2]
    along = np.divide(cov**2, var_time, out=np.zeros_like(cov), where=var_time > 0)
    wide = count >= 4  # fewer samples than that say little beside their own line
    scatter = float(np.sum((total * np.maximum(var_value - along, 0.0))[wide]))
    freedom = float(np.sum(count[wide] - 2))
    return Blocks(mean_time, np.sqrt(var_time), mean_value, total, count, scatter, freedom, edges)
