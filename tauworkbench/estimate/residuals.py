"""What the residuals say: their size, and how many independent samples the record is worth."""

from __future__ import annotations

import numpy as np

from ..records import FloatArray, NoiseSummary
from .candidates import Fitted
from .starts import Record

__all__ = ["correlation_sum", "noise_of"]

# More samples than this are looked at in a stretch of that many from the window's start on.
_MOST = 200_000


def noise_of(record: Record, fitted: Fitted, choice: str) -> tuple[NoiseSummary, float]:
    """Noise summary, and by how much correlation inflates the variance of a mean.

    Parameters
    ----------
    choice : {"auto", "white", "correlated"}
        ``white`` takes the samples as independent whatever they look like.
    """
    n = record.time_s.size
    sigma = float(np.sqrt(fitted.variance))
    inflation = 1.0 if choice == "white" else correlation_sum(_residuals(record, fitted))
    name = "white" if inflation == 1.0 else "correlated"
    time = (inflation - 1.0) / 2 * record.spacing_s
    return NoiseSummary(name, sigma, time, n, n / inflation), inflation


def _residuals(record: Record, fitted: Fitted) -> FloatArray:
    """Return residuals in units of each sample's own standard deviation, relative."""
    time, value = record.time_s[:_MOST], record.value[:_MOST]
    rest = value - fitted.offset_c - fitted.model.curve(fitted.values, time)
    return rest if record.weight is None else rest * np.sqrt(record.weight[:_MOST])


def correlation_sum(residual: FloatArray) -> float:
    """Variance of the residuals' mean over that of independent ones, at least 1.

    The sum of the autocorrelations up to the first that can't be told from zero (initial positive
    sequence; Geyer 1992, Statist. Sci. 7, 473; from memory), each corrected for the bias of a
    fitted mean. It counts a slow lack of fit as noise, which widens the intervals.
    """
    n = residual.size
    centred = residual - residual.mean()
    spectrum = np.fft.rfft(centred, 2 * n)
    auto = np.fft.irfft(spectrum * spectrum.conj())[: max(n // 3, 2)] / max(
        float(centred @ centred), 1e-300
    )
    limit = 2.0 / np.sqrt(n)
    if auto[1] < max(limit, 3 / np.sqrt(n)):
        return 1.0
    below = np.flatnonzero(auto < limit)
    stop = int(below[0]) if below.size else auto.size
    return float(max(1.0 + 2.0 * np.sum(auto[1:stop]), 1.0))
