"""Fewer points for a plot that looks the same: least and greatest of each pixel column."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray

__all__ = ["decimate"]


def decimate(time: ArrayLike, value: ArrayLike, pixels: int) -> tuple[FloatArray, FloatArray]:
    """Keep the least and the greatest value of each of at most ``pixels`` runs of samples.

    Parameters
    ----------
    time, value : array_like, shape (n,)
        Samples in order of time; a value may be nan.
    pixels : int
        Columns that the plot has; at most ``2 * pixels + 2`` points come back.

    Returns
    -------
    time, value : ndarray
        A subset of the samples in their order, always with the first and the last one. It is for
        the eye only: its noise is not the record's.
    """
    time, value = np.asarray(time, float), np.asarray(value, float)
    n, pixels = time.size, max(int(pixels), 1)
    if n <= 2 * pixels:
        return time, value
    # Rounded up and padded at the edge: rounding down would drop the tail from the plot.
    width = -(-n // pixels)
    bins = -(-n // width)
    padded = np.pad(value, (0, bins * width - n), mode="edge").reshape(bins, width)
    blank = np.isnan(padded)
    if blank.any():
        least = np.where(blank, np.inf, padded).argmin(axis=1)
        greatest = np.where(blank, -np.inf, padded).argmax(axis=1)
    else:
        least, greatest = padded.argmin(axis=1), padded.argmax(axis=1)
    starts = np.arange(bins) * width
    ends = np.array([0, n - 1])
    index = np.concatenate([starts + least, starts + greatest, ends])
    kept = np.unique(np.minimum(index, n - 1))
    return time[kept], value[kept]
