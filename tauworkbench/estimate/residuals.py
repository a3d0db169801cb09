"""What the residuals say: their size, and how many independent samples the record is worth."""

from __future__ import annotations

import numpy as np
from scipy.fft import next_fast_len

from ..records import FloatArray, NoiseSummary
from .candidates import Fitted
from .starts import Record

__all__ = ["correlation_sum", "noise_of"]

# A longer record is looked at in this many stretches of this many samples.
_STRETCHES, _STRETCH = 4, 8192
# Blocks that scatter this much more than the samples inside them say so of slow disturbances.
_SLOW = 1.3


def noise_of(record: Record, fitted: Fitted, choice: str) -> tuple[NoiseSummary, float]:
    """Noise summary, and by how much correlation inflates the variance of a mean.

    Parameters
    ----------
    choice : {"auto", "white", "correlated"}
        ``white`` takes the samples as independent whatever they look like.
    """
    n = record.time_s.size
    sigma = float(np.sqrt(fitted.variance))
    inflation = 1.0
    if choice != "white":
        inflation = max(_correlated(record, fitted), _slow(fitted))
    name = "white" if inflation == 1.0 else "correlated"
    time = (inflation - 1.0) / 2 * record.spacing_s
    return NoiseSummary(name, sigma, time, n, n / inflation), inflation


def _correlated(record: Record, fitted: Fitted) -> float:
    n = record.time_s.size
    if n <= _STRETCHES * _STRETCH:
        return correlation_sum(_residuals(record, fitted, slice(0, n)))
    starts = np.linspace(0, n - _STRETCH, _STRETCHES).astype(int)
    parts = [_residuals(record, fitted, slice(i, i + _STRETCH)) for i in starts]
    return float(np.mean([correlation_sum(p) for p in parts]))


def _slow(fitted: Fitted) -> float:
    """Variance of the blocks over what the samples inside them promise, where that is large."""
    blocks = fitted.model.blocks
    if blocks.scatter_freedom < 100:
        return 1.0
    inside = blocks.scatter / blocks.scatter_freedom
    between = fitted.solution.cost / max(fitted.solution.degrees_of_freedom, 1)
    ratio = between / max(inside, 1e-300)
    return ratio if ratio > _SLOW else 1.0


def _residuals(record: Record, fitted: Fitted, part: slice) -> FloatArray:
    """Return residuals in units of each sample's own standard deviation, relative."""
    rest = (
        record.value[part]
        - fitted.offset_c
        - fitted.model.curve(fitted.values, record.time_s[part])
    )
    return rest if record.weight is None else rest * np.sqrt(record.weight[part])


def correlation_sum(residual: FloatArray) -> float:
    """Variance of the residuals' mean over that of independent ones, at least 1.

    The sum of the autocorrelations up to the first that can't be told from zero (initial positive
    sequence; Geyer 1992, Statist. Sci. 7, 473; from memory). It counts a slow lack of fit as
    noise, which widens the intervals.
    """
    n = residual.size
    centred = residual - residual.mean()
    power = float(centred @ centred)
    limit = 2.0 / np.sqrt(n)
    first = float(centred[1:] @ centred[:-1]) / max(power, 1e-300)
    if n < 4 or first < max(limit, 3 / np.sqrt(n)):
        return 1.0
    size = next_fast_len(2 * n, real=True)
    spectrum = np.fft.rfft(centred, size)
    auto = np.fft.irfft(spectrum * spectrum.conj(), size)[: max(n // 3, 2)] / max(power, 1e-300)
    below = np.flatnonzero(auto < limit)
    stop = int(below[0]) if below.size else auto.size
    return float(max(1.0 + 2.0 * np.sum(auto[1:stop]), 1.0))
